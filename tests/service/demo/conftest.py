"""A clock that is set by hand, and calls to the demo's two servers. All counts are the demo's: invented."""

import datetime
import time
import urllib.error
import urllib.request
from collections.abc import Callable
from dataclasses import dataclass

import pytest

from service.demo.story import HISTORY_DAYS, Almanac

Call = Callable[..., tuple[int, dict[str, str], bytes]]


@dataclass
class HandClock:
    """Stands still until it is moved."""

    instant: datetime.datetime

    def now(self) -> datetime.datetime:
        return self.instant

    def monotonic(self) -> float:
        return time.monotonic()

    def real_seconds(self, duration: datetime.timedelta) -> float:
        return duration.total_seconds()


@pytest.fixture
def almanac() -> Almanac:
    return Almanac(datetime.date(2026, 3, 1))


@pytest.fixture
def clock(almanac: Almanac) -> HandClock:
    return HandClock(datetime.datetime.combine(almanac.date(HISTORY_DAYS), datetime.time(6), datetime.UTC))


@pytest.fixture
def call() -> Call:
    def call_it(
        address: str, headers: dict[str, str] | None = None, body: bytes | None = None
    ) -> tuple[int, dict[str, str], bytes]:
        request = urllib.request.Request(address, data=body, headers=headers or {})
        try:
            with urllib.request.urlopen(request, timeout=10) as answer:
                return answer.status, dict(answer.headers), answer.read()
        except urllib.error.HTTPError as error:
            with error:
                return error.code, dict(error.headers), error.read()

    return call_it
