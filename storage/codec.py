"""The bytes of a run-length posterior, as they are stored with every observation.

Version 1: version, flags (bit 0: the last group is the first run), number of groups; for each group its span
(longest - shortest), shifted left by one bit, the low bit saying that a gap to the group before follows; the
probabilities of the groups; then dispersion and wander, each as number, values, probabilities; a CRC-32 of
all that. Whole numbers are little-endian base-128; values are doubles and exact; probabilities are single
precision, so each is right to a relative 6e-8 (below 1e-38: to an absolute 1e-45).
"""

import struct
import zlib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from io import BytesIO

from detectors.posterior import RunLengths, Weighted
from storage.errors import DamagedHistory, UnstorableValue
from storage.types import whole

VERSION = 1
PROBABILITY_ERROR = 6e-8
_HOLDS_FIRST_RUN = 1
_CHECKSUM_BYTES = 4
_LONGEST_WHOLE_BYTES = 8
# Sums of many terms may end a rounding error above 1.
_ROUNDING = 1e-6


@dataclass(frozen=True, slots=True)
class History:
    """What the bytes hold."""

    run_lengths: RunLengths
    dispersion: Weighted
    wander: Weighted


def encode_history(run_lengths: RunLengths, dispersion: Weighted, wander: Weighted) -> bytes:
    """The three distributions as bytes: under 1 kB for 95 groups of run lengths, 13 and 7 values."""
    _check_groups(run_lengths)
    body = b"".join(
        [
            bytes([VERSION, _HOLDS_FIRST_RUN if run_lengths.holds_first_run else 0]),
            _whole_bytes(len(run_lengths.shortest)),
            *_group_bytes(run_lengths),
            _probability_bytes(run_lengths.probability),
            _weighted_bytes(dispersion),
            _weighted_bytes(wander),
        ]
    )
    return body + zlib.crc32(body).to_bytes(_CHECKSUM_BYTES, "little")


def decode_history(body: bytes) -> History:
    """The posterior that the bytes hold; `DamagedHistory` when they are not what was written."""
    _check_whole(body)
    stream = BytesIO(body[2:-_CHECKSUM_BYTES])
    number = _read_whole(stream)
    spans = list(_read_groups(stream, number))
    run_lengths = RunLengths(
        shortest=tuple(shortest for shortest, _ in spans),
        longest=tuple(longest for _, longest in spans),
        probability=_read_numbers(stream, number, "f"),
        holds_first_run=bool(body[1] & _HOLDS_FIRST_RUN),
    )
    history = History(run_lengths, _read_weighted(stream), _read_weighted(stream))
    if stream.read(1):
        raise DamagedHistory("bytes are left over")
    return history


def _check_groups(groups: RunLengths) -> None:
    if not len(groups.shortest) == len(groups.longest) == len(groups.probability):
        raise UnstorableValue("run-length groups with both ends and a probability each", groups)
    ends = [-1, *(whole(end) for pair in zip(groups.shortest, groups.longest, strict=True) for end in pair)]
    inside = all(low <= high for low, high in zip(ends[1::2], ends[2::2], strict=True))
    apart = all(before < after for before, after in zip(ends[::2], ends[1::2], strict=False))
    if not (inside and apart):
        raise UnstorableValue("run-length groups in ascending order that do not overlap", groups)


def _group_bytes(groups: RunLengths) -> Iterator[bytes]:
    for before, (shortest, longest) in zip(
        (-1, *groups.longest), zip(groups.shortest, groups.longest, strict=True), strict=False
    ):
        gap = shortest - before - 1
        yield _whole_bytes((longest - shortest) << 1 | (gap > 0))
        if gap:
            yield _whole_bytes(gap)


def _read_groups(stream: BytesIO, number: int) -> Iterator[tuple[int, int]]:
    longest = -1
    for _ in range(number):
        span = _read_whole(stream)
        shortest = longest + 1 + (_read_whole(stream) if span & 1 else 0)
        longest = shortest + (span >> 1)
        yield shortest, longest


def _weighted_bytes(weighted: Weighted) -> bytes:
    if len(weighted.value) != len(weighted.probability):
        raise UnstorableValue("a probability for each value", weighted)
    if any(value != value for value in weighted.value):
        raise UnstorableValue("values that are numbers", weighted)
    number = len(weighted.value)
    values = struct.pack(f"<{number}d", *weighted.value)
    return _whole_bytes(number) + values + _probability_bytes(weighted.probability)


def _read_weighted(stream: BytesIO) -> Weighted:
    number = _read_whole(stream)
    return Weighted(value=_read_numbers(stream, number, "d"), probability=_read_numbers(stream, number, "f"))


def _probability_bytes(probabilities: Sequence[float]) -> bytes:
    if not all(0.0 <= one <= 1.0 + _ROUNDING for one in probabilities):
        raise UnstorableValue("probabilities from 0 to 1", probabilities)
    return struct.pack(f"<{len(probabilities)}f", *(min(one, 1.0) for one in probabilities))


def _read_numbers(stream: BytesIO, number: int, kind: str) -> tuple[float, ...]:
    size = struct.calcsize(kind) * number
    body = stream.read(size)
    if len(body) != size:
        raise DamagedHistory("it ends too early")
    return struct.unpack(f"<{number}{kind}", body)


def _whole_bytes(number: int) -> bytes:
    number = whole(number)
    parts = []
    while number > 0x7F:
        parts.append(number & 0x7F | 0x80)
        number >>= 7
    return bytes([*parts, number])


def _read_whole(stream: BytesIO) -> int:
    number = 0
    for place in range(_LONGEST_WHOLE_BYTES):
        part = stream.read(1)
        if not part:
            raise DamagedHistory("it ends too early")
        number |= (part[0] & 0x7F) << (7 * place)
        if part[0] <= 0x7F:
            return number
    raise DamagedHistory("a number in it is too long")


def _check_whole(body: bytes) -> None:
    if len(body) < 2 + _CHECKSUM_BYTES:
        raise DamagedHistory("it ends too early")
    if body[0] != VERSION:
        raise DamagedHistory(f"it has version {body[0]}, this program reads {VERSION}")
    if zlib.crc32(body[:-_CHECKSUM_BYTES]).to_bytes(_CHECKSUM_BYTES, "little") != body[-_CHECKSUM_BYTES:]:
        raise DamagedHistory("its check sum is wrong")
