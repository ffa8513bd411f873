"""Folds a stream again from its first observation on, whatever was said of it before."""

from service.clock import Clock
from service.round.backlog import timing_of
from service.round.fold import Brought, bring_up
from service.round.plans import RoundPlan, StreamPlan
from storage.checkpoints import drop_checkpoints
from storage.engine import Store
from storage.streams import bump_epoch


def fold_again(store: Store, plan: RoundPlan, stream: StreamPlan, clock: Clock) -> Brought:
    """Forget the checkpoints of a stream that is stored, and fold it.

    What was said before stays as superseded evidence. Whoever is folding the stream meanwhile begins again.
    """
    with store.writing() as conn:
        drop_checkpoints(conn, stream.id)
        bump_epoch(conn, stream.id)
    return bring_up(store, stream, clock, timing_of(store, plan, clock.now()))
