"""Sources side by side, rounds side by side, counts that wait, and releases that ripen."""

import datetime
import threading
from dataclasses import replace
from typing import Literal
from zoneinfo import ZoneInfo

from service.round.calendar import Axis, Interval
from service.round.plans import CalendarShape, ReleaseShape
from service.sources.plans import FieldPlan
from service.work import pass_for
from storage.outbox import list_deliveries
from storage.posteriors import evidence
from storage.readings import all_readings
from storage.rounds import FAILED, GOOD, list_rounds
from storage.shifts import HISTORY, LIVE, list_shifts
from storage.streams import list_streams

UTC = datetime.UTC
DAY, WEEK = datetime.timedelta(days=1), datetime.timedelta(weeks=1)


def test_two_sources_and_one_is_broken(world, counts_of, loopback) -> None:
    mail = type(world)(world.store, world.clock, type(world.studio)(), world.desk)
    mail.studio.address = loopback(mail.studio)
    counts = counts_of(1, (1000, 40), (400, 6))
    bench = world.bench()
    plans = [world.plan(), mail.plan("letters")]
    for number in range(37, 46):
        world.at_week(number)
        world.studio.weekly("quay", counts[: number + 1])
        mail.studio.weekly("quay", counts[: number + 1])
        mail.studio.broken = (500, b"") if number == 44 else None
        ended = [pass_for(bench, plan).round.outcome for plan in plans]
        assert ended == [GOOD, FAILED if number == 44 else GOOD]
        world.deliver()
    assert sorted(alert["stream"]["id"] for _, alert in world.desk.came) == ["letters/quay", "plays/quay"]
    assert world.said("plays/quay") == [
        replace(row, stream_id="plays/quay", fingerprint=world.said("plays/quay")[0].fingerprint)
        for row in world.said("letters/quay")
    ]


def test_poll_beside_a_daemon_never_mixes(world, counts_of, open_fresh) -> None:
    """Two with their own connections pass at once, again and again; at the end it is as if it were one."""
    counts = counts_of(1, (1000, 20), (400, 8))
    other = open_fresh("store")
    world.studio.weekly("quay", counts[:18])
    world.studio.weekly("mill", counts_of(2, (50, 18)))
    world.at_week(17)
    world.poll()
    errors: list[Exception] = []

    def pass_at_once(gate: threading.Barrier, store) -> None:
        try:
            gate.wait(20)
            pass_for(world.bench(store), world.plan())
        except Exception as error:  # Shown below.
            errors.append(error)

    for number in range(18, 28):
        world.at_week(number)
        world.studio.weekly("quay", counts[: number + 1])
        world.studio.weekly("mill", counts_of(2, (50, number + 1)))
        gate = threading.Barrier(2)
        pair = [threading.Thread(target=pass_at_once, args=(gate, store)) for store in (world.store, other)]
        for thread in pair:
            thread.start()
        for thread in pair:
            thread.join(60)
    world.deliver()
    assert errors == []
    with world.store.reading() as conn:
        assert {one.outcome for one in list_rounds(conn)} <= {GOOD, "nothing new"}
        assert [(one.key, one.count) for one in all_readings(conn, "plays/quay")] == [
            ((datetime.date(2025, 1, 6) + number * WEEK).isoformat(), count)
            for number, count in enumerate(counts)
        ]
        # Whoever comes second finds it done, and leaves no doubles behind.
        assert {len(evidence(conn, "plays/quay", place)) for place in range(28)} == {1}
        assert [one.origin for one in list_shifts(conn)] == [LIVE]
        assert len(list_deliveries(conn)) == 1
    assert len(world.desk.came) == 1
    together = {name: world.said(name) for name in ("plays/quay", "plays/mill")}
    world.store = open_fresh("alone")
    world.poll()
    assert together == {name: world.said(name) for name in together}


def test_two_with_different_settings_never_mix(world, counts_of, open_fresh) -> None:
    counts = counts_of(3, (1000, 24))
    world.studio.weekly("quay", counts[:20])
    world.at_week(19)
    world.poll()
    other = type(world)(open_fresh("store"), world.clock, world.studio, world.desk)
    other.settings = replace(world.settings, rule=replace(world.settings.rule, threshold=0.95))
    world.studio.weekly("quay", counts)
    world.at_week(23)
    pair = [threading.Thread(target=one.read) for one in (world, other)]
    for thread in pair:
        thread.start()
    for thread in pair:
        thread.join(60)
    marks = {row.fingerprint for row in world.said()}
    assert len(marks) == 1
    assert [row.count for row in world.said()] == counts


def test_a_week_that_is_still_open_waits(world, counts_of) -> None:
    world.studio.weekly("quay", counts_of(3, (1000, 15)))
    world.at_week(13, hours=30)
    world.poll()
    assert len(world.history()) == 14
    world.at_week(14, hours=0)
    world.poll()
    assert len(world.history()) == 15


def test_daily_counts_that_leave_quiet_days_out(world) -> None:
    """A table that leaves out days without plays: they are zeros as far as the source has come."""
    world.change(shape=_days("zero"), every=DAY)
    start = datetime.date(2026, 1, 1)
    rows = [{"show": "quay", "day": (start + n * DAY).isoformat(), "plays": 3} for n in range(20) if n != 7]
    rows += [{"show": "mill", "day": (start + n * DAY).isoformat(), "plays": 9} for n in range(24)]
    # Put in ahead: it does not say that the source has come so far.
    rows.append({"show": "mill", "day": "2026-12-24", "plays": 0})
    world.studio.rows = rows
    world.clock.instant = datetime.datetime(2026, 1, 28, 6, tzinfo=UTC)
    world.poll()
    assert [row.count for row in world.said("plays/quay")] == [3] * 7 + [0] + [3] * 12 + [0] * 4
    assert len(world.said("plays/mill")) == 24


