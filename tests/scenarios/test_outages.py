"""What may be told after a long outage, after a rebuild, and with a clock that was wrong."""

import datetime

from service.daemon import _wait_seconds
from service.round.again import fold_again
from service.round.backlog import ROUNDS_LOOKED_AT
from storage.rounds import FAILED, GOOD, begin_round, end_round
from storage.shifts import HISTORY
from storage.tables import shifts

FELL = ((1000, 40), (400, 12))
HOUR = datetime.timedelta(hours=1)


def test_a_source_that_was_down_for_many_rounds_makes_its_alerts_late(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    world.live("quay", counts[:41], 38)
    for number in range(ROUNDS_LOOKED_AT + 10):
        with world.store.writing() as conn:
            failed = begin_round(conn, "plays", now=world.clock.now() + number * HOUR)
            end_round(conn, failed, FAILED, now=world.clock.now() + number * HOUR, message="503")
    world.at_week(46)
    world.studio.weekly("quay", counts[:47])
    world.poll()
    ((_, alert),) = world.desk.came
    assert alert["late"] is True


def test_what_a_rebuild_finds_is_history(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    world.live("quay", counts, 38)
    assert len(world.desk.came) == 1
    # As if another environment had not found it: the rebuilt posteriors do, and that is no news.
    with world.store.writing() as conn:
        conn.exec_driver_sql("PRAGMA defer_foreign_keys = ON")
        conn.exec_driver_sql("UPDATE deliveries SET shift_id = NULL")
        conn.execute(shifts.delete())
    done = fold_again(world.store, world.plan(), world.plan().stream_for("quay"), world.clock)
    assert [shift.origin for shift in done.shifts] == [HISTORY]
    world.poll()
    assert len(world.desk.came) == 1


def test_a_round_that_seems_to_lie_ahead_does_not_keep_the_daemon_waiting_for_it(world) -> None:
    # The machine's clock was years ahead when it was made, and has been put right since.
    with world.store.writing() as conn:
        ahead = begin_round(conn, "plays", now=world.clock.now() + datetime.timedelta(days=3650))
        end_round(conn, ahead, GOOD, now=world.clock.now())
    plan = world.plan()
    assert _wait_seconds(world.store, plan, world.clock) == plan.every.total_seconds()
