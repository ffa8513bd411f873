"""The daemon's workers: woken, stopped within a bound, and not ended by a fault. Waits here are on events."""

import threading
from datetime import timedelta

import pytest

from service.deliver.loop import Tools
from service.deliver.workers import Deliverer
from service.outlets.outlet import Kind, Outcome
from storage.errors import StoreBusy


@pytest.fixture
def troubles() -> list[tuple[str, Exception]]:
    return []


class Heard:
    """A watcher that lets a test wait for a number of attempts."""

    def __init__(self) -> None:
        self.reports, self.changed = [], threading.Condition()

    def __call__(self, report) -> None:
        with self.changed:
            self.reports.append(report)
            self.changed.notify_all()

    def wait_for(self, number: int) -> bool:
        with self.changed:
            return self.changed.wait_for(lambda: len(self.reports) >= number, 5.0)


def test_it_delivers_when_woken_and_stops(store, clock, told, put, troubles):
    heard, desk = Heard(), told("desk")
    deliverer = Deliverer(Tools(store, clock, lambda: 0.0, heard), [desk], lambda *it: troubles.append(it))
    deliverer.start()
    put("msg_1")
    deliverer.wake()
    assert heard.wait_for(1)
    put("msg_2")
    deliverer.wake()
    assert heard.wait_for(2)
    assert deliverer.stop(within_seconds=3.0)
    assert troubles == []


def test_what_comes_due_is_tried_without_being_woken(store, clock, told, put, troubles):
    heard, desk = Heard(), told("desk", [Outcome(Kind.TRY_LATER, 500, "It answered 500.")])
    put("msg_1")

    # Once the first attempt has failed the clock jumps to just before the second is due.
    def jump(report) -> None:
        clock.move_on(timedelta(seconds=9.96))
        heard(report)

    deliverer = Deliverer(Tools(store, clock, lambda: 0.0, jump), [desk], lambda *it: troubles.append(it))
    deliverer.start()
    assert heard.wait_for(1)
    clock.move_on(timedelta(seconds=10))
    assert heard.wait_for(2)
    assert deliverer.stop(within_seconds=3.0)


def test_an_outlet_that_hangs_holds_up_neither_the_others_nor_the_stop(store, clock, told, put, troubles):
    heard, release = Heard(), threading.Event()
    slow = told("slow", before=lambda: release.wait(10.0))
    put("msg_1", outlet="slow")
    put("msg_2", outlet="quick")
    deliverer = Deliverer(
        Tools(store, clock, lambda: 0.0, heard), [slow, told("quick")], lambda *it: troubles.append(it)
    )
    deliverer.start()
    assert heard.wait_for(1)
    assert heard.reports[0].outlet == "quick"
    assert not deliverer.stop(within_seconds=0.2)
    release.set()
    assert deliverer.stop(within_seconds=3.0)
    assert heard.wait_for(2)


def test_a_busy_database_is_reported_and_survived(store, clock, told, put):
    heard, ring = Heard(), threading.Event()
    faults = [StoreBusy("here", 1.0), RuntimeError("something unforeseen")]
    troubles = []

    class Flaky:
        reading = store.reading

        def writing(self):
            if faults:
                raise faults.pop(0)
            return store.writing()

    def trouble(name: str, error: Exception) -> None:
        troubles.append((name, type(error)))
        ring.set()
        deliverer.wake()

    deliverer = Deliverer(Tools(Flaky(), clock, lambda: 0.0, heard), [told("desk")], trouble)
    put("msg_1")
    deliverer.start()
    assert heard.wait_for(1)
    assert troubles == [("desk", StoreBusy), ("desk", RuntimeError)]
    assert deliverer.stop(within_seconds=3.0)
