"""Recording a fold: superseding, finding the same shift again, and giving way when the stream moved on."""

import datetime
from collections.abc import Callable
from dataclasses import dataclass

import pytest

from service.round import fold as folding
from service.round.fold import Brought, Timing, bring_up
from service.round.keep import keep
from service.round.plans import RoundPlan, StreamPlan
from service.round.record import Result, record
from service.sources.document import Document, Row
from storage.checkpoints import checkpoint_bytes, list_checkpoints
from storage.engine import Store
from storage.errors import HeadMoved
from storage.posteriors import evidence, history
from storage.readings import head
from storage.rounds import begin_round
from storage.shifts import list_shifts
from storage.streams import get_stream
from storage.tables import checkpoints

UTC = datetime.UTC
OUT = datetime.datetime(2025, 1, 6, tzinfo=UTC)
DAY = datetime.timedelta(days=1)
NOTHING_KNOWN = Timing(None, (), OUT)
FELL = (98, 104, 91, 110, 99, 101, 96, 105, 93, 108, 100, 97, 103, 95, 102, 99, 41, 38, 44, 40, 37, 43)
STREAM = "plays/quay"


@dataclass
class Fold:
    """A daily stream, or one of daily releases: documents in, folds out."""

    store: Store
    clock: object
    plan: Callable[..., RoundPlan]
    shape: object

    def stream(self, mark: str = "one") -> StreamPlan:
        found = self.plan(self.shape, mark=mark).stream_for("quay")
        assert found is not None
        return found

    def give(self, counts: dict[float, int | None], now: datetime.datetime) -> None:
        self.clock.instant = now
        rows = tuple(
            Row("quay", OUT + days * DAY, count, release=f"e{days}") for days, count in counts.items()
        )
        with self.store.writing() as conn:
            one = begin_round(conn, "plays", now=now)
            keep(conn, self.plan(self.shape), Document(rows), round_id=one, now=now)

    def bring_up(self, mark: str = "one") -> Brought:
        return bring_up(self.store, self.stream(mark), self.clock, NOTHING_KNOWN)


@pytest.fixture
def episodes(store: Store, clock, source, releases) -> Fold:
    return Fold(store, clock, source, releases(1))


def _numbered(counts: tuple[int, ...]) -> dict[float, int | None]:
    return {float(day): count for day, count in enumerate(counts)}


def test_a_fold_is_written_whole(episodes: Fold) -> None:
    episodes.give(_numbered(FELL), OUT + 40 * DAY)
    done = episodes.bring_up()
    assert (done.folded, done.waiting, len(done.shifts)) == (22, 0, 1)
    with episodes.store.reading() as conn:
        assert [row.count for row in history(conn, STREAM)] == list(FELL)
        assert [row.place for row in history(conn, STREAM)] == list(range(22))
        assert get_stream(conn, STREAM).fingerprint == "one"
    again = episodes.bring_up()
    assert (again.folded, again.shifts) == (0, ())


def test_an_older_release_put_in_later_does_not_make_another_shift(episodes: Fold) -> None:
    episodes.give(_numbered(FELL), OUT + 40 * DAY)
    (shift,) = episodes.bring_up().shifts
    episodes.give({3.5: 107}, OUT + 41 * DAY)
    done = episodes.bring_up()
    # From a checkpoint before it on; its positions have moved on by one.
    assert done.folded > 18
    assert done.shifts == ()
    with episodes.store.reading() as conn:
        assert list_shifts(conn) == (shift,)
        said = history(conn, STREAM)
        assert [row.key for row in said][:6] == ["e0.0", "e1.0", "e2.0", "e3.0", "e3.5", "e4.0"]
        assert len(evidence(conn, STREAM, 21)) == 2


def test_a_stream_that_got_shorter_loses_what_lay_beyond(episodes: Fold) -> None:
    counts = _numbered(FELL[:15])
    episodes.give(counts, OUT + 20 * DAY)
    episodes.bring_up()
    # The last one was put off: its count does not stand yet.
    with episodes.store.writing() as conn:
        row = Row("quay", OUT + 90 * DAY, 102, release="e14.0")
        one = begin_round(conn, "plays", now=OUT + 21 * DAY)
        now = OUT + 21 * DAY
        keep(conn, episodes.plan(episodes.shape), Document((row,)), round_id=one, now=now)
    episodes.clock.instant = OUT + 21 * DAY
    done = episodes.bring_up()
    assert (done.waiting, episodes.bring_up().folded) == (1, 0)
    with episodes.store.reading() as conn:
        assert len(history(conn, STREAM)) == 14
        assert list_checkpoints(conn, STREAM, fingerprint="one")[0].folded == 14


