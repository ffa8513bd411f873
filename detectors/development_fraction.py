"""The share of its final total that a release is expected to have at an age, and how sure that is."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator

from detectors.development import Development, Step, WholeWay
from detectors.errors import UnusableParameter

FloatArray = NDArray[np.float64]
Basis = Literal["stream", "slate"]


@dataclass(frozen=True, slots=True)
class Evidence:
    """The least that a development factor must rest on before it is used.

    Attributes
    ----------
    rows : int
        Releases whose growth in the step is known, at least 2. The standard error's own relative error is
        about 1 / sqrt(2 (rows - 1)): 27 % at 8 rows.
    counts : int
        Sum of their earlier cells, at least 1.
    streams : int
        Streams that a pooled factor rests on, at least 2: with fewer nothing says how much streams differ.
    """

    rows: int = 8
    counts: int = 100
    streams: int = 3

    def __post_init__(self) -> None:
        for name, least in (("rows", 2), ("counts", 1), ("streams", 2)):
            if getattr(self, name) < least:
                raise UnusableParameter(name, getattr(self, name), f"at least {least}")


ENOUGH = Evidence()


@dataclass(frozen=True, slots=True)
class Fraction:
    """The expected share of the final total at an age.

    Attributes
    ----------
    age : float
        The age in days.
    fraction : float
        One over the product of the factors from there on: the exposure of a count read at that age.
    process_sd : float
        Relative standard deviation from the release's own chance on the way to its final total (Mack's).
    parameter_sd : float
        Relative standard error of the estimated factors (Mack's; a pooled one includes how streams differ).
    relative_sd : float
        What enters the filter with the exposure, and is not Mack's: the process error of the way taken whole
        where that is larger, less the chance of counts, which the negative binomial has already; and the
        parameter error.
    basis : {"stream", "slate"}
        Whose factors these are.
    """

    age: float
    fraction: float
    process_sd: float
    parameter_sd: float
    relative_sd: float
    basis: Basis = "stream"

    @property
    def standard_error(self) -> float:
        """Mack's relative standard error of the final total: process and parameter error together."""
        return math.hypot(self.process_sd, self.parameter_sd)


@dataclass(frozen=True, slots=True)
class NotEnough:
    """Too little is known of the growth from an age on, so a count of that age has to wait.

    Attributes
    ----------
    age : float
        The age asked for, in days.
    why : str
        What is lacking, in a sentence.
    """

    age: float
    why: str


def expected_fraction(
    development: Development,
    age: float,
    *,
    size: float | None = None,
    evidence: Evidence = ENOUGH,
    basis: Basis = "stream",
) -> Fraction | NotEnough:
    """The share of the final total expected at an age.

    Parameters
    ----------
    development : Development
        Development factors, of the stream or pooled.
    age : float
        Age in days, at least 0. From the last stated age on the count is final.
    size : float or None
        Total at that age for which the process error is wanted, above 0; None for the usual size of the rows
        that the factors rest on. It should not be the count that is judged: a low count would excuse itself.
    evidence : Evidence
        The least that every step from there on must rest on.
    basis : {"stream", "slate"}
        Whose factors they are; pooled ones must also rest on enough streams.

    Returns
    -------
    Fraction or NotEnough

    Raises
    ------
    UnusableParameter
        If the age or the size cannot be.

    Notes
    -----
    At a stated age k, with C_k the size and C_l = C_k f_k ... f_{l-1}:
    process_sd^2 = sum_l sigma_l^2 / (f_l^2 C_l), parameter_sd^2 = sum_l s.e.(f_l)^2 / f_l^2 (Mack 1993,
    Theorem 3, divided by the ultimate squared; the relative error of 1 / F is that of F to first order). If
    a final total were nothing but independent Poisson increments, process_sd^2 would be (1 - 1 / F) / C_k;
    with w the larger of process_sd^2 and `WholeWay.relative_variance` (of enough rows),
    relative_sd^2 = max(w - (1 - 1 / F) / C_k, 0) + parameter_sd^2. Between stated ages the log fraction is
    interpolated monotonically over the log age, the squared deviations linearly. Errors of the factors are
    common to all counts of one age; the filter takes them as independent.

    Examples
    --------
    >>> steps = (Step(1.0, 7.0, 1.25, 0.5, 0.02, rows=10, counts=1250.0, size=125.0),)
    >>> at_one = expected_fraction(Development((1.0, 7.0), steps), 1.0)
    >>> parts = (at_one.fraction, at_one.process_sd, at_one.parameter_sd, at_one.relative_sd)
    >>> [round(part, 4) for part in parts]
    [0.8, 0.0506, 0.016, 0.0349]
    >>> expected_fraction(Development((1.0, 7.0), steps), 0.5).why
    'Growth is known from an age of 1 days on; this count is 0.5 days old.'
    """
    _check(age, size)
    if age >= development.ages[-1]:
        return Fraction(age, 1.0, 0.0, 0.0, 0.0, basis)
    if age < development.ages[0]:
        return NotEnough(age, f"Growth is known from an age of {development.ages[0]:g} days on; "
                              f"this count is {age:g} days old.")  # fmt: skip
    first = int(np.searchsorted(development.ages, age, side="right")) - 1
    for step in development.steps[first:]:
        lacking = _lacking(step, evidence, basis)
        if lacking is not None:
            return NotEnough(age, lacking)
    at = [_at_stated(development, k, size, evidence) for k in range(first, len(development.ages))]
    return _between(np.log(development.ages[first:]), np.array(at), age, basis)


def fraction_for(
    own: Development, pooled: Development | None, age: float, *, evidence: Evidence = ENOUGH
) -> Fraction | NotEnough:
    """The stream's own fraction where it has enough, the slate's where that has, else what the stream lacks.

    Examples
    --------
    >>> nothing = Development((1.0, 7.0), (Step(1.0, 7.0, None, None, None, rows=0, counts=0.0, size=0.0),))
    >>> fraction_for(nothing, None, 3.0).why
    'Growth from 1 to 7 days is known of 0 releases; 8 are needed.'
    """
    by_itself = expected_fraction(own, age, evidence=evidence)
    if isinstance(by_itself, Fraction) or pooled is None:
        return by_itself
    shared = expected_fraction(pooled, age, evidence=evidence, basis="slate")
    return shared if isinstance(shared, Fraction) else by_itself


def _check(age: float, size: float | None) -> None:
    if not 0.0 <= age < math.inf:
        raise UnusableParameter("age", age, "a finite number of days, at least 0")
    if size is not None and not 0.0 < size < math.inf:
        raise UnusableParameter("size", size, "a finite number above 0, or none")


def _lacking(step: Step, evidence: Evidence, basis: Basis) -> str | None:
    growth = f"Growth from {step.from_age:g} to {step.to_age:g} days"
    if basis == "slate" and step.streams < evidence.streams:
        return f"{growth} is known of {step.streams} streams; {evidence.streams} are needed."
    if step.rows < evidence.rows:
        return f"{growth} is known of {step.rows} releases; {evidence.rows} are needed."
    if basis == "stream" and step.counts < evidence.counts:
        return f"{growth} rests on {step.counts:.0f} counts; {evidence.counts} are needed."
    if not step.factor or step.variance is None or step.standard_error is None:
        return f"{growth} ends at totals of 0, which tell no fraction."
    return None


def _between(log_ages: FloatArray, at: FloatArray, age: float, basis: Basis) -> Fraction:
    """Interpolate what holds at the stated ages from the one at or before the age on."""
    here = math.log(age)
    fraction = math.exp(float(PchipInterpolator(log_ages, at[:, 0])(here)))
    process, parameter, beyond = (float(np.interp(here, log_ages, at[:, part])) for part in (1, 2, 3))
    return Fraction(
        age, fraction, math.sqrt(process), math.sqrt(parameter), math.sqrt(beyond + parameter), basis
    )


def _at_stated(
    development: Development, first: int, size: float | None, evidence: Evidence
) -> tuple[float, float, float, float]:
    """Log fraction at a stated age; variances of process, parameter, and process beyond chance of counts."""
    grown, process, parameter, chance = 1.0, 0.0, 0.0, 0.0
    for step in development.steps[first:]:
        factor, variance, error = step.factor or 1.0, step.variance or 0.0, step.standard_error or 0.0
        total = step.size if size is None else size * grown
        process += variance / (factor**2 * total)
        chance += max(factor - 1.0, 0.0) / (factor * total)
        parameter += (error / factor) ** 2
        grown *= factor
    whole = _whole_variance(development.whole_ways[first : first + 1], size, evidence)
    return -math.log(grown), process, parameter, max(max(process, whole) - chance, 0.0)


def _whole_variance(ways: Sequence[WholeWay], size: float | None, evidence: Evidence) -> float:
    """Relative variance of the way taken whole; 0 where too few rows tell it."""
    for way in ways:
        if way.relative_variance is not None and way.rows >= evidence.rows:
            return way.relative_variance * (1.0 if size is None else way.size / size)
    return 0.0
