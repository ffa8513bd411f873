"""When the most probable run of each count began, by the dates of the counts before it. Pure."""

from collections.abc import Mapping
from dataclasses import dataclass

from detectors.posterior import Posterior


@dataclass(frozen=True, slots=True)
class RunStart:
    """Between which counts a run began, by their numbers from 1 on, both ends included.

    `earliest` is None where it is the first run, which was under way before anyone watched.
    """

    earliest: int | None
    latest: int


def run_start(posterior: Posterior) -> RunStart:
    """The start of the most probable run; older runs are kept in groups, and then it is a stretch."""
    lengths, mode = posterior.run_lengths, posterior.run_length_mode
    group = lengths.shortest.index(mode)
    is_first_run = lengths.holds_first_run and group == len(lengths.shortest) - 1
    earliest = None if is_first_run else posterior.counted - lengths.longest[group] + 1
    return RunStart(earliest, posterior.counted - mode + 1)


def run_start_text(start: RunStart, labels: Mapping[int, str]) -> str:
    """The date, or between which; `labels` are those of the counts by their numbers."""
    latest = labels.get(start.latest, f"count {start.latest}")
    if start.earliest is None:
        return f"before {latest}"
    earliest = labels.get(start.earliest, f"count {start.earliest}")
    return latest if start.earliest == start.latest else f"{earliest} to {latest}"