def test_other_settings_supersede_everything_and_begin_an_epoch(episodes: Fold) -> None:
    episodes.give(_numbered(FELL), OUT + 40 * DAY)
    episodes.bring_up()
    done = episodes.bring_up("two")
    assert (done.folded, done.shifts) == (22, ())
    with episodes.store.reading() as conn:
        assert {row.fingerprint for row in history(conn, STREAM)} == {"two"}
        assert [row.fingerprint for row in evidence(conn, STREAM, 0)] == ["two", "one"]
        assert get_stream(conn, STREAM).epoch == 1
        assert list_checkpoints(conn, STREAM, fingerprint="one") == ()


def test_a_damaged_checkpoint_is_folded_anew_and_nothing_is_told(episodes: Fold) -> None:
    episodes.give(_numbered(FELL), OUT + 40 * DAY)
    episodes.bring_up()
    with episodes.store.writing() as conn:
        conn.execute(checkpoints.update().values(body=b"rust"))
    episodes.give({22.0: 40}, OUT + 41 * DAY)
    done = episodes.bring_up()
    assert (done.folded, done.shifts) == (23, ())
    with episodes.store.reading() as conn:
        mark = list_checkpoints(conn, STREAM, fingerprint="one")[0]
        assert checkpoint_bytes(conn, mark.id) != b"rust"


def test_a_reading_that_comes_while_folding_makes_it_fold_again(episodes: Fold, monkeypatch) -> None:
    episodes.give(_numbered(FELL[:14]), OUT + 40 * DAY)
    calls, real = [], folding.record

    def meanwhile(conn, result, now):
        calls.append(result)
        if len(calls) == 1:
            raise HeadMoved("plays/quay", None, None)
        return real(conn, result, now)

    monkeypatch.setattr(folding, "record", meanwhile)
    assert episodes.bring_up().folded == 14
    assert len(calls) == 2


def test_a_head_that_moved_leaves_nothing(episodes: Fold) -> None:
    result = _caught(episodes, FELL[:14])
    episodes.give({14.0: 90}, OUT + 41 * DAY)
    with pytest.raises(HeadMoved), episodes.store.writing() as conn:
        record(conn, result, OUT + 41 * DAY)
    with episodes.store.reading() as conn:
        assert history(conn, STREAM) == ()
        assert list_checkpoints(conn, STREAM, fingerprint="one") == ()
        assert get_stream(conn, STREAM).fingerprint is None


def test_what_somebody_else_has_recorded_is_not_written_twice(episodes: Fold) -> None:
    result = _caught(episodes, FELL)
    for _ in range(2):
        with episodes.store.writing() as conn:
            record(conn, result, OUT + 41 * DAY)
    with episodes.store.reading() as conn:
        assert len(evidence(conn, STREAM, 0)) == 1
        assert len(list_shifts(conn)) == 1


def test_settings_that_changed_while_folding_count_as_moved(episodes: Fold) -> None:
    episodes.give(_numbered(FELL[:14]), OUT + 40 * DAY)
    episodes.bring_up()
    result = _caught(episodes, FELL[:16])
    episodes.bring_up("two")
    with episodes.store.reading() as conn:
        assert head(conn, STREAM) != result.head
    with pytest.raises(HeadMoved), episodes.store.writing() as conn:
        record(conn, result, OUT + 41 * DAY)
    with episodes.store.reading() as conn:
        assert {row.fingerprint for row in history(conn, STREAM)} == {"two"}


def _caught(episodes: Fold, counts: tuple[int, ...]) -> Result:
    """A finished fold, kept back before it is recorded."""
    caught: list[Result] = []

    def keep_back(_conn, result, _now):
        caught.append(result)
        return ()

    episodes.give(_numbered(counts), OUT + 40 * DAY)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(folding, "record", keep_back)
        episodes.bring_up()
    return caught[0]
