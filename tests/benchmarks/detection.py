"""How soon a fall is told, and how often a stream that only wears down is called for nothing.

Protocol: level 1000, dispersion 6 (unknown to the filter and between its grid values), 3 % one-offs of 5 to 50
times. The threshold is set so that unchanged streams of 1000 counts alarm once per 1000 counts. Then: the
share of falls to 0.6 told within 10 and 20 counts, after 100 and after 400 counts; and the alarm rate on a level
that wears down by 25 % a year of weekly counts, against the flat one. Beside them, on the same series: the
filter that knows the dispersion and has no wander, and the CUSUM that knows both levels and the dispersion and
meets no one-offs.
"""

import math
import sys
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass

import numpy as np
from alarms import Recorded, alarms, record, threshold_for

from detectors.counts import log_negative_binomial
from detectors.judge import Rule
from detectors.model import Model
from detectors.simulation import NO_ONE_OFFS, OneOffs, simulate, stepped, wearing

LEVEL, DISPERSION, FALL = 1000.0, 6.0, 0.6
ONE_OFFS = OneOffs(share=0.03, least=5.0, most=50.0)
FLAT_COUNTS = 1000
AFTER = (100, 400)
WITHIN = (10, 20)
PER_COUNT = 1e-3
GROUP = 8


@dataclass(frozen=True)
class Share:
    """A share with its binomial standard error."""

    hits: int
    of: int

    def __str__(self) -> str:
        share = self.hits / self.of
        return f"{100 * share:.0f} ({100 * math.sqrt(share * (1 - share) / self.of):.1f})"


@dataclass(frozen=True)
class Figures:
    """The figures of one detector; `wear_ratio` with the standard error that its two Poisson counts give."""

    name: str
    threshold: float
    flat_alarms: int
    wear_alarms: int
    found: dict[tuple[int, int], Share]

    @property
    def wear_ratio(self) -> float:
        return self.wear_alarms / max(self.flat_alarms, 1)

    @property
    def wear_error(self) -> float:
        return self.wear_ratio * math.sqrt(1 / max(self.flat_alarms, 1) + 1 / max(self.wear_alarms, 1))


def counts_of(kind: str, seed: int, one_offs: OneOffs):
    """One seeded series: "flat", "wear", or the number of counts before the fall."""
    random = np.random.default_rng([seed, sum(map(ord, kind))])
    if kind == "flat":
        return simulate(np.full(FLAT_COUNTS, LEVEL), DISPERSION, one_offs, random)
    if kind == "wear":
        return simulate(wearing(LEVEL, FLAT_COUNTS, share_a_year=0.25), DISPERSION, one_offs, random)
    before = int(kind)
    levels = stepped(LEVEL, before + max(WITHIN) + 5, change_at=before, factor=FALL)
    return simulate(levels, DISPERSION, one_offs, random)


def recorded(task: tuple[Model, str, range, int]) -> list[Recorded]:
    model, kind, seeds, longest = task
    return record(model, [counts_of(kind, seed, ONE_OFFS) for seed in seeds], longest)


def measure(name: str, model: Model, rules: list[Rule], streams: int, pool) -> list[Figures]:
    """All figures of the filter under one model and several rules; twice as many streams for the falls."""
    longest = max(rule.window for rule in rules)

    def fold(kind: str, how_many: int) -> list[Recorded]:
        groups = [range(first, min(first + GROUP, how_many)) for first in range(0, how_many, GROUP)]
        parts = pool.map(recorded, [(model, kind, seeds, longest) for seeds in groups])
        return [one for part in parts for one in part]

    flat, wear = fold("flat", streams), fold("wear", streams)
    fallen = {before: fold(str(before), 2 * streams) for before in AFTER}
    return [judged(f"{name}, lasting {rule.lasting}", rule, flat, wear, fallen) for rule in rules]


