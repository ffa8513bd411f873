"""Late or not, by cases worked out by hand: rounds hourly, so that over two hours without is downtime."""

import datetime

import pytest

from service.round.lateness import Downtime, downtimes, is_late
from service.round.observe import Place
from storage.rounds import BROKEN_OFF, FAILED, GOOD, NOTHING_NEW, Round

UTC = datetime.UTC
NOW = datetime.datetime(2026, 3, 2, 12, tzinfo=UTC)
HOUR = datetime.timedelta(hours=1)


def _round(hours_ago: float, outcome: str = GOOD) -> Round:
    started = NOW - hours_ago * HOUR
    return Round(1, "plays", started, started, outcome, 0, 0, 0, 0, 0, 0, (), None)


def _place(ready_ago: float, read_ago: float | None) -> Place:
    read = None if read_ago is None else NOW - read_ago * HOUR
    return Place("k", datetime.date(2026, 3, 1), None, 1, NOW - ready_ago * HOUR, read)


@pytest.mark.parametrize(
    ("rounds", "found"),
    [
        ([], []),
        ([_round(0)], []),
        ([_round(0), _round(1), _round(2, NOTHING_NEW), _round(3)], []),
        ([_round(0), _round(50), _round(51)], [(50, 2)]),
        # Rounds that reached nothing close no gap.
        ([_round(0), _round(1, FAILED), _round(2, BROKEN_OFF), _round(3)], [(3, 2)]),
        ([_round(9), _round(10)], [(9, 2)]),
        ([_round(0), _round(9), _round(10), _round(20)], [(9, 2), (20, 12)]),
    ],
)
def test_stretches_without_rounds(rounds, found) -> None:
    expected = [Downtime(NOW - since * HOUR, NOW - late * HOUR) for since, late in found]
    assert list(downtimes(rounds, HOUR, NOW)) == expected


@pytest.mark.parametrize(
    ("ready_ago", "read_ago", "late"),
    [
        (30, 0, True),  # complete in the middle of the downtime, read after it
        (1, 0, False),  # complete when rounds had come back, or nearly
        (60, 0, True),  # a source that lags behind gave it during the downtime, or nobody can tell
        (60, 55, False),  # known before: an old count that was folded again
        (60, 50, True),  # read just before the crash, folded after it
        (30, 300, True),  # a release whose count did not change any more
        (30, None, True),  # an absent interval, taken for zero
    ],
)
def test_what_is_late_after_fifty_hours_of_downtime(ready_ago, read_ago, late) -> None:
    stretches = downtimes([_round(0), _round(50), _round(51)], HOUR, NOW)
    assert is_late(_place(ready_ago, read_ago), stretches) is late


def test_a_source_that_lags_behind_makes_nothing_late() -> None:
    stretches = downtimes([_round(hours) for hours in range(20)], HOUR, NOW)
    assert not is_late(_place(72, 0), stretches)
