"""Merging of old runs: every run length stays in exactly one group, and groups grow with age."""

import math

import numpy as np
import pytest

from detectors.accuracy import Accuracy
from detectors.run_slots import RunSlots, after_merge, first_slot, merges_due, with_new_run


def grown_to(counted: int, accuracy: Accuracy) -> tuple[RunSlots, int]:
    """Slots after so many counts, one unit apart, and the largest number of slots in use on the way."""
    slots, most = first_slot(0), 1
    for number in range(2, counted + 1):
        free = np.flatnonzero(~slots.used)
        if not free.size:
            slots = slots.grown()
            free = np.flatnonzero(~slots.used)
        slots = with_new_run(slots, int(free[0]), number, number - 1)
        most = max(most, int(slots.used.sum()))
        for kept, emptied in merges_due(slots, number, accuracy):
            assert slots.oldest[emptied] == slots.newest[kept] + 1
            slots = after_merge(slots, kept, emptied, 0.5)
    return slots, most


@pytest.mark.parametrize("counted", [1, 2, 39, 42, 43, 60, 200, 1_500])
def test_every_start_is_in_one_group_and_the_first_run_apart(counted: int) -> None:
    slots, _ = grown_to(counted, Accuracy())
    assert (slots.oldest[0], slots.newest[0]) == (1, 1)
    order = slots.by_age()
    covered = [s for slot in order for s in range(slots.newest[slot], slots.oldest[slot] - 1, -1)]
    assert covered == list(range(counted, 1, -1))


@pytest.mark.parametrize("counted", [60, 500, 1_500])
def test_recent_runs_stay_single_and_old_groups_stay_narrow(counted: int) -> None:
    accuracy = Accuracy()
    slots, _ = grown_to(counted, accuracy)
    for slot in slots.by_age():
        youngest = counted - slots.newest[slot] + 1
        span = slots.newest[slot] - slots.oldest[slot] + 1
        assert span == 1 or youngest > accuracy.exact_run_length
        assert span <= max(1.0, youngest / accuracy.merging)
        assert slots.oldest[slot] - 1 <= slots.start_position[slot] <= slots.newest[slot] - 1


def test_the_number_of_slots_grows_with_the_logarithm() -> None:
    # Ages in proportion: a group at age a spans at least some a / (2 merging), hence about
    # 2 merging log(n / exact) groups beside the exact ones.
    accuracy = Accuracy()
    for counted in (300, 1_200, 3_000):
        _, most = grown_to(counted, accuracy)
        bound = accuracy.exact_run_length + 2.5 * accuracy.merging * math.log(
            counted / accuracy.exact_run_length
        )
        assert most <= bound + 8


def test_nothing_is_merged_when_merging_is_off() -> None:
    slots, most = grown_to(150, Accuracy(merging=math.inf))
    assert most == 150
    assert (slots.oldest == slots.newest).all()


def test_a_group_stands_at_the_weighted_mean_of_its_starts() -> None:
    slots = RunSlots(np.array([1, 2, 6]), np.array([1, 5, 7]), np.array([0, 10, 30]))
    merged = after_merge(slots, 1, 2, 0.75)
    # Three quarters of the probability stand at 10 and one quarter at 30.
    assert merged.start_position.tolist() == [0, 15, 0]
    assert merged.oldest.tolist() == [1, 2, 0]
    assert merged.newest.tolist() == [1, 7, 0]
    # The slots that it came from are unchanged.
    assert slots.start_position.tolist() == [0, 10, 30]
