"""What every release of a triangle is expected to reach at the last age, with Mack's standard error."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from detectors.development import Development, FloatArray
from detectors.errors import UnusableParameter
from detectors.growth_triangle import Triangle


@dataclass(frozen=True, slots=True)
class Ultimate:
    """What one release is expected to reach.

    Attributes
    ----------
    row : int
        Its row in the triangle.
    latest : float
        Its newest known cell.
    latest_place : int
        The column of that cell.
    ultimate : float
        Expected total at the last stated age.
    process_error, parameter_error : float
        Standard errors from the release's own chance and from the estimated factors: Mack's two parts.
    standard_error : float
        Their root sum of squares, Mack's standard error of the ultimate and of the reserve alike.
    """

    row: int
    latest: float
    latest_place: int
    ultimate: float
    process_error: float
    parameter_error: float
    standard_error: float

    @property
    def reserve(self) -> float:
        """What is still to come."""
        return self.ultimate - self.latest


@dataclass(frozen=True, slots=True)
class Ultimates:
    """Every release that can be developed, and all of them together.

    Attributes
    ----------
    rows : tuple of Ultimate
        The releases with a known cell and known factors from there on.
    reserve : float
        What is still to come in all of them.
    standard_error : float
        Mack's standard error of that sum: the factors' errors are common to all rows.
    """

    rows: tuple[Ultimate, ...]
    reserve: float
    standard_error: float


def ultimates(triangle: Triangle, development: Development) -> Ultimates:
    """Develop every release to the last stated age.

    Parameters
    ----------
    triangle : Triangle
        The totals.
    development : Development
        Factors between the same ages.

    Returns
    -------
    Ultimates

    Raises
    ------
    UnusableParameter
        If the ages differ.

    Notes
    -----
    With the sums over the rows used in step k, and C_i,k the expected cells of row i beyond its newest one:
    s.e.(R_i)^2 = U_i^2 sum_k sigma_k^2 / f_k^2 (1 / C_i,k + 1 / sum_j C_j,k); the total adds for each two
    rows 2 U_i U_j sum_k sigma_k^2 / f_k^2 / sum_j C_j,k over the steps that both have before them.

    References
    ----------
    Mack (1993), ASTIN Bulletin 23, 213-225: Theorem 3 and its Corollary.

    Examples
    --------
    >>> from detectors.development import chain_ladder
    >>> cells = np.array([[10.0, 20.0], [30.0, 54.0], [20.0, np.nan]])
    >>> triangle = Triangle((1.0, 2.0), cells)
    >>> young = ultimates(triangle, chain_ladder(triangle)).rows[-1]
    >>> young.ultimate, round(young.standard_error, 3)
    (37.0, 3.0)
    """
    if triangle.ages != development.ages:
        raise UnusableParameter("ages", development.ages, f"those of the triangle, {triangle.ages}")
    process, parameter = _relative_variances(development)
    rows = []
    for row, cells in enumerate(triangle.counts):
        known = np.flatnonzero(~np.isnan(cells))
        if known.size and not np.isnan(parameter[known[-1] :]).any():
            rows.append(_one(row, cells, int(known[-1]), development, process, parameter))
    return Ultimates(tuple(rows), sum(u.reserve for u in rows), _total_error(rows, parameter))


def _relative_variances(development: Development) -> tuple[FloatArray, FloatArray]:
    """For each step sigma^2 / f^2, and the squared relative standard error of f; NaN where not known."""
    process = np.full(len(development.steps), np.nan)
    parameter = np.full(len(development.steps), np.nan)
    for place, step in enumerate(development.steps):
        if step.factor and step.variance is not None and step.standard_error is not None:
            process[place] = step.variance / step.factor**2
            parameter[place] = (step.standard_error / step.factor) ** 2
    return process, parameter


def _one(
    row: int,
    cells: FloatArray,
    place: int,
    development: Development,
    process: FloatArray,
    parameter: FloatArray,
) -> Ultimate:
    latest = expected = float(cells[place])
    own_chance = 0.0
    for later in range(place, len(process)):
        # A total of 0 has no relative error: by the model it stays 0.
        own_chance += process[later] / expected if expected > 0.0 else 0.0
        expected *= development.steps[later].factor or 0.0
    common = float(parameter[place:].sum())
    return Ultimate(
        row=row,
        latest=latest,
        latest_place=place,
        ultimate=expected,
        process_error=expected * math.sqrt(own_chance),
        parameter_error=expected * math.sqrt(common),
        standard_error=expected * math.sqrt(own_chance + common),
    )


def _total_error(rows: Sequence[Ultimate], parameter: FloatArray) -> float:
    """Process errors add as squares; parameter errors of one step add up before they are squared."""
    process = sum(row.process_error**2 for row in rows)
    common = 0.0
    for place in range(parameter.size):
        exposed = sum(row.ultimate for row in rows if row.latest_place <= place)
        if exposed > 0.0:
            common += exposed**2 * float(parameter[place])
    return math.sqrt(process + common)
