"""The schedule of attempts. Its figures are ours; what is checked is what it promises."""

import random
from datetime import timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.deliver.backoff import JITTER, MOST_ATTEMPTS, WAITS_SECONDS, Again, GiveUp, after_failure
from service.outlets.outlet import Kind, Outcome

LATER = Outcome(Kind.TRY_LATER, 500)


def wait(outcome: Outcome, attempts: int, chance: float = 0.0) -> float:
    following = after_failure(outcome, attempts, lambda: chance)
    assert isinstance(following, Again)
    return following.wait.total_seconds()


def test_the_waits_grow_from_seconds_to_a_day():
    waits = [wait(LATER, attempts) for attempts in range(1, MOST_ATTEMPTS)]
    assert waits == sorted(waits)
    assert (waits[0], waits[-1]) == (10.0, 86_400.0)


def test_a_receiver_that_is_down_from_friday_to_tuesday_still_gets_its_alert():
    least = timedelta(seconds=sum(wait(LATER, attempts) for attempts in range(1, MOST_ATTEMPTS)))
    most = least * (1 + JITTER)
    assert timedelta(days=4) < least < most < timedelta(days=6)


def test_it_is_given_up_after_a_stated_number_of_attempts():
    assert MOST_ATTEMPTS == len(WAITS_SECONDS) + 1 == 14
    assert after_failure(LATER, MOST_ATTEMPTS, lambda: 0.5) == GiveUp("Given up after 14 attempts.")
    assert isinstance(after_failure(LATER, 10_000, lambda: 0.5), GiveUp)


def test_the_end_is_the_end_at_the_first_attempt():
    assert isinstance(after_failure(Outcome(Kind.ENDED, 410), 1, lambda: 0.5), GiveUp)


def test_what_people_must_mend_is_tried_again_like_anything_else():
    refused = Outcome(Kind.REFUSED, 403)
    assert all(wait(refused, attempts) == wait(LATER, attempts) for attempts in range(1, MOST_ATTEMPTS))


def test_retry_after_lengthens_the_wait_and_never_shortens_it():
    assert wait(Outcome(Kind.TRY_LATER, 429, None, 120.0), 1) == 120.0
    assert wait(Outcome(Kind.TRY_LATER, 429, None, 1.0), 4) == wait(LATER, 4)
    assert wait(Outcome(Kind.TRY_LATER, 503, None, 0.0), 1) == 10.0


def test_retry_after_is_capped_at_a_day():
    assert wait(Outcome(Kind.TRY_LATER, 503, None, 1e12), 1) == 86_400.0


@given(
    st.integers(1, MOST_ATTEMPTS - 1),
    st.floats(0, 1, exclude_max=True),
    st.one_of(st.none(), st.floats(0, 86_400)),
    st.sampled_from([Kind.TRY_LATER, Kind.REFUSED]),
)
def test_jitter_only_lengthens_by_at_most_a_fifth(attempts, chance, asked, kind):
    plain = wait(Outcome(kind, None, None, asked), attempts)
    drawn = wait(Outcome(kind, None, None, asked), attempts, chance)
    assert plain <= drawn + 1e-6
    assert drawn <= plain * 1.2 + 1e-6
    assert drawn >= (asked or 0.0) - 1e-6


def test_what_failed_together_is_not_tried_together():
    chance = random.Random(4).random
    waits = {after_failure(LATER, 8, chance).wait for _ in range(40)}
    assert len(waits) == 40


@pytest.mark.parametrize("attempts", [0, -1])
def test_a_count_that_cannot_be_counts_as_the_first(attempts: int):
    assert wait(LATER, attempts) == 10.0
