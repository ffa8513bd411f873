"""Development factors pooled over the streams of a slate, each stream weighing by its releases."""

import math
from collections.abc import Sequence

import numpy as np

from detectors.development import Development, Step, WholeWay
from detectors.errors import UnusableParameter

_LEAST_VARIANCE = 1e-8
"""Relative process variance of streams that all grow exactly alike: nothing is certain to the last digit."""


def pool(developments: Sequence[Development]) -> Development:
    """Pool factors over streams that have the same stated ages.

    Parameters
    ----------
    developments : sequence of Development
        One a stream, as `chain_ladder` gives them.

    Returns
    -------
    Development
        For each step the factor expected of one more stream of the slate. Its standard error includes how
        much streams differ; `rows` and `counts` are sums, `size` is the median over streams.

    Raises
    ------
    UnusableParameter
        If there is no stream, or their stated ages differ.

    Notes
    -----
    Sums over all rows would let the largest show speak for all, and would not know that shows differ. So the
    log factors y_s are pooled as in a meta-analysis with random effects: rho, the mean over streams of
    sigma_s^2 / (f_s^2 size_s) weighted by rows - 1, is the relative process variance of a release; v_s = rho
    / rows_s; tau^2 = max(0, (Q - (S - 1)) / (sum w - sum w^2 / sum w)) with w = 1 / v and
    Q = sum w (y - ybar)^2; y = sum y_s / (v_s + tau^2) / sum 1 / (v_s + tau^2), and the relative variance
    of a stream's factor around exp(y) is tau^2 + 1 / sum 1 / (v_s + tau^2). The process part is Mack's,
    averaged; the rest is not Mack's.

    References
    ----------
    DerSimonian & Laird (1986), Meta-analysis in clinical trials, Controlled Clinical Trials 7, 177-188.

    Examples
    --------
    >>> def one(factor): return Step(1.0, 7.0, factor, 1.0, 0.1, rows=4, counts=100.0, size=25.0)
    >>> shared = pool([Development((1.0, 7.0), (one(factor),)) for factor in (1.2, 1.3, 1.25)])
    >>> round(shared.steps[0].factor, 3), shared.steps[0].rows, shared.steps[0].streams
    (1.249, 12, 3)
    """
    ages = {development.ages for development in developments}
    if len(ages) != 1:
        raise UnusableParameter("developments", f"{len(ages)} sets of ages", "one or more, of the same ages")
    steps = zip(*(development.steps for development in developments), strict=True)
    ways = zip(*(development.whole_ways for development in developments), strict=True)
    return Development(
        ages=ages.pop(),
        steps=tuple(_pooled(step) for step in steps),
        whole_ways=tuple(_pooled_way(way) for way in ways),
    )


def _pooled(steps: Sequence[Step]) -> Step:
    telling = [step for step in steps if step.factor and step.rows]
    spread = [step for step in telling if step.rows > 1 and step.variance is not None]
    factor = variance = error = None
    size = float(np.median([step.size for step in telling])) if telling else 0.0
    if telling:
        process = _process_variance(spread)
        log_factor, squared_error = _random_effects(telling, process or _LEAST_VARIANCE)
        factor = math.exp(log_factor)
        if process is not None:
            variance = process * factor**2 * size
            error = factor * math.sqrt(squared_error)
    return Step(
        from_age=steps[0].from_age,
        to_age=steps[0].to_age,
        factor=factor,
        variance=variance,
        standard_error=error,
        rows=sum(step.rows for step in telling),
        counts=sum(step.counts for step in telling),
        size=size,
        streams=len(telling),
    )


def _pooled_way(ways: Sequence[WholeWay]) -> WholeWay:
    telling = [(way, way.relative_variance) for way in ways if way.relative_variance is not None]
    if not telling:
        return WholeWay(0, 0.0, None)
    freedom = [way.rows - 1 for way, _ in telling]
    return WholeWay(
        rows=sum(way.rows for way, _ in telling),
        size=float(np.median([way.size for way, _ in telling])),
        relative_variance=float(np.average([variance for _, variance in telling], weights=freedom)),
    )


def _process_variance(spread: Sequence[Step]) -> float | None:
    """Relative variance of one release's growth at the usual size, averaged over streams."""
    if not spread:
        return None
    own = [(step.variance or 0.0) / ((step.factor or 1.0) ** 2 * step.size) for step in spread]
    return max(float(np.average(own, weights=[step.rows - 1 for step in spread])), _LEAST_VARIANCE)


def _random_effects(telling: Sequence[Step], process: float) -> tuple[float, float]:
    """The pooled log factor, and the variance of one more stream's log factor around it."""
    y = np.log([step.factor or 1.0 for step in telling])
    v = process / np.array([step.rows for step in telling], dtype=np.float64)
    w = 1.0 / v
    q = float((w * (y - np.average(y, weights=w)) ** 2).sum())
    freedom = float(w.sum() - (w * w).sum() / w.sum())
    between = max(0.0, (q - (len(telling) - 1)) / freedom) if len(telling) > 1 else 0.0
    w = 1.0 / (v + between)
    return float(np.average(y, weights=w)), between + 1.0 / float(w.sum())