def test_releases_count_once_they_are_final_and_stay(world, counts_of) -> None:
    """Fortnightly episodes whose plays go on growing; the feed holds the newest twenty only."""
    final = counts_of(1, (1000, 30), (400, 10))
    world.change(shape=_releases(7), every=DAY, fields=_EPISODES)
    first = datetime.datetime(2025, 1, 3, 7, tzinfo=UTC)

    def plays(number: int, now: datetime.datetime) -> int:
        age = (now - first - number * 2 * WEEK) / DAY
        return int(final[number] * min(age / 7, 1.0) + max(age - 7, 0.0))

    def feed(now: datetime.datetime) -> list[dict[str, object]]:
        out = [n for n in range(40) if first + n * 2 * WEEK <= now][-20:]
        return [
            {
                "show": "quay",
                "id": f"e{n}",
                "name": f"Part {n}",
                "day": (first + n * 2 * WEEK).isoformat(),
                "plays": plays(n, now),
            }
            for n in out
        ]

    for day in range(28 * 14, 39 * 14 + 9):
        world.clock.instant = first + day * DAY + datetime.timedelta(hours=1)
        world.studio.rows = feed(world.clock.instant)
        world.poll()
    said = world.said()
    assert said[-1].key == "e39"
    # Those that came of age while they were watched: the count of the first poll from then on.
    watched = {row.key: row.count for row in said if int(row.key[1:]) >= 28}
    due = {f"e{n}": first + n * 2 * WEEK + 7 * DAY + datetime.timedelta(hours=1) for n in range(28, 40)}
    assert watched == {key: plays(int(key[1:]), when) for key, when in due.items()}
    (shift,) = world.shifts()
    assert (shift.origin, shift.start_key, shift.late) == (LIVE, "e30", False)
    ((_, alert),) = world.desk.came
    assert alert["figures"]["start"]["title"] == "Part 30"
    # Other judgement, same counts.
    world.change(rule=replace(world.settings.rule, threshold=0.92))
    world.poll()
    assert [row.count for row in world.said()] == [row.count for row in said]


def test_a_release_ripens_though_its_document_is_unchanged(world) -> None:
    world.change(shape=_releases(7), fields=_EPISODES)
    out = datetime.datetime(2026, 1, 1, tzinfo=UTC)
    row = {"show": "quay", "id": "e1", "name": "One", "day": out.isoformat(), "plays": 5}
    world.studio.rows = [row]
    for hours in (24, 48, 24 * 7, 24 * 7 + 1, 24 * 9):
        world.clock.instant = out + datetime.timedelta(hours=hours)
        world.poll()
    # Asked for as a whole once more when it came of age, and not again.
    assert world.studio.asked == [200, 304, 200, 304, 304]
    assert [row.count for row in world.said()] == [5]


def test_a_new_show_with_a_past_is_history(world, counts_of) -> None:
    world.studio.weekly("quay", counts_of(3, (1000, 40)))
    world.at_week(39)
    world.poll()
    world.studio.weekly("quay", counts_of(3, (1000, 41)))
    world.studio.weekly("mill", counts_of(1, (1000, 31), (300, 10)))
    world.at_week(40)
    world.poll()
    assert [shift.origin for shift in world.shifts("plays/mill")] == [HISTORY]
    assert world.desk.came == []
    with world.store.reading() as conn:
        assert [one.id for one in list_streams(conn)] == ["plays/mill", "plays/quay"]


def test_a_stream_that_changes_its_kind_is_left_as_it_was(world, caplog) -> None:
    world.change(shape=_days("missing"), every=DAY)
    start = datetime.date(2026, 1, 1)
    world.studio.rows = [
        {"show": "quay", "day": (start + n * DAY).isoformat(), "plays": 3} for n in range(20)
    ]
    world.clock.instant = datetime.datetime(2026, 1, 28, 6, tzinfo=UTC)
    world.poll()
    before = world.said()
    world.studio.rows = [{"show": "quay", "day": "2026-01-12", "plays": 21}]
    weeks = type(world.settings)().shape
    for shape, word in ((weeks, "'2026-01-01', which is no week"), (_releases(7), "now say 'release'")):
        world.change(shape=shape)
        done = world.poll()
        assert (done.outcome, world.said()) == (FAILED, before)
        assert word in (done.message or "")
        assert "Put the former" in (done.message or "")
        assert "'plays/quay' could not be folded" in (done.message or "")
        with world.store.reading() as conn:
            assert [one.count for one in all_readings(conn, "plays/quay")] == [3] * 20
    assert any("not folded" in record.message for record in caplog.records)
    # Put back, it goes on.
    world.change(shape=_days("missing"))
    world.clock.instant += DAY
    assert world.poll().outcome == GOOD
    assert [row.count for row in world.said()][11] == 21


_EPISODES = FieldPlan("$.day", "$.plays", split="$.show", release="$.id", title="$.name")


def _days(absent: Literal["zero", "missing"]) -> CalendarShape:
    return CalendarShape(Axis(Interval("day"), ZoneInfo("UTC")), absent)


def _releases(days: int) -> ReleaseShape:
    return ReleaseShape(datetime.timedelta(days=days), ZoneInfo("UTC"))
