"""The bytes of a posterior: exact for lengths and values, single precision for probabilities."""

import math
import struct

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from detectors.posterior import RunLengths, Weighted
from storage.codec import PROBABILITY_ERROR, decode_history, encode_history
from storage.errors import DamagedHistory, UnstorableValue

probabilities = st.floats(0.0, 1.0)


@st.composite
def run_lengths(draw) -> RunLengths:
    steps = draw(st.lists(st.tuples(st.integers(0, 5000), st.integers(0, 5000), probabilities), max_size=120))
    shortest, longest, end = [], [], 0
    for gap, span, _ in steps:
        shortest.append(end + 1 + gap)
        end = shortest[-1] + span
        longest.append(end)
    given_weights = tuple(weight for *_, weight in steps)
    return RunLengths(tuple(shortest), tuple(longest), given_weights, draw(st.booleans()))


weighted = st.lists(st.tuples(st.floats(allow_nan=False), probabilities), max_size=20).map(
    lambda pairs: Weighted(tuple(v for v, _ in pairs), tuple(p for _, p in pairs))
)


def single(value: float) -> float:
    return struct.unpack("<f", struct.pack("<f", value))[0]


@given(run_lengths(), weighted, weighted)
def test_what_was_written_is_read(runs: RunLengths, dispersion: Weighted, wander: Weighted):
    read = decode_history(encode_history(runs, dispersion, wander))
    assert (read.run_lengths.shortest, read.run_lengths.longest) == (runs.shortest, runs.longest)
    assert read.run_lengths.holds_first_run == runs.holds_first_run
    assert (read.dispersion.value, read.wander.value) == (dispersion.value, wander.value)
    for before, after in (
        (runs.probability, read.run_lengths.probability),
        (dispersion.probability, read.dispersion.probability),
        (wander.probability, read.wander.probability),
    ):
        assert all(
            math.isclose(a, b, rel_tol=PROBABILITY_ERROR, abs_tol=1e-45)
            for a, b in zip(before, after, strict=True)
        )
    # What was read is written as the same bytes: nothing drifts, however often it is copied.
    assert encode_history(read.run_lengths, read.dispersion, read.wander) == encode_history(
        runs, dispersion, wander
    )


def largest_expected() -> tuple[RunLengths, Weighted, Weighted]:
    random = np.random.default_rng(20260302)
    spans = np.concatenate([np.zeros(40, int), np.geomspace(1, 1500, 55).astype(int)])
    longest = np.cumsum(spans + 1)
    runs = RunLengths(
        tuple((longest - spans).tolist()), tuple(longest.tolist()), tuple(random.dirichlet(np.ones(95))), True
    )
    dispersion = Weighted(tuple(2.0 ** np.arange(13)), tuple(random.dirichlet(np.ones(13))))
    wander = Weighted(tuple(0.3 * np.arange(7) / 6), tuple(random.dirichlet(np.ones(7))))
    return runs, dispersion, wander


def test_the_largest_expected_posterior_takes_less_than_a_kilobyte():
    assert len(encode_history(*largest_expected())) <= 850


def test_probabilities_still_sum_to_one():
    read = decode_history(encode_history(*largest_expected()))
    assert math.fsum(read.run_lengths.probability) == pytest.approx(1.0, abs=PROBABILITY_ERROR)


def test_numpy_numbers_leave_numpy():
    runs = RunLengths((np.int64(1),), (np.int64(3),), (np.float64(1.0),), True)
    read = decode_history(encode_history(runs, Weighted((), ()), Weighted((), ())))
    assert type(read.run_lengths.longest[0]) is int
    assert type(read.run_lengths.probability[0]) is float


def test_the_first_version_is_read_for_ever():
    # Written by hand from the description at the head of storage/codec.py, check sum from zlib's CRC-32.
    body = bytes.fromhex("01010201010c") + struct.pack("<2f", 0.25, 0.75)
    body += b"\x01" + struct.pack("<df", 6.0, 1.0) + b"\x01" + struct.pack("<df", 0.0, 1.0)
    read = decode_history(body + bytes.fromhex(CHECK_SUM))
    assert read.run_lengths == RunLengths((1, 2), (1, 8), (0.25, 0.75), True)
    assert (read.dispersion, read.wander) == (Weighted((6.0,), (1.0,)), Weighted((0.0,), (1.0,)))


CHECK_SUM = "610c38f6"


@given(st.integers(0, 10_000), st.integers(1, 255))
def test_any_changed_byte_is_noticed(place: int, change: int):
    body = bytearray(encode_history(*largest_expected()))
    body[place % len(body)] ^= change
    with pytest.raises(DamagedHistory, match="cannot be read"):
        decode_history(bytes(body))


@given(st.integers(0, 900))
def test_any_cut_is_noticed(length: int):
    body = encode_history(*largest_expected())
    with pytest.raises(DamagedHistory):
        decode_history(body[: min(length, len(body) - 1)])


@given(st.binary(max_size=80))
def test_any_bytes_give_an_error_and_no_other_one(body: bytes):
    import zlib

    for candidate in (body, (whole := b"\x01" + body) + zlib.crc32(whole).to_bytes(4, "little")):
        try:
            decode_history(candidate)
        except DamagedHistory:
            continue


def test_a_later_version_is_named():
    body = b"\x02" + encode_history(*largest_expected())[1:]
    with pytest.raises(DamagedHistory, match="version 2, this program reads 1"):
        decode_history(body)


@pytest.mark.parametrize(
    "runs",
    [
        RunLengths((1, 1), (1, 2), (0.5, 0.5), False),
        RunLengths((3, 1), (3, 1), (0.5, 0.5), False),
        RunLengths((2,), (1,), (1.0,), False),
        RunLengths((-1,), (1,), (1.0,), False),
        RunLengths((1, 2), (1,), (1.0,), False),
        RunLengths((1,), (1,), (float("nan"),), False),
        RunLengths((1,), (1,), (1.5,), False),
        RunLengths((1,), (1,), (-0.1,), False),
        RunLengths((1.0,), (1.0,), (1.0,), False),
        RunLengths((1,), (2**53 + 2,), (1.0,), False),
    ],
)
def test_what_is_no_posterior_is_refused(runs: RunLengths):
    with pytest.raises(UnstorableValue):
        encode_history(runs, Weighted((), ()), Weighted((), ()))


@pytest.mark.parametrize(
    "odd", [Weighted((1.0,), ()), Weighted((float("nan"),), (1.0,)), Weighted((1.0,), (2.0,))]
)
def test_what_is_no_weighted_value_is_refused(odd: Weighted):
    with pytest.raises(UnstorableValue):
        encode_history(RunLengths((1,), (1,), (1.0,), True), odd, Weighted((), ()))


def test_a_rounding_error_above_one_is_one():
    runs = RunLengths((1,), (1,), (1.0 + 2e-16 * 4,), True)
    assert decode_history(
        encode_history(runs, Weighted((), ()), Weighted((), ()))
    ).run_lengths.probability == (1.0,)
