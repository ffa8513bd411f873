"""How the level of a new run depends on the level before it."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.errors import UnusableParameter


@dataclass(frozen=True, slots=True)
class JumpPrior:
    """A heavy-tailed prior on z = log(new level / old level) that leaves out small jumps.

    The density is proportional to u^2 / (1 + u^2)^(5/2) with u = (abs(z) - smallest) / scale for
    abs(z) > smallest, and 0 otherwise: it rises smoothly from the smallest jump (a non-local prior).

    Attributes
    ----------
    smallest : float
        Smallest jump of the log level that counts as a shift, at least 0.
    scale : float
        Scale of the jumps beyond it, above 0.

    References
    ----------
    Johnson & Rossell (2010), On the use of non-local prior densities in Bayesian hypothesis tests,
    JRSS B 72, 143-170.
    """

    smallest: float = math.log1p(0.15)
    scale: float = 0.4

    def __post_init__(self) -> None:
        if not 0.0 <= self.smallest < math.inf:
            raise UnusableParameter("smallest", self.smallest, "a finite number of at least 0")
        if not 0.0 < self.scale < math.inf:
            raise UnusableParameter("scale", self.scale, "a finite number above 0")

    def density(self, jump: NDArray[np.float64]) -> NDArray[np.float64]:
        """Density of jumps of the log level.

        Parameters
        ----------
        jump : ndarray
            Jumps z, any shape.

        Returns
        -------
        ndarray
            Density per unit of z, same shape; it integrates to 1.

        Examples
        --------
        >>> import numpy as np
        >>> z = np.linspace(-400.0, 400.0, 800001)
        >>> round(float(np.sum(JumpPrior().density(z)) * 0.001), 4)
        1.0
        """
        u = np.maximum(np.abs(jump) - self.smallest, 0.0) / self.scale
        # The integral of u^2 / (1 + u^2)^(5/2) over u > 0 is 1/3; there are two sides.
        return 1.5 * u * u / (1.0 + u * u) ** 2.5 / self.scale


@dataclass(frozen=True, slots=True)
class IndependentLevels:
    """Every run draws its level afresh from a gamma distribution: the product-partition model.

    Published results for exchangeable segments use this prior. `nodes` levels, the quantiles of a fixed
    rule, stand for the distribution; wander is not defined with it.

    Attributes
    ----------
    shape, rate : float
        Gamma shape and rate of the level, both above 0.
    lowest, highest : float
        Range of the log level that the grid spans.
    spacing : float
        Spacing of the grid in the log level.
    """

    shape: float = 1.0
    rate: float = 1.0
    lowest: float = -34.0
    highest: float = 5.0
    spacing: float = 0.05

    def __post_init__(self) -> None:
        for name in ("shape", "rate", "spacing"):
            if not 0.0 < getattr(self, name) < math.inf:
                raise UnusableParameter(name, getattr(self, name), "a finite number above 0")
        if not self.lowest < self.highest:
            raise UnusableParameter("highest", self.highest, f"above lowest, {self.lowest}")

    def density(self, log_level: NDArray[np.float64]) -> NDArray[np.float64]:
        """Density of the log level, per unit of the log level, same shape as given."""
        log_density = self.shape * (math.log(self.rate) + log_level) - self.rate * np.exp(log_level)
        return np.exp(log_density - math.lgamma(self.shape))
