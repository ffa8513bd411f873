"""How a stream stands: one word, the first that holds."""

import datetime
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.standing import Bearings, Standing, standing

NOW = datetime.datetime(2026, 3, 2, 14, 0, tzinfo=datetime.UTC)
HOUR = datetime.timedelta(hours=1)
CALM = Bearings(NOW - HOUR, HOUR, counted=100, fewest_counts=12, window=40, counts_since=None)


def test_nothing_to_say_is_steady() -> None:
    assert standing(CALM, NOW) is Standing.STEADY


@pytest.mark.parametrize(
    ("ago", "word"),
    [(HOUR * 2, "steady"), (HOUR * 2 + datetime.timedelta(seconds=1), "late"), (-HOUR, "steady")],
)
def test_late_is_more_than_two_rounds_without_a_good_one(ago: datetime.timedelta, word: str) -> None:
    assert standing(replace(CALM, last_good_utc=NOW - ago), NOW) == word


def test_a_source_that_was_never_reached_is_late() -> None:
    assert standing(replace(CALM, last_good_utc=None), NOW) is Standing.LATE


@pytest.mark.parametrize(("counted", "word"), [(0, "too short"), (11, "too short"), (12, "steady")])
def test_too_short_is_fewer_counts_than_may_ring(counted: int, word: str) -> None:
    assert standing(replace(CALM, counted=counted), NOW) == word


@pytest.mark.parametrize(("since", "word"), [(0, "unsettled"), (39, "unsettled"), (40, "steady")])
def test_unsettled_is_a_shift_announced_within_the_window(since: int, word: str) -> None:
    assert standing(replace(CALM, counts_since=since), NOW) == word


@given(st.sampled_from([CALM.last_good_utc, None]), st.sampled_from([100, 3]), st.sampled_from([None, 5]))
def test_the_order_of_precedence(good: datetime.datetime | None, counted: int, since: int | None) -> None:
    holds = {
        Standing.LATE: good is None,
        Standing.TOO_SHORT: counted < CALM.fewest_counts,
        Standing.UNSETTLED: since is not None,
        Standing.STEADY: True,
    }
    said = standing(replace(CALM, last_good_utc=good, counted=counted, counts_since=since), NOW)
    assert said is next(word for word in Standing if holds[word])
