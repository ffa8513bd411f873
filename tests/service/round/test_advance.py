"""Folding in pieces and at once, through saved bytes and without: the same to the last bit."""

import pytest

from detectors.advance import advance, start
from detectors.checkpoint_bytes import to_bytes
from detectors.errors import UnreadableCheckpoint
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation
from service.round.advance import STEPS_BACK, fold, resume

FELL = (98, 104, 91, 110, 99, 101, 96, 105, 93, 108, 100, 97, 103, 95, 102, 99, 41, 38, 44, 40, 37, 43)
OBSERVATIONS = tuple(
    Observation(place, None if place in (5, 17) else count) for place, count in enumerate(FELL)
)


def test_a_fold_equals_the_detector_alone() -> None:
    whole = advance(start(Model()), OBSERVATIONS, Rule())
    folded = fold(0, start(Model()), OBSERVATIONS, Rule())
    assert (folded.posteriors, folded.announcements) == (whole.posteriors, whole.announcements)
    assert len(folded.announcements) == 1
    assert [saved.folded for saved in folded.saved] == [6, 18, 22]
    assert folded.saved[-1].body == to_bytes(whole.checkpoint)


def test_taken_up_from_every_saved_checkpoint() -> None:
    whole = fold(0, start(Model()), OBSERVATIONS, Rule())
    for saved in whole.saved:
        begun, checkpoint = resume(saved.folded, saved.body, Model())
        rest = fold(begun, checkpoint, OBSERVATIONS, Rule())
        assert rest.posteriors == whole.posteriors[saved.folded :]
        last = OBSERVATIONS[saved.folded - 1].position
        assert rest.announcements == tuple(one for one in whole.announcements if one.position > last)
        assert rest.saved[-1] == whole.saved[-1]


def test_one_by_one() -> None:
    whole = fold(0, start(Model()), OBSERVATIONS, Rule())
    said, announced, saved = [], [], None
    for number in range(1, len(OBSERVATIONS) + 1):
        begun, checkpoint = resume(number - 1, None if saved is None else saved.body, Model())
        step = fold(begun, checkpoint, OBSERVATIONS[:number], Rule())
        said += step.posteriors
        announced += step.announcements
        saved = step.saved[-1]
    assert (tuple(said), tuple(announced)) == (whole.posteriors, whole.announcements)


def test_nothing_to_fold_still_leaves_a_checkpoint() -> None:
    assert [saved.folded for saved in fold(0, start(Model()), (), Rule()).saved] == [0]
    whole = fold(0, start(Model()), OBSERVATIONS, Rule())
    begun, checkpoint = resume(22, whole.saved[-1].body, Model())
    again = fold(begun, checkpoint, OBSERVATIONS, Rule())
    assert (again.posteriors, again.saved) == ((), (whole.saved[-1],))


def test_steps_back_of_a_long_fold() -> None:
    poor = Model(dispersions=(8.0,), wanders=((0.0, 1.0),))
    counts = [Observation(place, 50) for place in range(300)]
    assert [saved.folded for saved in fold(0, start(poor), counts, Rule()).saved] == [
        300 - back for back in (*STEPS_BACK, 0)
    ]


def test_a_checkpoint_of_another_model_is_refused() -> None:
    saved = fold(0, start(Model()), OBSERVATIONS, Rule()).saved[-1]
    with pytest.raises(UnreadableCheckpoint):
        resume(saved.folded, saved.body, Model(one_off_share=0.1))
    with pytest.raises(UnreadableCheckpoint):
        resume(saved.folded, saved.body[:-1] + b"?", Model())
