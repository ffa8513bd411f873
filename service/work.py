"""One pass of the whole path for one source: round, backlog, tell. The daemon and `poll` both call it."""

import threading
from dataclasses import dataclass

from service.clock import Clock
from service.logs import log
from service.round.once import RoundOutcome, bring_up_source, read_and_keep
from service.round.plans import RoundPlan
from service.tell.tell import Taker, tell_due
from storage.engine import Store


@dataclass(frozen=True, slots=True)
class Bench:
    """What a pass needs besides its source."""

    store: Store
    clock: Clock
    takers: tuple[Taker, ...]
    stop: threading.Event


def pass_for(bench: Bench, plan: RoundPlan) -> RoundOutcome:
    """Read, keep, advance, record and tell; delivering is the deliverer's."""
    outcome = read_and_keep(bench.store, plan, bench.clock)
    catch_up(bench, plan)
    return outcome


def catch_up(bench: Bench, plan: RoundPlan) -> None:
    """Fold what a source's streams have not folded yet, and tell what has not been told."""
    bring_up_source(bench.store, plan, bench.clock, bench.stop)
    told = tell_due(bench.store, bench.takers, bench.clock)
    if told:
        log.info("shifts told", source=plan.name, told=told)
