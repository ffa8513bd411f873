"""Checkpoints: a stream that was saved and restored goes on as if it had not been."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import detectors.checkpoint_bytes as checkpoint_bytes
from detectors.advance import Checkpoint, advance, start
from detectors.checkpoint_bytes import from_bytes, to_bytes
from detectors.errors import UnreadableCheckpoint
from detectors.gap_prior import GapPrior
from detectors.judge import Rule
from detectors.jump_prior import IndependentLevels, JumpPrior
from detectors.model import Model
from detectors.observation import Observation

RULE = Rule(threshold=0.7)


def stream(seed: int, size: int) -> list[Observation]:
    """Missing counts, gaps, exposures of both kinds, a hit, and a fall three fifths through."""
    rng = np.random.default_rng(seed)
    position, observations = 0, []
    for place in range(size):
        position += int(rng.choice([1, 1, 1, 2, 9]))
        level = 400.0 if place < 0.6 * size else 90.0
        count: int | None = int(rng.poisson(level * rng.gamma(9.0, 1.0 / 9.0)))
        if rng.random() < 0.1:
            count = None
        elif place == size // 4:
            count = 20_000
        exposure = float(rng.choice([1.0, 1.0, 0.35]))
        observations.append(Observation(position, count, exposure, float(rng.choice([0.0, 0.0, 0.2]))))
    return observations


def checkpoints(model: Model, observations: list[Observation]) -> list[Checkpoint]:
    """The checkpoint before each observation, and after the last."""
    result = [start(model)]
    for observation in observations:
        result.append(advance(result[-1], [observation], RULE).checkpoint)
    return result


MODELS = {
    "defaults": Model(),
    "few pairs, geometric gap, heavy one-offs": Model(
        gap=GapPrior(1, 40.0),
        one_off_share=0.1,
        dispersions=(3.0, 12.0, math.inf),
        wanders=((0.0, 1.0), (0.05, 0.2)),
        jump=JumpPrior(0.0, 0.6),
    ),
    "independent levels": Model(
        jump=IndependentLevels(shape=2.0, rate=0.01, lowest=-2.0, highest=12.0),
        dispersions=(8.0,),
        wanders=((0.0, 1.0),),
    ),
}


@pytest.mark.parametrize("name", MODELS)
def test_goes_on_bit_for_bit_from_every_place(name: str) -> None:
    model, observations = MODELS[name], stream(3, 60)
    whole = advance(start(model), observations, RULE)
    assert len(whole.announcements) >= 1
    end = to_bytes(whole.checkpoint)
    for place, checkpoint in enumerate(checkpoints(model, observations)):
        restored = from_bytes(to_bytes(checkpoint), model)
        assert to_bytes(restored) == to_bytes(checkpoint)
        # Long enough to pass the next upkeep of the grids and the next merge; from some places to the end.
        until = None if place % 20 == 0 else place + 5
        onwards = advance(restored, observations[place:until], RULE)
        assert onwards.posteriors == whole.posteriors[place:until]
        if until is None:
            assert to_bytes(onwards.checkpoint) == end
            wanted = tuple(a for a in whole.announcements if a.position > place_of(observations, place))
            assert onwards.announcements == wanted


def place_of(observations: list[Observation], place: int) -> int:
    return observations[place - 1].position if place else -1


@pytest.mark.parametrize("place", [45, 130, 171])
def test_goes_on_bit_for_bit_in_a_longer_stream(place: int) -> None:
    model, observations = Model(), stream(4, 200)
    before = advance(start(model), observations[:place], RULE).checkpoint
    restored = from_bytes(to_bytes(before), model)
    left = advance(before, observations[place:], RULE)
    right = advance(restored, observations[place:], RULE)
    assert left.posteriors == right.posteriors
    assert left.announcements == right.announcements
    assert to_bytes(left.checkpoint) == to_bytes(right.checkpoint)


def test_batches_do_not_matter() -> None:
    model, observations = Model(), stream(5, 50)
    whole = advance(start(model), observations, RULE)
    one_by_one = checkpoints(model, observations)[-1]
    assert to_bytes(whole.checkpoint) == to_bytes(one_by_one)


@pytest.mark.parametrize("place", [0, 12, 23, 24, 40])
def test_advancing_leaves_the_checkpoint_as_it_was(place: int) -> None:
    # A checkpoint is never changed, so one state can be taken on along several branches.
    observations = stream(6, 44)
    checkpoint = advance(start(Model()), observations[:place], RULE).checkpoint
    before = to_bytes(checkpoint)
    first = advance(checkpoint, observations[place:], RULE)
    shifted = [Observation(o.position, 5 * (o.count or 1), o.exposure) for o in observations[place:]]
    advance(checkpoint, shifted, RULE)
    assert to_bytes(checkpoint) == before
    again = advance(checkpoint, observations[place:], RULE)
    assert again.posteriors == first.posteriors


# What cannot be read

DATA = {
    place: to_bytes(advance(start(Model()), stream(7, 40)[:place], RULE).checkpoint) for place in (0, 8, 40)
}


@pytest.mark.parametrize("place", DATA)
@given(where=st.floats(0.0, 1.0, exclude_max=True), bit=st.integers(0, 7))
@settings(max_examples=60, deadline=None)
def test_a_flipped_bit_is_noticed(place: int, where: float, bit: int) -> None:
    damaged = bytearray(DATA[place])
    damaged[int(where * len(damaged))] ^= 1 << bit
    with pytest.raises(
        UnreadableCheckpoint, match=r"The checkpoint cannot be read: .*\. Fold the stream again"
    ):
        from_bytes(bytes(damaged), Model())


@pytest.mark.parametrize("place", DATA)
def test_every_byte_of_the_head_is_checked(place: int) -> None:
    for where in range(44):
        damaged = bytearray(DATA[place])
        damaged[where] ^= 0x55
        with pytest.raises(UnreadableCheckpoint):
            from_bytes(bytes(damaged), Model())


@pytest.mark.parametrize("place", DATA)
@given(share=st.floats(0.0, 1.0, exclude_max=True))
@settings(max_examples=30, deadline=None)
def test_bytes_cut_short_are_noticed(place: int, share: float) -> None:
    with pytest.raises(UnreadableCheckpoint):
        from_bytes(DATA[place][: int(share * len(DATA[place]))], Model())


@given(st.binary(max_size=200))
@settings(max_examples=60, deadline=None)
def test_any_other_bytes_are_refused(data: bytes) -> None:
    with pytest.raises(UnreadableCheckpoint):
        from_bytes(data, Model())


def test_bytes_too_many_are_noticed() -> None:
    with pytest.raises(UnreadableCheckpoint, match="damaged"):
        from_bytes(DATA[40] + b"\0", Model())


@pytest.mark.parametrize(
    "other",
    [
        Model(gap=GapPrior(2, 151.0)),
        Model(one_off_share=0.021),
        Model(dispersions=(4.0, 8.0)),
        Model(wanders=((0.0, 1.0),)),
        Model(first_run="ordinary"),
        Model(jump=JumpPrior(0.2, 0.4)),
    ],
    ids=lambda model: repr(model)[:40],
)
def test_another_model_is_refused(other: Model) -> None:
    for data in DATA.values():
        with pytest.raises(UnreadableCheckpoint, match="other settings"):
            from_bytes(data, other)


def test_another_version_of_the_model_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(checkpoint_bytes, "MODEL_VERSION", checkpoint_bytes.MODEL_VERSION + 1)
    with pytest.raises(UnreadableCheckpoint, match="another version of the model"):
        from_bytes(DATA[40], Model())


def test_another_format_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(checkpoint_bytes, "FORMAT", checkpoint_bytes.FORMAT + 1)
    with pytest.raises(UnreadableCheckpoint, match="another format or version"):
        from_bytes(DATA[40], Model())
