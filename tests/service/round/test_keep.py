"""What a document leaves in the store: readings, counts of rows, and which reading of a release holds."""

import datetime
from collections.abc import Callable
from dataclasses import dataclass, field

import pytest

from service.round.keep import KeptDocument, keep, planned_streams
from service.round.plans import ReleaseShape, RoundPlan
from service.round.ripen import came_to_age, repoint
from service.sources.document import Document, KeptOut, Row, Validators
from storage.engine import Store
from storage.readings import key_readings, newest_readings
from storage.ripe import ripe_readings
from storage.rounds import begin_round, get_round
from storage.validators import find_validators

UTC = datetime.UTC
OUT = datetime.datetime(2026, 3, 1, tzinfo=UTC)
HOUR, DAY = datetime.timedelta(hours=1), datetime.timedelta(days=1)


@dataclass
class Shelf:
    """Documents of one source, kept one after another."""

    store: Store
    plan: RoundPlan
    rounds: list[int] = field(default_factory=list)

    def keep(self, now: datetime.datetime, *rows: Row, **document: object) -> KeptDocument:
        given = Document(tuple(rows), **document)  # type: ignore[arg-type]
        with self.store.writing() as conn:
            self.rounds.append(begin_round(conn, self.plan.name, now=now))
            return keep(conn, self.plan, given, round_id=self.rounds[-1], now=now)

    def episode(self, now: datetime.datetime, count: int | None, at: datetime.datetime = OUT) -> KeptDocument:
        return self.keep(now, Row("quay", at, count, release="e1"))

    def counts(self) -> dict[str, int | None]:
        with self.store.reading() as conn:
            return {one.key: one.count for one in newest_readings(conn, "plays/quay")}

    def ripe(self) -> dict[str, int | None]:
        with self.store.reading() as conn:
            return {one.key: one.count for one in ripe_readings(conn, "plays/quay")}

    def to_age(self, now: datetime.datetime) -> bool:
        with self.store.reading() as conn:
            return came_to_age(conn, planned_streams(conn, self.plan), now)

    def change_age(self, shape: ReleaseShape, seen: datetime.datetime) -> None:
        with self.store.writing() as conn:
            repoint(conn, "plays/quay", shape, seen_utc=seen)


@pytest.fixture
def calendar(store: Store, source, weeks) -> Shelf:
    return Shelf(store, source(weeks()))


@pytest.fixture
def shelf(store: Store, source, releases: Callable[..., ReleaseShape]) -> Shelf:
    return Shelf(store, source(releases(7)))


def _week(split: str, day: int, count: int | None) -> Row:
    return Row(split, datetime.date(2026, 3, day), count, number=day)


def test_every_row_is_accounted_for(calendar: Shelf) -> None:
    now = datetime.datetime(2026, 3, 20, tzinfo=UTC)
    first = calendar.keep(now, _week("quay", 2, 5), _week("quay", 9, 6), _week("mill", 2, 7))
    assert first.new_streams == ("plays/mill", "plays/quay")
    bad = KeptOut(99, "count must be 0 or more", "plays: -4")
    second = calendar.keep(
        now + DAY,
        _week("quay", 2, 5),
        _week("quay", 9, 8),
        _week("quay", 16, 1),
        _week("no", 2, 1),
        Row("quay", datetime.date(2026, 3, 23), 3, number=23),
        Row("quay", datetime.date(2026, 3, 24), 4, number=24),
        kept_out=(bad,),
    )
    assert (second.new_streams, second.left_out) == ((), 1)
    with calendar.store.reading() as conn:
        done = get_round(conn, calendar.rounds[-1])
    # Of mill, which the document does not name, one key is absent.
    assert (done.rows_used, done.stored, done.unchanged, done.absent) == (3, 2, 1, 1)
    assert ([one.row for one in done.kept_out], done.kept_out_count) == ([23, 24, 99], 3)
    assert "its key comes again" in done.kept_out[0].why


def test_a_row_that_was_kept_out_is_an_unknown_count_where_no_row_would_mean_zero(
    store: Store, source, weeks
) -> None:
    shelf = Shelf(store, source(weeks("zero")))
    now = datetime.datetime(2026, 3, 30, 1, tzinfo=UTC)
    bad = [
        KeptOut(40 + day, "count must be a number", "1,000", _week("quay", day, None)) for day in (2, 9, 30)
    ]
    shelf.keep(now, _week("quay", 2, 5), _week("quay", 16, 1), _week("quay", 17, 2), _week("quay", 23, 6))
    assert shelf.counts() == {"2026-03-02": 5, "2026-03-16": None, "2026-03-23": 6}
    # What is known already stays, a split that is left out or new brings no stream, and a count that comes
    # after all is taken.
    others = KeptOut(9, "no", "", _week("no", 2, None)), KeptOut(10, "no", "", _week("new", 2, None))
    done = shelf.keep(now + DAY, _week("quay", 16, 3), kept_out=(*bad, *others))
    assert shelf.counts() == {
        "2026-03-02": 5,
        "2026-03-09": None,
        "2026-03-16": 3,
        "2026-03-23": 6,
        "2026-03-30": None,
    }
    assert (done.new_streams, done.counts.rows_used, len(done.counts.kept_out)) == ((), 1, 5)
    assert shelf.keep(now + DAY, kept_out=tuple(bad)).counts.stored == 0


