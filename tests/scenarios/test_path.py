"""From counts to an alert, through every stage: a real source, a real database file, a real receiver."""

import datetime
from dataclasses import replace

from service.round.again import fold_again
from storage.checkpoints import list_checkpoints
from storage.outbox import list_deliveries
from storage.posteriors import evidence
from storage.readings import key_readings, newest_readings
from storage.rounds import FAILED, GOOD, NOTHING_NEW
from storage.shifts import HISTORY, LIVE
from storage.streams import get_stream, hush_stream

FELL = ((1000, 40), (400, 12))


def test_a_long_history_is_recorded_and_not_told(world, counts_of) -> None:
    world.studio.weekly("quay", counts_of(1, (1000, 24), (400, 24), (1000, 14), (350, 10)))
    world.at_week(71)
    done = world.poll()
    assert (done.outcome, done.rows_used, done.stored, done.kept_out_count) == (GOOD, 72, 72, 0)
    found = world.shifts()
    assert [shift.origin for shift in found] == [HISTORY] * 3
    assert {shift.start_key for shift in found} == {"2025-06-23", "2025-12-08", "2026-03-16"}
    assert world.desk.came == []
    assert len(world.history()) == 72


def test_a_fall_after_the_first_poll_is_told_once(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    world.live("quay", counts, 38)
    world.poll()
    (shift,) = world.shifts()
    assert (shift.origin, shift.late, shift.told_how) == (LIVE, False, "sent")
    ((message, alert),) = world.desk.came
    assert world.desk.forged == 0
    assert message == alert["id"]
    assert alert["shift"]["id"] == shift.id
    assert alert["stream"]["id"] == "plays/quay"
    # Level 1000 up to place 39, 400 from place 40 on.
    assert alert["figures"]["start"]["key"] == "2025-10-13"
    assert 850 < alert["figures"]["level_before"]["mid"] < 1150
    assert 300 < alert["figures"]["level_after"]["mid"] < 500
    with world.store.reading() as conn:
        assert [one.state for one in list_deliveries(conn)] == ["delivered"]


def test_a_receiver_that_fails_gets_it_later_under_the_same_id(world, counts_of) -> None:
    counts = counts_of(1, *FELL)[:44]
    world.desk.refuse = 2
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    world.live("quay", counts, 38)
    assert world.desk.came == []
    for _ in range(2):
        world.clock.instant += datetime.timedelta(minutes=10)
        world.deliver()
    assert [message for message, _ in world.desk.came] == [world.desk.came[0][1]["id"]]


def test_counts_one_by_one_and_all_at_once_say_the_same(world, counts_of, open_fresh) -> None:
    counts = counts_of(1, *FELL)
    world.at_week(0)
    world.live("quay", counts, 0)
    step_by_step = world.said()
    world.store = open_fresh("at once")
    world.at_week(len(counts) - 1)
    world.poll()
    at_once = world.said()
    assert len(at_once) == 52
    assert step_by_step == at_once
    # Byte for byte, that is: the distributions are kept as bytes.
    assert [row.history for row in step_by_step] == [row.history for row in at_once]


def test_a_corrected_count_is_folded_again_from_the_last_good_checkpoint(
    world, counts_of, open_fresh
) -> None:
    counts = counts_of(3, (1000, 60))
    world.studio.weekly("quay", counts)
    world.at_week(59)
    world.poll()
    corrected = [*counts]
    corrected[50] = 1500
    world.studio.weekly("quay", corrected)
    plan = world.plan()
    world.clock.instant += datetime.timedelta(hours=1)
    done = world.poll()
    # It has had its reading of the day.
    assert (done.stored, done.held, done.unchanged) == (0, 1, 59)
    world.clock.instant += datetime.timedelta(days=1)
    done = world.poll()
    assert (done.stored, done.unchanged) == (1, 59)
    with world.store.reading() as conn:
        assert [one.count for one in key_readings(conn, "plays/quay", "2025-12-22")] == [counts[50], 1500]
        # Places before the correction, from the checkpoint after 44 on, were said again or left as they were.
        assert len(evidence(conn, "plays/quay", 43)) == 1
        assert [row.count for row in evidence(conn, "plays/quay", 50)] == [1500, counts[50]]
        marks = list_checkpoints(conn, "plays/quay", fingerprint=plan.stream_for("quay").fingerprint)
    assert 44 in [mark.folded for mark in marks]
    again = world.said()
    world.store = open_fresh("fresh")
    world.poll()
    assert again == world.said()


def test_a_broken_document_leaves_everything_as_it_was(world, counts_of) -> None:
    counts = counts_of(3, (1000, 20))
    world.studio.weekly("quay", counts)
    world.at_week(19)
    world.poll()
    before = (world.said(), _readings(world))
    world.change(deadline_seconds=0.3)
    whole = world.studio.answer(None)[1]
    for broken, word in (
        ((200, whole[: len(whole) // 2]), "JSON"),
        ((500, b"oh"), "500"),
        ((200, b""), "empty"),
        ((200, b'{"data": 3}'), None),
    ):
        world.studio.broken = broken
        world.clock.instant += datetime.timedelta(hours=1)
        done = world.poll()
        if word is not None:
            assert done.outcome == FAILED
            assert word in (done.message or "")
        assert (world.said(), _readings(world)) == before
    world.studio.broken, world.studio.drip_seconds = None, 0.02
    world.studio.rows[0]["plays"] = 7
    done = world.poll()
    assert done.outcome == FAILED
    assert "0.3 s" in (done.message or "")
    assert world.studio.address not in (done.message or "")
    assert (world.said(), _readings(world)) == before


def test_rows_that_cannot_be_used_are_counted_and_shown(world, counts_of) -> None:
    world.studio.weekly("quay", counts_of(3, (1000, 15)))
    world.studio.rows[2]["plays"] = -4
    world.studio.rows[3]["plays"] = 12.5
    world.studio.rows[4]["plays"] = 12.0
    world.studio.rows[5]["plays"] = True
    world.studio.rows[6]["day"] = "soon"
    world.studio.rows.append({**world.studio.rows[7], "plays": 5})
    world.at_week(14)
    done = world.poll()
    assert done.outcome == GOOD
    assert [one.row for one in done.kept_out] == [3, 4, 6, 7, 8, 16]
    assert (done.kept_out_count, done.rows_used, done.stored) == (6, 10, 10)
    with world.store.reading() as conn:
        counts = {one.key: one.count for one in newest_readings(conn, "plays/quay")}
    assert counts["2025-02-03"] == 12
    assert "2025-02-24" not in counts


def test_after_three_weeks_of_downtime_an_alert_is_told_as_late(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:41])
    world.at_week(40)
    world.poll()
    world.clock.instant += datetime.timedelta(hours=1)
    world.poll()
    world.studio.weekly("quay", counts[:47])
    world.at_week(46)
    world.poll()
    (shift,) = world.shifts()
    assert (shift.origin, shift.late) == (LIVE, True)
    assert [alert["late"] for _, alert in world.desk.came] == [True]


def test_what_was_read_before_a_crash_and_folded_weeks_later_is_late(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    world.live("quay", counts[:43], 38)
    world.at_week(43)
    world.studio.weekly("quay", counts[:44])
    world.stop.set()  # Ends before folding.
    world.read()
    world.stop.clear()
    assert world.shifts() == ()
    world.at_week(46)
    world.poll()
    (shift,) = world.shifts()
    assert (shift.origin, shift.late) == (LIVE, True)


def test_changed_settings_tell_nothing_that_was_there_before(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    # With this threshold nothing rings.
    world.change(rule=replace(world.settings.rule, threshold=0.9999999))
    world.live("quay", counts, 38)
    assert world.desk.came == []
    world.change(rule=replace(world.settings.rule, threshold=0.9))
    world.poll()
    (shift,) = world.shifts()
    assert shift.origin == HISTORY
    assert world.desk.came == []


def test_a_told_shift_found_again_under_other_settings_is_not_told_again(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    world.live("quay", counts, 38)
    assert len(world.desk.came) == 1
    epoch = _epoch(world)
    # Announced at another count now, so that its id would be another; the date regions overlap.
    world.change(rule=replace(world.settings.rule, lasting=7))
    world.poll()
    assert _epoch(world) > epoch
    assert [shift.origin for shift in world.shifts()] == [LIVE]
    assert len(world.desk.came) == 1
    # And what comes after the change is told as ever.
    world.live("quay", counts + counts_of(5, (1500, 12)), 52)
    assert len(world.desk.came) == 2


def test_a_hushed_stream_is_recorded_and_not_sent(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    with world.store.writing() as conn:
        hush_stream(conn, "plays/quay", world.clock.now() + datetime.timedelta(days=365))
    world.live("quay", counts, 38)
    (shift,) = world.shifts()
    assert (shift.origin, shift.told_how) == (LIVE, "hushed")
    assert world.desk.came == []


def test_rebuilding_says_the_same_byte_for_byte(world, counts_of) -> None:
    counts = counts_of(1, *FELL)
    world.studio.weekly("quay", counts[:38])
    world.at_week(37)
    world.poll()
    world.live("quay", counts, 38)
    before, told = world.said(), world.shifts()
    done = fold_again(world.store, world.plan(), world.plan().stream_for("quay"), world.clock)
    assert (done.folded, done.shifts) == (52, ())
    assert world.said() == before
    assert world.shifts() == told
    world.poll()
    assert len(world.desk.came) == 1


def test_a_stream_that_the_settings_leave_out_is_kept_and_not_folded(world, counts_of) -> None:
    counts = counts_of(3, (1000, 22))
    for show in ("quay", "mill"):
        world.studio.weekly(show, counts[:20])
    world.at_week(19)
    world.poll()
    world.change(left_out=frozenset({"mill"}))
    for show in ("quay", "mill"):
        world.studio.weekly(show, counts)
    world.at_week(21)
    done = world.poll()
    assert (done.rows_used, done.stored) == (22, 2)
    assert done.message == "Rows of streams that the settings leave out: 22."
    assert [len(world.history(f"plays/{show}")) for show in ("quay", "mill")] == [22, 20]
    # Taken in again, it is read although the document has not changed since.
    world.change(left_out=frozenset())
    done = world.poll()
    assert done.stored == 2
    assert len(world.history("plays/mill")) == 22


def test_an_unchanged_document_is_not_read_twice(world, counts_of) -> None:
    world.studio.weekly("quay", counts_of(3, (1000, 15)))
    world.at_week(14)
    world.poll()
    done = world.poll()
    assert (done.outcome, done.stored) == (NOTHING_NEW, 0)
    assert "unchanged" in (done.message or "")
    assert world.studio.asked == [200, 304]


def _readings(world):
    with world.store.reading() as conn:
        return newest_readings(conn, "plays/quay")


def _epoch(world) -> int:
    with world.store.reading() as conn:
        return get_stream(conn, "plays/quay").epoch
