"""One count, ready for the filter."""

from dataclasses import dataclass

from detectors.errors import UnusableObservation

LARGEST_COUNT = 2**53


@dataclass(frozen=True, slots=True)
class Observation:
    """A count with its place on the stream's axis, its exposure and its uncertainty.

    Attributes
    ----------
    position : int
        Place on the axis: release number, or number of the day, week, hour.
    count : int or None
        The count, 0 to 2**53; None when it is missing.
    exposure : float
        Expected count divided by the level; 1 for a complete, unseasonal count.
    relative_sd : float
        Relative standard deviation of the exposure when it is itself an estimate; 0 when it is known.

    Raises
    ------
    UnusableObservation
        If a value lies outside these bounds.

    Examples
    --------
    >>> Observation(position=4, count=12).exposure
    1.0
    """

    position: int
    count: int | None
    exposure: float = 1.0
    relative_sd: float = 0.0

    def __post_init__(self) -> None:
        if self.count is not None and not 0 <= self.count <= LARGEST_COUNT:
            raise UnusableObservation("count", self.count, f"an integer from 0 to {LARGEST_COUNT}, or none")
        if not 0.0 < self.exposure < float("inf"):
            raise UnusableObservation("exposure", self.exposure, "a finite number above 0")
        if not 0.0 <= self.relative_sd < float("inf"):
            raise UnusableObservation("relative_sd", self.relative_sd, "a finite number of at least 0")
