"""The last two stages together: a recorded shift reaches a real receiver, signed, whatever is repeated."""

import json
import time
from datetime import UTC, date, datetime, timedelta

from standardwebhooks import Webhook as ReferenceVerifier

from detectors.posterior import Quantiles
from service.deliver.loop import Counts, deliver_due
from service.outlets.signing import Signer
from service.outlets.webhook import Webhook
from service.tell.tell import Taker, tell_due
from storage.engine import Store
from storage.shifts import EMERGING, HISTORY, LIVE, Shift, get_shift, record_shift
from storage.streams import SeenStream, see_streams

SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"


def record(store: Store, shift_id: str, origin: str, now: datetime) -> None:
    with store.writing() as conn:
        see_streams(
            conn, [SeenStream("walks", "plays", "walks", "Evening Walks", "house", "calendar")], now=now
        )
        assert record_shift(
            conn,
            Shift(
                id=shift_id,
                stream_id="walks",
                origin=origin,
                state=EMERGING,
                announced_key="2026-03-09",
                announced_position=110,
                announced_at=date(2026, 3, 9),
                announced_utc=now,
                start_key="2026-02-23",
                start_position=108,
                start_at=date(2026, 2, 23),
                region=(107, 108),
                probability=0.963,
                level_before=Quantiles(980.0, 1052.0, 1130.0),
                level_after=Quantiles(560.0, 642.0, 731.0),
                late=False,
                fingerprint="settings-1",
                reading_id=None,
            ),
        )


def test_a_shift_reaches_the_receiver_once_and_history_never(store, clock, receiver, answer):
    clock.instant = datetime.now(UTC)
    record(store, "shift_live", LIVE, clock.now())
    record(store, "shift_old", HISTORY, clock.now())
    receiver.will(answer(503))
    desk = Webhook("desk", receiver.address, Signer(SECRET), time.monotonic)
    assert tell_due(store, [Taker("desk")], clock) == 1
    assert tell_due(store, [Taker("desk")], clock) == 0
    assert deliver_due(store, [desk], clock, lambda: 0.0) == Counts(put_off=1)
    clock.move_on(timedelta(seconds=10))
    assert deliver_due(store, [desk], clock, lambda: 0.0) == Counts(delivered=1)
    assert deliver_due(store, [desk], clock, lambda: 0.0) == Counts()
    first, second = receiver.received
    assert first.body == second.body
    assert first.headers["webhook-id"] == second.headers["webhook-id"]
    told = ReferenceVerifier(SECRET).verify(second.body, second.headers)
    assert told["type"] == "shift.emerging"
    assert "Evening Walks: the filtered level fell" in json.dumps(told)
    assert "not a cause" in json.dumps(told)
    with store.reading() as conn:
        assert get_shift(conn, "shift_live").told_utc is not None
        assert get_shift(conn, "shift_old").told_utc is None
