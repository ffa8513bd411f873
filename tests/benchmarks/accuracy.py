"""What the filter's shortcuts cost in the alert probability, over simulated streams.

Protocol: streams with shifts, wander and 3 % one-offs, level log-uniform from 5 to 50,000, dispersion log-uniform
from 1 to 1000 (so between the grid's values). The recent shift probability after every count is compared, with
the values of dispersion and wander held the same, between the default numerics and: a level grid four times
finer; one that reaches twice as far; no merging of old runs; a thousand times stricter dropping of pairs; no
emptying of cells.
"""

import math
import sys
from concurrent.futures import ProcessPoolExecutor

import numpy as np

from detectors.accuracy import Accuracy
from detectors.advance import advance, start
from detectors.judge import Rule
from detectors.model import Model
from detectors.simulation import OneOffs, as_observations, simulate

ONE_OFFS = OneOffs(share=0.03)
STRICTER = {
    "grid four times finer": Accuracy(spacing=0.25),
    "grid reaches twice as far": Accuracy(reach=2.0),
    "nothing merged": Accuracy(merging=math.inf),
    "pairs dropped below 1e-9": Accuracy(drop_below=1e-9),
    "no cell emptied": Accuracy(crop_below=0.0),
}
NEVER_RINGS = Rule(threshold=1.0 - 1e-15)


def stream(seed: int, size: int):
    """One seeded series."""
    random = np.random.default_rng(seed)
    dispersion = float(np.exp(random.uniform(0.0, math.log(1000.0))))
    log_level = np.full(size, random.uniform(math.log(5.0), math.log(50_000.0)))
    for _ in range(3):
        change = random.choice([-1, 1]) * random.uniform(0.2, 1.5)
        log_level[int(random.integers(20, size)) :] += change
    wander = float(random.choice([0.0, 0.0, 0.01, 0.03]))
    log_level = log_level + np.cumsum(random.normal(0.0, wander, size))
    return simulate(np.exp(log_level), dispersion, ONE_OFFS, random)


def differences(task: tuple[int, int, tuple[str, ...]]) -> list[float]:
    """Largest difference of the alert probability on one stream, for each stricter setting."""
    seed, size, names = task
    observations = as_observations(stream(seed, size))

    def path(accuracy: Accuracy) -> np.ndarray:
        said = advance(start(Model(accuracy=accuracy)), observations, NEVER_RINGS).posteriors
        return np.array([one.recent_shift for one in said if one is not None])

    plain = path(Accuracy())
    return [float(np.abs(path(STRICTER[name]) - plain).max()) for name in names]


def measure(streams: int, size: int, names: tuple[str, ...] = tuple(STRICTER)) -> dict[str, np.ndarray]:
    """Largest difference on each stream, for each stricter setting."""
    with ProcessPoolExecutor() as pool:
        rows = list(pool.map(differences, [(seed, size, names) for seed in range(streams)]))
    return {name: np.array([row[column] for row in rows]) for column, name in enumerate(names)}


def table(found: dict[str, np.ndarray]) -> str:
    """A Markdown table over the streams."""
    lines = ["| compared with | median | nine in ten below | largest |", "| --- | --- | --- | --- |"]
    for name, values in found.items():
        middle, most, largest = np.median(values), np.quantile(values, 0.9), values.max()
        lines.append(f"| {name} | {middle:.5f} | {most:.5f} | {largest:.5f} |")
    return "\n".join(lines)


def main(streams: int, size: int) -> str:
    """Run and return the table."""
    return table(measure(streams, size))


if __name__ == "__main__":
    print(main(*(int(word) for word in sys.argv[1:3])) if len(sys.argv) > 2 else main(50, 600))