def judged(
    name: str, rule: Rule, flat: list[Recorded], wear: list[Recorded], fallen: dict[int, list[Recorded]]
) -> Figures:
    """The figures of one rule on recorded streams."""
    threshold = threshold_for(flat, rule, PER_COUNT)
    rule = Rule(threshold, rule.window, rule.lasting, rule.fewest_counts)
    found = {}
    for before, streams in fallen.items():
        rung = [alarms(stream, rule) for stream in streams]
        for within in WITHIN:
            hits = sum(any(before <= place < before + within for place in places) for places in rung)
            found[before, within] = Share(hits, len(rung))
    flat_alarms, wear_alarms = (sum(len(alarms(one, rule)) for one in group) for group in (flat, wear))
    return Figures(name, threshold, flat_alarms, wear_alarms, found)


def cusum_statistic(counts) -> np.ndarray:
    """CUSUM of the log likelihood ratio of the two known levels (Page 1954; alarm at or above the limit)."""
    score = log_negative_binomial(counts, LEVEL * FALL, DISPERSION) - log_negative_binomial(
        counts, LEVEL, DISPERSION
    )
    path, statistic = np.empty(len(score)), 0.0
    for place, one in enumerate(score):
        statistic = max(0.0, statistic + float(one))
        path[place] = statistic
    return path


def cusum_alarms(counts, limit: float) -> list[int]:
    """Places of the alarms; after one the sum starts again at zero."""
    rung, rest = [], 0
    while rest < len(counts):
        over = np.flatnonzero(cusum_statistic(counts[rest:]) >= limit)
        if not over.size:
            break
        rung.append(rest + int(over[0]))
        rest = rung[-1] + 1
    return rung


def measure_cusum(streams: int) -> Figures:
    """The CUSUM that knows everything, on series without one-offs."""
    flat = [counts_of("flat", seed, NO_ONE_OFFS) for seed in range(10 * streams)]
    low, high = 0.0, 20.0
    for _ in range(30):
        middle = (low + high) / 2
        ringing = sum(len(cusum_alarms(counts, middle)) for counts in flat)
        low, high = (middle, high) if ringing > PER_COUNT * FLAT_COUNTS * len(flat) else (low, middle)
    found = {}
    for before in AFTER:
        rung = [cusum_alarms(counts_of(str(before), seed, NO_ONE_OFFS), high) for seed in range(10 * streams)]
        for within in WITHIN:
            hits = sum(any(before <= place < before + within for place in places) for places in rung)
            found[before, within] = Share(hits, len(rung))
    wear = sum(len(cusum_alarms(counts_of("wear", seed, NO_ONE_OFFS), high)) for seed in range(streams))
    total = sum(len(cusum_alarms(counts, high)) for counts in flat)
    return Figures("CUSUM that knows levels and dispersion", high, round(total / 10), wear, found)


def table(figures: list[Figures]) -> str:
    """A Markdown table; standard errors in brackets."""
    head = "| detector | threshold | after 100: 10 / 20 | after 400: 10 / 20 | wearing / flat alarms |"
    lines = [head, "| --- | --- | --- | --- | --- |"]
    for one in figures:
        after = [f"{one.found[before, 10]} / {one.found[before, 20]}" for before in AFTER]
        ratio = f"{one.wear_ratio:.2f} ({one.wear_error:.2f})"
        lines.append(f"| {one.name} | {one.threshold:.4f} | {after[0]} | {after[1]} | {ratio} |")
    return "\n".join(lines)


def main(streams: int) -> str:
    """Run all detectors and return the table."""
    lasting = [Rule(lasting=length) for length in (3, 4, 5)]
    knowing = Model(dispersions=(DISPERSION,), wanders=((0.0, 1.0),))
    with ProcessPoolExecutor() as pool:
        figures = measure("this filter, default model", Model(), lasting, streams, pool)
        figures += measure(
            "the filter that knows the dispersion, no wander", knowing, [Rule()], streams, pool
        )
    return table([*figures, measure_cusum(streams)])


if __name__ == "__main__":
    print(main(int(sys.argv[1]) if len(sys.argv) > 1 else 300))
