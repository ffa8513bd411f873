"""Checkpoints as bytes: exact, compact, versioned, and bound to their model."""

import hashlib
import json
import struct
from typing import Any

import numpy as np
from numpy.typing import NDArray

from detectors.advance import Checkpoint
from detectors.bench import bench_for
from detectors.errors import UnreadableCheckpoint
from detectors.filter_state import FilterState
from detectors.judge import Memory
from detectors.level_grid import LevelGrid
from detectors.model import MODEL_VERSION, Model
from detectors.observation import Observation
from detectors.posterior import Quantiles
from detectors.recent_runs import RecentRuns
from detectors.run_length import first_count, next_count
from detectors.run_slots import RunSlots

MAGIC = b"KNP"
FORMAT = 1
_HEAD = struct.Struct("<3sBI16s")


def model_mark(model: Model) -> bytes:
    """Sixteen bytes that differ whenever the model or its version does."""
    return hashlib.sha256(f"{MODEL_VERSION} {model!r}".encode()).digest()[:16]


def to_bytes(checkpoint: Checkpoint) -> bytes:
    """Write a checkpoint.

    Parameters
    ----------
    checkpoint : Checkpoint
        The checkpoint.

    Returns
    -------
    bytes
        While counts are few, the counts; later the filter's arrays, empty cells left out.

    Examples
    --------
    >>> from detectors.advance import start
    >>> from_bytes(to_bytes(start(Model())), Model()) == start(Model())
    True
    """
    state = checkpoint.state
    facts: dict[str, Any] = {"memory": _memory_facts(checkpoint.memory)}
    arrays: list[bytes] = []
    if state is not None and state.early:
        facts["early"] = [_written(one) for (one,) in state.early]
    elif state is not None:
        facts["state"] = _state_facts(state)
        arrays = _state_arrays(state)
    text = json.dumps(facts, separators=(",", ":")).encode()
    body = struct.pack("<I", len(text)) + text + b"".join(arrays)
    digest = hashlib.sha256(body).digest()[:16]
    return _HEAD.pack(MAGIC, FORMAT, len(body), model_mark(checkpoint.model)) + digest + body


def from_bytes(data: bytes, model: Model) -> Checkpoint:
    """Read a checkpoint.

    Parameters
    ----------
    data : bytes
        What `to_bytes` wrote.
    model : Model
        The model that it was written under.

    Returns
    -------
    Checkpoint
        One that goes on exactly as the one that was written.

    Raises
    ------
    UnreadableCheckpoint
        If the bytes are damaged, of another version, or of another model.
    """
    body = _body(data, model)
    (length,) = struct.unpack_from("<I", body)
    facts = json.loads(body[4 : 4 + length])
    memory = Memory(
        facts["memory"][0],
        tuple(facts["memory"][1]),
        tuple(Quantiles(*level) for level in facts["memory"][2]),
    )
    if "early" in facts:
        return Checkpoint(
            model, _refolded(model, [Observation(*values) for values in facts["early"]]), memory
        )
    if "state" in facts:
        return Checkpoint(model, _state(model, facts["state"], body[4 + length :]), memory)
    return Checkpoint(model, None, memory)


def _body(data: bytes, model: Model) -> bytes:
    if len(data) < _HEAD.size + 16:
        raise UnreadableCheckpoint("it is cut short")
    magic, version, length, mark = _HEAD.unpack_from(data)
    if magic != MAGIC or version != FORMAT:
        raise UnreadableCheckpoint("it is of another format or version")
    if mark != model_mark(model):
        raise UnreadableCheckpoint("it was written under other settings or by another version of the model")
    digest, body = data[_HEAD.size : _HEAD.size + 16], data[_HEAD.size + 16 :]
    if len(body) != length or hashlib.sha256(body).digest()[:16] != digest:
        raise UnreadableCheckpoint("it is damaged")
    return body


def _memory_facts(memory: Memory) -> list[Any]:
    return [
        memory.last_announced,
        list(memory.positions),
        [[level.low, level.mid, level.high] for level in memory.levels],
    ]


def _written(one: Observation) -> list[Any]:
    return [one.position, one.count, one.exposure, one.relative_sd]


def _refolded(model: Model, counts: list[Observation]) -> FilterState:
    state, _ = first_count(model, (counts[0],))
    for observation in counts[1:]:
        state, _ = next_count(state, (observation,))
    return state


def _state_facts(state: FilterState) -> dict[str, Any]:
    return {
        "counted": state.counted,
        "position": state.position,
        "pairs": int(state.log_weight.size),
        "slots": int(state.run_factor.size),
        "kind": state.weights.dtype.str,
        "recent": [
            [number, *_written(one)]
            for number, (one,) in zip(state.recent.numbers, state.recent.counts, strict=True)
        ],
    }


def _state_arrays(state: FilterState) -> list[bytes]:
    bench, filled = state.bench, state.weights != 0.0
    parts: tuple[NDArray[Any], ...] = (
        bench.dispersion,
        bench.wander,
        state.log_weight,
        state.pair_total,
        bench.grid.spacing,
        bench.grid.first,
        bench.grid.size,
        state.run_factor,
        state.slots.oldest,
        state.slots.newest,
        state.slots.start_position,
    )
    lately = [state.recent.origin.tobytes(), state.recent.log_scale.tobytes()]
    return (
        [a.tobytes() for a in parts]
        + lately
        + [np.packbits(filled).tobytes(), state.weights[filled].tobytes()]
    )


def _state(model: Model, facts: dict[str, Any], data: bytes) -> FilterState:
    pairs, slots, offset = facts["pairs"], facts["slots"], 0

    def take(count: int, kind: str) -> NDArray[Any]:
        nonlocal offset
        values = np.frombuffer(data, dtype=kind, count=count, offset=offset).copy()
        offset += values.nbytes
        return values

    dispersion, wander, log_weight, pair_total, spacing = (take(pairs, "<f8") for _ in range(5))
    first, size = (take(pairs, "<i8") for _ in range(2))
    run_factor = take(slots, "<f8")
    oldest, newest, position = (take(slots, "<i8") for _ in range(3))
    lately = facts["recent"]
    origin, log_scale = (take(len(lately) * pairs, "<f8").reshape(-1, pairs) for _ in range(2))
    recent = RecentRuns(
        tuple(number for number, *_ in lately),
        tuple((Observation(*values),) for _, *values in lately),
        origin,
        log_scale,
    )
    grid = LevelGrid(spacing, first, size)
    cells = grid.rows * slots
    filled = np.unpackbits(take(-(-cells // 8), "u1"), count=cells).astype(bool)
    weights = np.zeros(cells, dtype=facts["kind"])
    weights[filled] = take(int(filled.sum()), facts["kind"])
    return FilterState(
        bench=bench_for(model, dispersion, wander, np.zeros(1, dtype=np.int64), grid),
        counted=facts["counted"],
        position=facts["position"],
        log_weight=log_weight,
        weights=weights.reshape(grid.rows, slots),
        run_factor=run_factor,
        pair_total=pair_total,
        slots=RunSlots(oldest, newest, position),
        reference=np.zeros(1),
        recent=recent,
        early=(),
    )
