"""Grids of the log level, one per pair of dispersion and wander, laid end to end."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class LevelGrid:
    """The nodes of every pair: node k of a pair lies at log level (first + k) * spacing.

    Attributes
    ----------
    spacing : ndarray, shape (pairs,)
        Spacing in the log level.
    first : ndarray of int, shape (pairs,)
        Lowest node, in units of the spacing.
    size : ndarray of int, shape (pairs,)
        Number of nodes.

    Examples
    --------
    >>> grid = LevelGrid(np.array([0.5]), np.array([2]), np.array([3]))
    >>> grid.log_level.tolist()
    [1.0, 1.5, 2.0]
    """

    spacing: FloatArray
    first: IntArray
    size: IntArray

    @cached_property
    def start(self) -> IntArray:
        """First row of each pair's block."""
        return np.concatenate(([0], np.cumsum(self.size)[:-1])).astype(np.int64)

    @cached_property
    def rows(self) -> int:
        """Number of nodes of all pairs together."""
        return int(self.size.sum())

    @cached_property
    def pair(self) -> IntArray:
        """The pair of each row."""
        return np.repeat(np.arange(self.size.size), self.size)

    @cached_property
    def node(self) -> IntArray:
        """The node of each row, in units of its pair's spacing."""
        return np.arange(self.rows) - np.repeat(self.start - self.first, self.size)

    @cached_property
    def log_level(self) -> FloatArray:
        """The log level of each row."""
        return self.node * self.spread(self.spacing)

    @cached_property
    def lowest(self) -> FloatArray:
        """Lowest log level of each pair."""
        return self.first * self.spacing

    @cached_property
    def highest(self) -> FloatArray:
        """Highest log level of each pair."""
        return (self.first + self.size - 1) * self.spacing

    def spread(self, values: FloatArray) -> FloatArray:
        """One value a pair, repeated for each of its rows."""
        # The method, not the function: this is called a dozen times a count, and the wrapper costs as much.
        return values.repeat(self.size)

    def of_pairs(self, kept: IntArray) -> "LevelGrid":
        """The grids of some of the pairs."""
        return LevelGrid(self.spacing[kept], self.first[kept], self.size[kept])

    def rows_of_pairs(self, kept: IntArray) -> IntArray:
        """The rows that belong to some of the pairs, in their order."""
        return np.concatenate([np.arange(self.start[p], self.start[p] + self.size[p]) for p in kept])


def grid_over(spacing: FloatArray, lowest: FloatArray, highest: FloatArray) -> LevelGrid:
    """Grids that span a range of log levels at the given spacing (arrays of shape (pairs,))."""
    first = np.floor(lowest / spacing).astype(np.int64)
    last = np.ceil(highest / spacing).astype(np.int64)
    return LevelGrid(spacing, first, np.maximum(last - first + 1, 2))
