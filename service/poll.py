"""`knickpoint poll`: one round now, with everything that follows it."""

import os
import random
import threading
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from service.clock import SystemClock
from service.deliver.loop import Counts, deliver_due
from service.round.plans import RoundPlan
from service.wiring import Wired, wire
from service.work import Bench, pass_for
from storage.engine import open_store
from storage.migrate import upgrade
from storage.rounds import Round, get_round


class UnknownSource(ValueError):
    """A source that the settings do not name."""

    def __init__(self, got: str, known: Sequence[str]) -> None:
        self.got, self.known = got, tuple(known)
        super().__init__(f'No source is named "{got}". The settings name: {", ".join(known) or "none"}.')


@dataclass(frozen=True, slots=True)
class Polled:
    """The rounds that were made, and what became of the deliveries that were due.

    `unfolded` is how many streams could not be folded; the rounds say why.
    """

    rounds: tuple[Round, ...]
    deliveries: Counts
    unfolded: int


def poll_once(settings: Path, sources: Sequence[str]) -> Polled:
    """Read, keep, advance, record, tell and deliver, for these sources or for all.

    Raises
    ------
    UnknownSource
        If a source is not in the settings; then nothing was done.
    """
    wired = wire(settings, os.environ)
    plans = [_named(wired, name) for name in sources] or list(wired.rounds)
    clock, stop = SystemClock(), threading.Event()
    with open_store(wired.database) as store:
        upgrade(store)
        bench = Bench(store, clock, wired.takers, stop)
        done = [pass_for(bench, plan) for plan in plans]
        deliveries = deliver_due(store, wired.outlets, clock, random.random)
        with store.reading() as conn:
            rounds = tuple(get_round(conn, one.round.round_id) for one in done)
    return Polled(rounds, deliveries, sum(len(one.trouble) for one in done))


def _named(wired: Wired, name: str) -> RoundPlan:
    for plan in wired.rounds:
        if plan.name == name:
            return plan
    raise UnknownSource(name, [plan.name for plan in wired.rounds])
