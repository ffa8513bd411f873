"""Jobs on real threads, for a few hundredths of a second each."""

import threading

import pytest

from service.schedule import Job, Schedule

PATIENCE_SECONDS = 10.0


def test_what_is_to_be_done_once_is_done_once_and_before_nothing_else_is_due() -> None:
    done, calls = threading.Event(), list[str]()
    schedule = Schedule()
    schedule.add_once(lambda: (calls.append("once"), done.set()))
    schedule.add(Job("later", lambda: calls.append("later"), 3600.0, 3600.0))
    schedule.start()
    assert done.wait(PATIENCE_SECONDS)
    assert schedule.stop(PATIENCE_SECONDS)
    assert calls == ["once"]


@pytest.mark.filterwarnings("error::pytest.PytestUnhandledThreadExceptionWarning")
def test_it_may_be_stopped_in_the_moment_in_which_it_is_started() -> None:
    for _ in range(30):
        schedule = Schedule()
        schedule.add_once(lambda: None)
        schedule.add(Job("now", lambda: None, 3600.0, 0.0))
        schedule.start()
        assert schedule.stop(PATIENCE_SECONDS)


def test_what_is_under_way_is_waited_for_within_a_bound() -> None:
    begun, end = threading.Event(), threading.Event()
    schedule = Schedule()
    schedule.add(Job("long", lambda: (begun.set(), end.wait(PATIENCE_SECONDS)), 3600.0, 0.0))
    schedule.start()
    assert begun.wait(PATIENCE_SECONDS)
    assert not schedule.stop(0.05)
    end.set()
    assert schedule.stop(PATIENCE_SECONDS)


def test_an_action_that_raises_is_logged_and_done_again() -> None:
    twice = threading.Event()
    calls: list[int] = []

    def failing() -> None:
        calls.append(1)
        if len(calls) == 2:
            twice.set()
        raise RuntimeError("no")

    schedule = Schedule()
    schedule.add(Job("failing", failing, 0.05, 0.0))
    schedule.start()
    assert twice.wait(PATIENCE_SECONDS)
    assert schedule.stop(PATIENCE_SECONDS)
