"""What the default threshold gives, by the protocol of tests/benchmarks/detection.py; README.md quotes it.

Run from the root:   PYTHONPATH=tests/benchmarks .venv/bin/python tests/documents/default_threshold.py 100
"""

import sys
from concurrent.futures import Executor, ProcessPoolExecutor

from alarms import Recorded, alarms
from detection import AFTER, FLAT_COUNTS, GROUP, WITHIN, Share, recorded

from detectors.judge import Rule
from detectors.model import Model


def folded(kind: str, streams: int, pool: Executor) -> list[Recorded]:
    """The recorded posteriors of so many series of a kind, under the default model."""
    groups = [range(first, min(first + GROUP, streams)) for first in range(0, streams, GROUP)]
    parts = pool.map(recorded, [(Model(), kind, seeds, Rule().window) for seeds in groups])
    return [one for part in parts for one in part]


def found(fallen: list[Recorded], rule: Rule, before: int, within: int) -> Share:
    """In how many streams the fall is told within so many counts."""
    rung = [alarms(stream, rule) for stream in fallen]
    return Share(
        sum(any(before <= place < before + within for place in places) for places in rung), len(rung)
    )


def main(streams: int) -> str:
    """Fold the series and say what rings."""
    with ProcessPoolExecutor() as pool:
        flat = folded("flat", streams, pool)
        fallen = {before: folded(str(before), 2 * streams, pool) for before in AFTER}
    lines = []
    for threshold in (Rule().threshold, 0.8, 0.7):
        rule = Rule(threshold=threshold)
        rung = sum(len(alarms(one, rule)) for one in flat)
        lines.append(f"threshold {threshold}: {rung} alerts in {FLAT_COUNTS * len(flat)} unchanged counts")
        for before, group in fallen.items():
            shares = [str(found(group, rule, before, within)) for within in WITHIN]
            lines.append(f"  fall to 0.6 after {before}, told within {WITHIN}: {' / '.join(shares)} %")
    return "\n".join(lines)


if __name__ == "__main__":
    print(main(int(sys.argv[1]) if len(sys.argv) > 1 else 100))
