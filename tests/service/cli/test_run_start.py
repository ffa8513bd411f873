"""When the most probable run began."""

from dataclasses import replace

from detectors.advance import advance, start
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation
from detectors.posterior import Posterior, RunLengths
from service.cli.run_start import RunStart, run_start, run_start_text

HIGH, LOW = [100, 97, 104, 99, 102] * 6, [40, 43, 38, 41, 42] * 3
LABELS = {number: f"day {number}" for number in range(1, 101)}


def _posterior() -> Posterior:
    observations = [Observation(place, count) for place, count in enumerate(HIGH + LOW)]
    said = advance(start(Model(dispersions=(64.0,), wanders=((0.0, 1.0),))), observations, Rule()).posteriors
    last = said[-1]
    assert last is not None
    return last


def test_a_run_began_with_its_first_count() -> None:
    found = run_start(_posterior())
    assert found == RunStart(len(HIGH) + 1, len(HIGH) + 1)
    assert run_start_text(found, LABELS) == "day 31"


def test_an_old_run_is_only_known_to_lie_in_its_group() -> None:
    grouped = RunLengths((1, 48, 56), (47, 55, 100), (0.1, 0.8, 0.1), True)
    old = replace(_posterior(), counted=100, run_length_mode=48, run_lengths=grouped)
    assert run_start(old) == RunStart(46, 53)
    assert run_start_text(run_start(old), LABELS) == "day 46 to day 53"


def test_the_first_run_began_before_anyone_watched() -> None:
    alone = RunLengths((1, 7), (6, 7), (0.1, 0.9), True)
    first = replace(_posterior(), counted=7, run_length_mode=7, run_lengths=alone)
    assert run_start(first) == RunStart(None, 1)
    assert run_start_text(run_start(first), LABELS) == "before day 1"


def test_what_has_no_name_is_called_by_its_number() -> None:
    assert run_start_text(RunStart(3, 4), {}) == "count 3 to count 4"