def test_an_empty_document_says_that_everything_is_absent(calendar: Shelf) -> None:
    now = datetime.datetime(2026, 3, 20, tzinfo=UTC)
    calendar.keep(now, _week("quay", 2, 5), _week("mill", 2, 7))
    assert calendar.keep(now + HOUR).counts.absent == 2


def test_validators_are_kept_unless_something_was_held_back(calendar: Shelf) -> None:
    now = datetime.datetime(2026, 3, 20, tzinfo=UTC)
    given = Validators('"a"', None, "f")

    def known():
        with calendar.store.reading() as conn:
            return find_validators(conn, "plays", about=calendar.plan.about)

    calendar.keep(now, _week("quay", 2, 5), validators=given)
    assert known().etag == '"a"'
    # Final since the 16th and read today already: the rise waits for tomorrow, whatever the ETag says.
    assert calendar.keep(now + HOUR, _week("quay", 2, 6), validators=given).counts.held == 1
    assert known().etag is None
    assert calendar.keep(now + DAY, _week("quay", 2, 6), validators=given).counts.stored == 1
    assert known().etag == '"a"'


def test_the_count_at_the_first_poll_past_the_final_age_stays(shelf: Shelf) -> None:
    for hours, count in ((24, 10), (24 * 6, 40), (24 * 7 - 1, 44)):
        shelf.episode(OUT + hours * HOUR, count)
        assert shelf.ripe() == {}
    shelf.episode(OUT + 7 * DAY + HOUR, 45)
    assert shelf.ripe() == {"e1": 45}
    for days in (8, 9, 30):
        shelf.episode(OUT + days * DAY, 45 + days)
        assert shelf.ripe() == {"e1": 45}


def test_an_unchanged_count_ripens_too(shelf: Shelf) -> None:
    shelf.episode(OUT + DAY, 10)
    shelf.episode(OUT + 8 * DAY, 10)
    assert shelf.ripe() == {"e1": 10}
    with shelf.store.reading() as conn:
        assert len(key_readings(conn, "plays/quay", "e1")) == 1


def test_a_missing_count_does_not_ripen_until_it_comes(shelf: Shelf) -> None:
    shelf.episode(OUT + DAY, 10)
    shelf.episode(OUT + 8 * DAY, None)
    assert shelf.ripe() == {}
    shelf.episode(OUT + 9 * DAY, 50)
    assert shelf.ripe() == {"e1": 50}


def test_an_unchanged_document_is_read_again_when_a_release_comes_to_its_age(shelf: Shelf) -> None:
    shelf.episode(OUT + DAY, 10)
    assert not shelf.to_age(OUT + 2 * DAY)
    assert shelf.to_age(OUT + 7 * DAY)
    # The document no longer holds it: that is learned once.
    shelf.keep(OUT + 7 * DAY + HOUR, Row("quay", OUT + 6 * DAY, 3, release="e2"))
    assert not shelf.to_age(OUT + 8 * DAY)
    assert shelf.ripe() == {}


def test_a_release_that_was_put_off_ripens_at_its_new_date(shelf: Shelf) -> None:
    shelf.episode(OUT + DAY, 0)
    shelf.episode(OUT + 8 * DAY, 0)
    assert shelf.ripe() == {"e1": 0}
    later = OUT + 30 * DAY
    shelf.episode(OUT + 9 * DAY, 0, at=later)
    assert shelf.ripe() == {}
    shelf.episode(later + 8 * DAY, 60, at=later)
    assert shelf.ripe() == {"e1": 60}


def test_another_final_age(shelf: Shelf, releases) -> None:
    for days, count in ((1, 10), (3, 30), (5, 50), (8, 80), (12, 120), (16, 160)):
        shelf.episode(OUT + days * DAY, count)
    seen = OUT + 16 * DAY
    assert shelf.ripe() == {"e1": 80}
    # Under an age that has not changed, the choice stays: nobody can tell when it was polled in between.
    shelf.change_age(releases(7), seen)
    assert shelf.ripe() == {"e1": 80}
    for days, count in ((4, 30), (14, 120), (0.5, 10)):
        shelf.change_age(releases(days), seen)
        assert shelf.ripe() == {"e1": count}
    shelf.change_age(releases(20), seen)
    assert shelf.ripe() == {}


def test_a_release_unchanged_since_its_new_age_is_chosen_without_another_reading(shelf, releases) -> None:
    shelf.episode(OUT + 3 * DAY, 30)
    shelf.episode(OUT + 40 * DAY, 30)
    # It may never be in a document again.
    shelf.change_age(releases(14), OUT + 40 * DAY)
    assert shelf.ripe() == {"e1": 30}
