"""How closely the filter computes what the model says."""

import math
from dataclasses import dataclass

from detectors.errors import UnusableParameter


@dataclass(frozen=True, slots=True)
class Accuracy:
    """The numerical choices of the filter. They change its error and its cost, not the model.

    Attributes
    ----------
    spacing : float
        Factor on the automatic spacing of the level grid; a quarter makes the grid four times finer.
    reach : float
        Factor on how far the level grid reaches beyond the counts and the level.
    exact_run_length : int
        Runs up to this length are kept one by one, so a judge's window must not be longer.
    merging : float
        Older runs are merged so that a group spans at most its age divided by this; infinity merges none.
    drop_below : float
        Pairs of dispersion and wander less probable than this are dropped for good; 0 drops none.
    crop_below : float
        Share of a pair's mass below which a grid cell is emptied; 0 empties none.
    early : int
        Up to this many counts the filter keeps the counts and folds them again when the grid must change;
        later it carries its weights to the new grid, in single precision.
    """

    spacing: float = 1.0
    reach: float = 1.0
    exact_run_length: int = 40
    merging: float = 8.0
    drop_below: float = 1e-6
    crop_below: float = 1e-9
    early: int = 24

    def __post_init__(self) -> None:
        if not 0.0 < self.spacing <= 2.0:
            raise UnusableParameter("spacing", self.spacing, "above 0 and at most 2")
        if not 0.5 <= self.reach <= 4.0:
            raise UnusableParameter("reach", self.reach, "from 0.5 to 4")
        if self.exact_run_length < 2:
            raise UnusableParameter("exact_run_length", self.exact_run_length, "at least 2")
        if not self.merging >= 2.0:
            raise UnusableParameter("merging", self.merging, "at least 2")
        if not 0.0 <= self.drop_below <= 1e-3:
            raise UnusableParameter("drop_below", self.drop_below, "from 0 to 0.001")
        if not 0.0 <= self.crop_below <= 1e-6:
            raise UnusableParameter("crop_below", self.crop_below, "from 0 to 0.000001")
        if not 1 <= self.early <= 1000:
            raise UnusableParameter("early", self.early, "from 1 to 1000")

    @property
    def merges(self) -> bool:
        """Whether old runs are merged at all."""
        return self.merging < math.inf
