"""The chain ladder: how totals grow from age to age, with Mack's standard errors."""

import math
from collections.abc import Collection
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.growth_triangle import Triangle

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Step:
    """Growth from one stated age to the next.

    Attributes
    ----------
    from_age, to_age : float
        The two ages in days.
    factor : float or None
        Development factor f: the later cells' sum over the earlier ones' sum. None if no row tells it.
    variance : float or None
        Mack's sigma^2: a row grows from C to f C with variance sigma^2 C. None if it cannot be told.
    standard_error : float or None
        Standard error of the factor.
    rows : int
        Number of rows whose own factor is known: both cells are, and the earlier one is above 0.
    counts : float
        Sum of the earlier cells.
    size : float
        Mean earlier cell of these rows; 0 if there are none.
    streams : int
        Number of streams the factor rests on.
    """

    from_age: float
    to_age: float
    factor: float | None
    variance: float | None
    standard_error: float | None
    rows: int
    counts: float
    size: float
    streams: int = 1


@dataclass(frozen=True, slots=True)
class WholeWay:
    """How much releases differ in their growth from a stated age to the last one, taken in one step.

    Attributes
    ----------
    rows : int
        Releases of which both totals are known and no step is left out.
    size : float
        Their mean total at the age.
    relative_variance : float or None
        Mack's sigma^2 of that one step over f^2 size; None with fewer than two rows.
    """

    rows: int
    size: float
    relative_variance: float | None


@dataclass(frozen=True, slots=True)
class Development:
    """Development factors from each stated age to the next.

    Attributes
    ----------
    ages : tuple of float
        The stated ages in days; one more than there are steps.
    steps : tuple of Step
        One entry a step.
    whole_ways : tuple of WholeWay
        One for each stated age but the last. Mack's process error adds the steps as if they were
        uncorrelated; where a release that starts fast goes on fast, the way taken whole shows it.
    left_out : tuple of (int, int)
        Pairs (row, step) that the factors do not use.
    """

    ages: tuple[float, ...]
    steps: tuple[Step, ...]
    whole_ways: tuple[WholeWay, ...] = ()
    left_out: tuple[tuple[int, int], ...] = ()


def chain_ladder(triangle: Triangle, *, left_out: Collection[tuple[int, int]] = ()) -> Development:
    """Estimate development factors and their standard errors.

    Parameters
    ----------
    triangle : Triangle
        The totals. A step uses the rows whose two cells are known, so early cells may be missing.
    left_out : collection of (int, int)
        Pairs (row, step) that are not to be used, e.g. those of `development_check.one_off_growth`.

    Returns
    -------
    Development
        Every step, however little it rests on; what is enough to act on is `development_fraction`'s to say.

    Notes
    -----
    With the sums over the rows i used in step k: f_k = sum C_{i,k+1} / sum C_{i,k}, sigma_k^2 =
    sum C_{i,k} (C_{i,k+1} / C_{i,k} - f_k)^2 / (rows - 1), s.e.(f_k)^2 = sigma_k^2 / sum C_{i,k}. Where a
    single row is used, sigma_k^2 = min(sigma_{k-1}^4 / sigma_{k-2}^2, sigma_{k-2}^2, sigma_{k-1}^2), Mack's
    rule for the last step. A row whose earlier cell is 0 adds its later cell to the numerator (for sparse
    counts the quotient of sums is biased without), but has no factor of its own and none in sigma_k^2.

    References
    ----------
    Mack (1993), Distribution-free calculation of the standard error of chain ladder reserve estimates, ASTIN
    Bulletin 23, 213-225: the estimators of its section 2 and the rule for the last variance.

    Examples
    --------
    >>> cells = np.array([[10.0, 20.0, 22.0], [30.0, 54.0, np.nan], [np.nan, 50.0, 60.0]])
    >>> development = chain_ladder(Triangle((1.0, 2.0, 3.0), cells))
    >>> [round(step.factor, 4) for step in development.steps]
    [1.85, 1.1714]
    """
    steps: list[Step] = []
    for place in range(len(triangle.ages) - 1):
        skipped = [row for row, step in left_out if step == place]
        steps.append(_step(triangle, place, skipped, steps))
    ways = [_whole_way(triangle, place, left_out) for place in range(len(steps))]
    return Development(triangle.ages, tuple(steps), tuple(ways), tuple(sorted(left_out)))


def usable(triangle: Triangle, place: int) -> BoolArray:
    """The rows whose growth in one step is known: both cells are, and the earlier one is above 0."""
    with_growth: BoolArray = (triangle.counts[:, place] > 0.0) & ~np.isnan(triangle.counts[:, place + 1])
    return with_growth


def _step(triangle: Triangle, place: int, skipped: list[int], before: list[Step]) -> Step:
    earlier, later = triangle.counts[:, place].copy(), triangle.counts[:, place + 1]
    earlier[skipped] = np.nan
    both = ~np.isnan(earlier) & ~np.isnan(later)
    grown = usable(triangle, place) & both
    counts = float(earlier[both].sum())
    rows = int(grown.sum())
    factor = float(later[both].sum()) / counts if counts > 0.0 else None
    variance = None
    if factor is not None:
        c, own = earlier[grown], later[grown] / earlier[grown]
        variance = float((c * (own - factor) ** 2).sum()) / (rows - 1) if rows > 1 else _min_rule(before)
    return Step(
        from_age=triangle.ages[place],
        to_age=triangle.ages[place + 1],
        factor=factor,
        variance=variance,
        standard_error=None if variance is None else math.sqrt(variance / counts),
        rows=rows,
        counts=counts,
        size=counts / rows if rows else 0.0,
    )


def _whole_way(triangle: Triangle, place: int, left_out: Collection[tuple[int, int]]) -> WholeWay:
    skipped = {row for row, step in left_out if step >= place}
    ends = Triangle((triangle.ages[place], triangle.ages[-1]), triangle.counts[:, [place, -1]])
    whole = _step(ends, 0, sorted(skipped), [])
    variance = None
    if whole.factor and whole.rows > 1 and whole.variance is not None:
        variance = whole.variance / (whole.factor**2 * whole.size)
    return WholeWay(whole.rows, whole.size, variance)


def _min_rule(before: list[Step]) -> float | None:
    """Mack's variance of a step with one row, from the two steps before it."""
    if len(before) < 2:
        return None
    last, second_last = before[-1].variance, before[-2].variance
    if last is None or second_last is None:
        return None
    decayed = last / second_last * last if second_last > 0.0 else 0.0
    return min(decayed, last, second_last)
