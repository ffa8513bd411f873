"""Figures of posteriors, for people and for machines. Pure."""

import datetime

from detectors.posterior import Quantiles, RunLengths, Weighted
from service.tell.effect import known_from_above, under_words
from storage.posteriors import StoredPosterior

LEVEL_COLUMN = "level (5 to 95 %)"


def place_text(shape: str, key: str, at: datetime.date | datetime.datetime) -> str:
    """What a count is called in a table: an interval by its key, a release by its day."""
    return key if shape == "calendar" else at.isoformat()[: len("2026-03-02")]


def figures_json(stored: StoredPosterior) -> dict[str, object]:
    """The figures of one stored posterior, named as `replay` names them."""
    return {
        "place": stored.place,
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


def quantiles_json(level: Quantiles) -> tuple[float, float, float]:
    """The 5 %, 50 % and 95 % quantiles."""
    return (level.low, level.mid, level.high)


def quantiles_text(level: Quantiles) -> str:
    """A level with its range, or what it lies under where no more is known."""
    if known_from_above(level):
        return under_words(level)
    low, mid, high = (_level_number(value) for value in quantiles_json(level))
    return f"{mid} ({low} to {high})"


def probability_text(value: float) -> str:
    """A probability to three places."""
    return f"{value:.3f}"


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


def _level_number(value: float) -> str:
    """Three digits, from a thousand on all of them."""
    return f"{value:,.0f}" if value >= 99.95 else f"{value:.3g}"
