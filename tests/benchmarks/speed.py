"""What one observation costs, in yardsticks, and what a stream takes on disk.

A yardstick is ten calls of scipy's log-gamma function on 1000 values, timed between the blocks of the same run:
the machine may be shared, so only ratios mean anything. One observation is one call of `advance`, with all that
the daemon does in it. Medians over levels 10 and 10,000 and dispersions 3, 10 and 100, several streams each.
"""

import sys
import time

import numpy as np
from scipy.special import gammaln

from detectors.advance import advance, start
from detectors.checkpoint_bytes import to_bytes
from detectors.judge import Rule
from detectors.model import Model
from detectors.run_length import next_count
from detectors.side_by_side import joined
from detectors.simulation import OneOffs, as_observations, simulate
from storage.codec import encode_history

LEVELS, DISPERSIONS = (10.0, 10_000.0), (3.0, 10.0, 100.0)
SIZES = (30, 100, 200, 600, 1_000, 10_000)
TIMED = 12
JOINED_AT = 30
VALUES = np.linspace(1.0, 1000.0, 1000)


def yardstick() -> float:
    """Seconds of ten log-gamma calls, the quickest of a few."""
    best = float("inf")
    for _ in range(5):
        began = time.perf_counter()
        for _ in range(10):
            gammaln(VALUES)
        best = min(best, time.perf_counter() - began)
    return best


def one_stream(level: float, dispersion: float, seed: int, largest: int):
    """Yardsticks an observation, checkpoint bytes and posterior bytes, at each size up to the largest."""
    sizes = [size for size in SIZES if size <= largest]
    random = np.random.default_rng([seed, int(level), int(dispersion)])
    counts = simulate(np.full(sizes[-1] + TIMED, level), dispersion, OneOffs(share=0.03), random)
    observations = as_observations(counts)
    checkpoint, place, rows = start(Model()), 0, []
    for size in sizes:
        checkpoint = advance(checkpoint, observations[place:size], Rule()).checkpoint
        ratios, place = [], size
        for _ in range(TIMED):
            before = yardstick()
            began = time.perf_counter()
            done = advance(checkpoint, observations[place : place + 1], Rule())
            took = time.perf_counter() - began
            ratios.append(took / ((before + yardstick()) / 2))
            checkpoint, place = done.checkpoint, place + 1
        said = done.posteriors[-1]
        stored = len(encode_history(said.run_lengths, said.dispersion, said.wander))
        rows.append((size, float(np.median(ratios)), len(to_bytes(checkpoint)), stored))
    return rows


def measure(seeds: int, largest: int):
    """All streams: a list of (level, dispersion, rows)."""
    return [
        (level, dispersion, one_stream(level, dispersion, seed, largest))
        for level in LEVELS
        for dispersion in DISPERSIONS
        for seed in range(seeds)
    ]


def table(found) -> str:
    """A Markdown table by number of counts."""
    lines = [
        "| counts | yardsticks, median | dispersion 16 or less | least to most | checkpoint kB | posterior bytes |",
        "| --- | --- | --- | --- | --- | --- |",
    ]
    for column, size in enumerate(row[0] for row in found[0][2]):
        costs = np.array([rows[column][1] for _, _, rows in found])
        low = np.array([rows[column][1] for _, dispersion, rows in found if dispersion <= 16])
        disk = np.median([rows[column][2] for _, _, rows in found]) / 1000
        stored = max(rows[column][3] for _, _, rows in found)
        lines.append(
            f"| {size} | {np.median(costs):.1f} | {np.median(low):.1f} | {costs.min():.1f} to {costs.max():.1f} "
            f"| {disk:.0f} | {stored} |"
        )
    return "\n".join(lines)


def side_by_side(level: float, dispersion: float, begun: int, counts: int, streams: int) -> float:
    """How many times quicker a count is folded when streams are folded in one call."""
    random = np.random.default_rng([int(level), int(dispersion)])
    series = [
        as_observations(simulate(np.full(begun + counts, level), dispersion, OneOffs(share=0.03), random))
        for _ in range(streams)
    ]
    states = [advance(start(Model()), stream[:begun], Rule()).checkpoint.state for stream in series]
    # Put side by side while young: merging old runs makes streams that were folded alone differ.
    young = [advance(start(Model()), stream[:JOINED_AT], Rule()).checkpoint.state for stream in series]
    together = joined(young)
    for place in range(JOINED_AT, begun):
        together, _ = next_count(together, tuple(stream[place] for stream in series))
    began = time.perf_counter()
    for state, stream in zip(states, series, strict=True):
        alone = state
        for observation in stream[begun:]:
            alone, _ = next_count(alone, (observation,))
    between = time.perf_counter()
    for place in range(begun, begun + counts):
        together, _ = next_count(together, tuple(stream[place] for stream in series))
    return (between - began) / (time.perf_counter() - between)


def gains(streams: int = 8, counts: int = 40) -> str:
    """A Markdown table of what folding streams side by side gains."""
    lines = [
        f"| level, dispersion | gain from {streams} in one call: after 30 counts | after 300 |",
        "| --- | --- | --- |",
    ]
    for level, dispersion in ((10.0, 3.0), (1000.0, 6.0), (10_000.0, 100.0)):
        gain = [side_by_side(level, dispersion, begun, counts, streams) for begun in (30, 300)]
        lines.append(f"| {level:.0f}, {dispersion:.0f} | {gain[0]:.1f} | {gain[1]:.1f} |")
    return "\n".join(lines)


def conjugate(largest: int) -> str:
    """Beside it, where it is installed: the exact conjugate Poisson filter of the compiled package `changepoint`.

    It knows neither overdispersion nor one-offs, wander or a smallest shift, and cuts no run off.
    """
    try:
        import changepoint
    except ImportError:
        return "The package `changepoint` is not installed, so its filter is not shown beside this one."
    counts = simulate(np.full(largest + TIMED, 10.0), 10.0, OneOffs(), np.random.default_rng(1)).tolist()
    other = changepoint.Bocpd(changepoint.PoissonGamma(1.0, 1.0), 150.0)
    lines, place = ["| counts | yardsticks of `changepoint` (compiled, Poisson) |", "| --- | --- |"], 0
    for size in (size for size in SIZES if size <= largest):
        for count in counts[place:size]:
            other.step(count)
        ratios, place = [], size
        for count in counts[size : size + TIMED]:
            before, began = yardstick(), time.perf_counter()
            other.step(count)
            ratios.append((time.perf_counter() - began) / before)
            place += 1
        lines.append(f"| {size} | {np.median(ratios):.2f} |")
    return "\n".join(lines)


def main(seeds: int, largest: int) -> str:
    """Run and return the tables."""
    return "\n\n".join((table(measure(seeds, largest)), gains(), conjugate(largest)))


if __name__ == "__main__":
    print(main(*(int(word) for word in sys.argv[1:3])) if len(sys.argv) > 2 else main(2, 10_000))
