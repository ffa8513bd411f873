"""One pass of the whole path for one source: round, backlog, tell. The daemon and `poll` both call it."""

import threading
from collections.abc import Sequence
from dataclasses import dataclass

from service.clock import Clock
from service.logs import log
from service.round.backlog import bring_up_source
from service.round.once import RoundOutcome, read_and_keep, remark
from service.round.plans import RoundPlan
from service.tell.tell import Taker, tell_due
from storage.engine import Store
from storage.rounds import FAILED

MOST_NAMED = 3


@dataclass(frozen=True, slots=True)
class Bench:
    """What a pass needs besides its source."""

    store: Store
    clock: Clock
    takers: tuple[Taker, ...]
    stop: threading.Event


@dataclass(frozen=True, slots=True)
class Passed:
    """How a pass went; `trouble` has a sentence for each stream that could not be folded."""

    round: RoundOutcome
    trouble: tuple[str, ...]

    @property
    def good(self) -> bool:
        """The source was read, and all of its streams are where their readings are."""
        return self.round.outcome != FAILED and not self.trouble


def pass_for(bench: Bench, plan: RoundPlan) -> Passed:
    """Read, keep, advance, record and tell; delivering is the deliverer's."""
    outcome = read_and_keep(bench.store, plan, bench.clock)
    trouble = catch_up(bench, plan)
    if trouble:
        outcome = remark(bench.store, outcome, _remark(trouble), bench.clock)
    return Passed(outcome, trouble)


def catch_up(bench: Bench, plan: RoundPlan) -> tuple[str, ...]:
    """Fold what a source's streams have not folded yet, and tell what has not been told.

    Gives a sentence for each stream that could not be folded.
    """
    backlog = bring_up_source(bench.store, plan, bench.clock, bench.stop)
    told = tell_due(bench.store, bench.takers, bench.clock)
    if told:
        log.info("shifts told", source=plan.name, told=told)
    return backlog.trouble


def _remark(trouble: Sequence[str]) -> str:
    more = len(trouble) - MOST_NAMED
    return " ".join([*trouble[:MOST_NAMED], *([f"And {more} more."] if more > 0 else [])])
