"""Lets the daemon run, and tells on the screen what it does, until the story is over or the time is."""

import concurrent.futures
import datetime
import threading
import time
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass, field
from queue import Empty

from service.clock import Clock
from service.daemon import watch
from service.demo import screen
from service.demo.narrator import Narrator, reached_words
from service.demo.place import stream_id
from service.demo.receiver import Arrivals, Received
from service.demo.seen import look
from service.demo.story import FALLING_SHOW, Almanac, Show
from service.wiring import Wired
from storage.engine import Store

AFTERWARDS = datetime.timedelta(days=3)
LOOK_SECONDS = 0.2


@dataclass(frozen=True)
class Stage:
    """What is looked at: the daemon's database, its clock, and what arrives at the desk."""

    store: Store
    clock: Clock
    almanac: Almanac
    arrivals: Arrivals


@dataclass(frozen=True)
class Ending:
    """What arrived, and in words how far the daemon came."""

    received: tuple[Received, ...]
    reached: str

    def alerts_for(self, show: Show) -> tuple[Received, ...]:
        """The alerts about a show."""
        return tuple(one for one in self.received if one.stream_id == stream_id(show.name))


def tell_story(wired: Wired, stage: Stage, ends: float) -> Ending:
    """Run the daemon until its alert has arrived and a few days more, at most until `ends` (monotonic)."""
    stop = threading.Event()
    telling = _Telling(stage, ends)
    with ThreadPoolExecutor(1, "watch") as pool:
        watching = pool.submit(watch, wired, stage.clock, stop)
        try:
            telling.go_on_beside(watching)
        finally:
            stop.set()
        # Whatever made it end too early is raised here.
        watching.result()
    telling.take_in()
    return Ending(tuple(telling.received), reached_words(look(stage.store, stage.almanac)))


@dataclass
class _Telling:
    stage: Stage
    ends: float
    received: list[Received] = field(default_factory=list)
    _narrator: Narrator = field(init=False)
    _over_utc: datetime.datetime | None = None

    def __post_init__(self) -> None:
        self._narrator = Narrator(self.stage.almanac)

    def go_on_beside(self, watching: Future[bool]) -> None:
        while not self._is_over():
            if concurrent.futures.wait([watching], timeout=LOOK_SECONDS).done:
                return
            self.take_in()

    def take_in(self) -> None:
        """Tell what is new. An alert is looked for first, so that what led to it is told before it."""
        arrived = _all(self.stage.arrivals)
        today = self.stage.clock.now().date()
        for line in self._narrator.lines(look(self.stage.store, self.stage.almanac)):
            screen.tell(today, line)
        for one in arrived:
            _show(today, one)
            self.received.append(one)
            if self._over_utc is None and one.stream_id == stream_id(FALLING_SHOW.name):
                self._over_utc = self.stage.clock.now() + AFTERWARDS

    def _is_over(self) -> bool:
        told = self._over_utc is not None and self.stage.clock.now() >= self._over_utc
        return told or time.monotonic() >= self.ends


def _all(arrivals: Arrivals) -> list[Received]:
    found: list[Received] = []
    while True:
        try:
            found.append(arrivals.get_nowait())
        except Empty:
            return found


def _show(today: datetime.date, received: Received) -> None:
    screen.tell(today, "The alert has arrived at the house's desk, and its signature is right. It says:")
    screen.quote(received.sentence)
    screen.quote(received.caution)
