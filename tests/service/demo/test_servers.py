"""The invented house's counting service and its desk, asked over loopback."""

import datetime
import json
from collections.abc import Callable

import pytest
from standardwebhooks import Webhook

from service.clock import Clock
from service.demo.counting import counting_service
from service.demo.place import new_secret
from service.demo.receiver import Arrivals, desk
from service.demo.story import HISTORY_DAYS, SHOWS, UNIT, Almanac, count_of
from service.outlets.signing import Signer

Call = Callable[..., tuple[int, dict[str, str], bytes]]
BODY = json.dumps(
    {"stream": {"id": "counts/A"}, "sentence": "A fell — by half.", "caution": "Look first."}
).encode()


def test_it_counts_the_days_that_are_over(clock: Clock, almanac: Almanac, call: Call) -> None:
    with counting_service(clock, almanac) as address:
        status, _, body = call(address)
    rows = json.loads(body)["counts"]
    assert status == 200
    assert len(rows) == HISTORY_DAYS * len(SHOWS)
    assert rows[-1] == {
        "day": almanac.date(HISTORY_DAYS - 1).isoformat(),
        "show": SHOWS[-1].name,
        UNIT: count_of(SHOWS[-1], HISTORY_DAYS - 1),
    }


def test_it_says_when_nothing_has_changed(clock: Clock, almanac: Almanac, call: Call) -> None:
    with counting_service(clock, almanac) as address:
        _, headers, _ = call(address)
        asked = {"If-None-Match": headers["ETag"]}
        clock.instant += datetime.timedelta(hours=12)
        assert call(address, asked)[::2] == (304, b"")
        clock.instant += datetime.timedelta(hours=12)
        assert call(address, asked)[0] == 200


def test_it_has_nothing_else(clock: Clock, almanac: Almanac, call: Call) -> None:
    with counting_service(clock, almanac) as address:
        assert call(address + "/more")[0] == 404


def _signed(secret: str, at: datetime.datetime) -> dict[str, str]:
    return dict(Signer(secret).headers("msg_1", BODY, at))


def test_the_desk_takes_what_was_signed_for_it(clock: Clock, call: Call) -> None:
    secret, arrivals = new_secret(), Arrivals()
    with desk(clock, secret, arrivals) as address:
        assert call(address, _signed(secret, clock.now()), BODY)[0] == 204
    came = arrivals.get_nowait()
    assert (came.id, came.stream_id) == ("msg_1", "counts/A")
    assert (came.sentence, came.caution) == ("A fell — by half.", "Look first.")


def _forged(secret: str, now: datetime.datetime) -> dict[str, dict[str, str]]:
    good = _signed(secret, now)
    return {
        "another secret": _signed(new_secret(), now),
        "another id": good | {"webhook-id": "msg_2"},
        "another instant": good | {"webhook-timestamp": str(int(now.timestamp()) + 1)},
        "no number": good | {"webhook-timestamp": "soon"},
        "no year": good | {"webhook-timestamp": "9" * 30},
        "no signature": {name: value for name, value in good.items() if name != "webhook-signature"},
        "long ago": _signed(secret, now - datetime.timedelta(minutes=6)),
        "ahead": _signed(secret, now + datetime.timedelta(minutes=6)),
        "no letter of ASCII": good | {"webhook-signature": "v1,\xe9"},
    }


@pytest.mark.parametrize("fault", list(_forged(new_secret(), datetime.datetime.now(datetime.UTC))))
def test_the_desk_refuses_anything_else(fault: str, clock: Clock, call: Call) -> None:
    secret, arrivals = new_secret(), Arrivals()
    with desk(clock, secret, arrivals) as address:
        assert call(address, _forged(secret, clock.now())[fault], BODY)[0] == 401
        assert call(address, _signed(secret, clock.now()), BODY + b" ")[0] == 401
        assert call(address + "/other", _signed(secret, clock.now()), BODY)[0] == 400
    assert arrivals.empty()


def test_on_the_real_clock_the_library_agrees() -> None:
    """What the desk accepts on the fast clock, the reference library's `verify` accepts on the machine's."""
    secret = new_secret()
    signed = _signed(secret, datetime.datetime.now(datetime.UTC))
    assert Webhook(secret).verify(BODY, signed) == json.loads(BODY)
