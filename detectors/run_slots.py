"""Which runs are kept, one by one or in groups, and where each one's weights stand."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.accuracy import Accuracy

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

BLOCK = 8
EMPTY = 0


@dataclass(frozen=True)
class RunSlots:
    """Columns of the weight array. A merged column is used again, so the array seldom grows.

    Counts are numbered from 1. Slot 0 holds the first run for good.

    Attributes
    ----------
    oldest, newest : ndarray of int, shape (slots,)
        Number of the first count of the oldest and of the newest run in the slot; 0 where it is empty.
    start_position : ndarray of int, shape (slots,)
        Position on the axis that stands for the group's starts when its age is needed.
    """

    oldest: IntArray
    newest: IntArray
    start_position: IntArray

    @property
    def used(self) -> NDArray[np.bool_]:
        """Which slots hold a run."""
        return self.newest > EMPTY

    def by_age(self) -> IntArray:
        """Used slots other than the first run's, youngest first."""
        used = np.flatnonzero(self.used[1:]) + 1
        return used[np.argsort(-self.newest[used], kind="stable")]

    def grown(self) -> "RunSlots":
        """The same slots with empty ones appended."""
        more = np.zeros(BLOCK, dtype=np.int64)
        return RunSlots(*(np.concatenate((a, more)) for a in (self.oldest, self.newest, self.start_position)))


def first_slot(position: int) -> RunSlots:
    """The slots after the first count: only the first run is there."""
    empty = np.zeros(BLOCK, dtype=np.int64)
    first = np.eye(1, BLOCK, dtype=np.int64)[0]
    return RunSlots(first, first.copy(), empty + position * first)


def with_new_run(slots: RunSlots, slot: int, counted: int, position: int) -> RunSlots:
    """The slots after a run that starts with count number `counted` is put into a slot."""
    oldest, newest, start = slots.oldest.copy(), slots.newest.copy(), slots.start_position.copy()
    oldest[slot] = newest[slot] = counted
    start[slot] = position
    return RunSlots(oldest, newest, start)


def merges_due(slots: RunSlots, counted: int, accuracy: Accuracy) -> list[tuple[int, int]]:
    """Pairs of neighbouring slots (kept, emptied) to be merged after count number `counted`.

    Two neighbours are merged when both are older than the lengths kept one by one and the group that they
    would form spans at most its youngest age divided by `accuracy.merging`.
    """
    if not accuracy.merges or counted <= accuracy.exact_run_length + 1:
        return []
    order = slots.by_age()
    youngest = counted - slots.newest[order] + 1
    order, youngest = (
        order[youngest > accuracy.exact_run_length],
        youngest[youngest > accuracy.exact_run_length],
    )
    if order.size < 2:
        return []
    span = slots.newest[order[:-1]] - slots.oldest[order[1:]] + 1
    due, last = [], -1
    for place in np.flatnonzero(span * accuracy.merging <= youngest[:-1]).tolist():
        if place > last:
            due.append((int(order[place + 1]), int(order[place])))
            last = place + 1
    return due


def after_merge(slots: RunSlots, kept: int, emptied: int, share_kept: float) -> RunSlots:
    """The slots after one group is merged into its older neighbour.

    The position that stands for the group is the mean of both, weighted by their probability.
    """
    oldest, newest, start = slots.oldest.copy(), slots.newest.copy(), slots.start_position.copy()
    newest[kept] = newest[emptied]
    start[kept] = round(share_kept * int(start[kept]) + (1.0 - share_kept) * int(start[emptied]))
    oldest[emptied] = newest[emptied] = start[emptied] = EMPTY
    return RunSlots(oldest, newest, start)
