"""Streams, their stored history and their shifts, for people and for machines. Pure."""

from collections.abc import Mapping

from detectors.posterior import Quantiles, RunLengths, Weighted
from service.cli.show import Cell, number_text
from storage.codec import decode_history
from storage.posteriors import StoredPosterior
from storage.shifts import Shift
from storage.streams import Stream

STREAM_COLUMNS = (
    "stream",
    "title",
    "slate",
    "counts",
    "newest",
    "count",
    "recent shift",
    "level (5 to 95 %)",
    "hushed until",
)
HISTORY_COLUMNS = (
    "at",
    "count",
    "shift",
    "run",
    "run lengths",
    "level (5 to 95 %)",
    "one-off",
    "log p",
)
SHIFT_COLUMNS = (
    "shift",
    "title",
    "since",
    "noticed at",
    "probability",
    "level before",
    "level after",
    "state",
    "origin",
    "told",
)
MOST_GROUPS = 3
SMALLEST_SHARE = 0.05


def stream_cells(stream: Stream, newest: StoredPosterior | None) -> list[Cell]:
    """A line of `streams`."""
    head: list[Cell] = [stream.id, stream.title, stream.slate]
    if newest is None:
        return [*head, 0, None, None, None, None, stream.hushed_until_utc]
    return [
        *head,
        newest.counted,
        newest.key,
        newest.count,
        probability_text(newest.recent_shift),
        quantiles_text(newest.level),
        stream.hushed_until_utc,
    ]


def stream_json(stream: Stream, newest: StoredPosterior | None) -> dict[str, object]:
    """A stream with what was last said of it."""
    return {
        "id": stream.id,
        "title": stream.title,
        "source": stream.source,
        "split": stream.split,
        "slate": stream.slate,
        "shape": stream.shape,
        "first_read": stream.first_read_utc,
        "last_seen": stream.last_seen_utc,
        "hushed_until": stream.hushed_until_utc,
        "counts": 0 if newest is None else newest.counted,
        "newest": None if newest is None else figures_json(newest),
    }


def history_cells(stored: StoredPosterior) -> list[Cell]:
    """A line of `history`."""
    return [
        stored.key,
        stored.count,
        probability_text(stored.recent_shift),
        stored.run_length_mode,
        run_lengths_text(decode_history(stored.history).run_lengths),
        quantiles_text(stored.level),
        probability_text(stored.one_off),
        stored.log_predictive,
    ]


def history_json(stored: StoredPosterior) -> dict[str, object]:
    """One stored posterior with the whole run-length posterior of its observation."""
    kept = decode_history(stored.history)
    return {
        **figures_json(stored),
        "run_lengths": run_lengths_json(kept.run_lengths),
        "dispersion": weighted_json(kept.dispersion),
        "wander": weighted_json(kept.wander),
        "written": stored.written_utc,
        "fingerprint": stored.fingerprint,
    }


def figures_json(stored: StoredPosterior) -> dict[str, object]:
    """The figures of one stored posterior, named as `replay` names them."""
    return {
        "key": stored.key,
        "at": stored.at,
        "position": stored.position,
        "counted": stored.counted,
        "count": stored.count,
        "recent_shift": stored.recent_shift,
        "run_length_mode": stored.run_length_mode,
        "level": quantiles_json(stored.level),
        "one_off": stored.one_off,
        "log_predictive": stored.log_predictive,
        "pit": stored.pit,
    }


def shift_cells(shift: Shift, titles: Mapping[str, str]) -> list[Cell]:
    """A line of `shifts`."""
    return [
        shift.id,
        titles.get(shift.stream_id, shift.stream_id),
        shift.start_key,
        shift.announced_key,
        probability_text(shift.probability),
        quantiles_text(shift.level_before),
        quantiles_text(shift.level_after),
        shift.state,
        "found in history" if shift.origin == "history" else shift.origin,
        shift.told_utc,
    ]


def shift_json(shift: Shift, titles: Mapping[str, str]) -> dict[str, object]:
    """A shift with all its figures; levels are filtered ones."""
    return {
        "id": shift.id,
        "stream": shift.stream_id,
        "title": titles.get(shift.stream_id),
        "origin": shift.origin,
        "state": shift.state,
        "start": {"key": shift.start_key, "at": shift.start_at, "position": shift.start_position},
        "announced": {
            "key": shift.announced_key,
            "at": shift.announced_at,
            "position": shift.announced_position,
        },
        "recorded": shift.announced_utc,
        "region": shift.region,
        "probability": shift.probability,
        "level_before": quantiles_json(shift.level_before),
        "level_after": quantiles_json(shift.level_after),
        "late": shift.late,
        "told": shift.told_utc,
    }


def quantiles_json(level: Quantiles) -> tuple[float, float, float]:
    """The 5 %, 50 % and 95 % quantiles."""
    return (level.low, level.mid, level.high)


def quantiles_text(level: Quantiles) -> str:
    """A level with its range."""
    return f"{number_text(level.mid)} ({number_text(level.low)} to {number_text(level.high)})"


def probability_text(value: float) -> str:
    """A probability to three places."""
    return f"{value:.3f}"


def run_lengths_text(run_lengths: RunLengths) -> str:
    """The most probable groups of run lengths, and whether one is the first run."""
    groups = sorted(run_lengths_json(run_lengths), key=lambda group: -group["probability"])
    shown = [group for group in groups[:MOST_GROUPS] if group["probability"] >= SMALLEST_SHARE] or groups[:1]
    return ", ".join(map(_group_text, shown))


def run_lengths_json(run_lengths: RunLengths) -> list[dict[str, float]]:
    """The groups of a run-length posterior, shortest first."""
    last = len(run_lengths.probability) - 1
    triples = zip(run_lengths.shortest, run_lengths.longest, run_lengths.probability, strict=True)
    return [
        {
            "shortest": shortest,
            "longest": longest,
            "probability": probability,
            "first_run": run_lengths.holds_first_run and place == last,
        }
        for place, (shortest, longest, probability) in enumerate(triples)
    ]


def weighted_json(weighted: Weighted) -> list[dict[str, object]]:
    """Values with their probabilities; infinity, which JSON lacks, as the word for that limit."""
    return [
        {"value": "poisson" if value == float("inf") else value, "probability": probability}
        for value, probability in zip(weighted.value, weighted.probability, strict=True)
    ]


def _group_text(group: dict[str, float]) -> str:
    shortest, longest = int(group["shortest"]), int(group["longest"])
    lengths = f"{shortest}" if shortest == longest else f"{shortest} to {longest}"
    return f"{'first run' if group['first_run'] else lengths}: {group['probability']:.2f}"
