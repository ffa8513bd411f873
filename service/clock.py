"""The only place that asks what time it is. Everything else is handed a clock."""

import time
from datetime import UTC, datetime, timedelta
from typing import Protocol


class Clock(Protocol):
    """Tells the time of day and measures how long something takes."""

    def now(self) -> datetime:
        """The present instant, aware and in UTC."""

    def monotonic(self) -> float:
        """Real seconds on a clock that never goes back; only differences mean anything."""

    def real_seconds(self, duration: timedelta) -> float:
        """How many real seconds such a duration of this clock takes."""


class SystemClock:
    """The machine's own clocks."""

    def now(self) -> datetime:
        """The present instant, aware and in UTC."""
        return datetime.now(UTC)

    def monotonic(self) -> float:
        """Seconds on the machine's steady clock."""
        return time.monotonic()

    def real_seconds(self, duration: timedelta) -> float:
        """The duration itself: this clock runs with the world."""
        return duration.total_seconds()


class FastClock:
    """A clock that runs faster than the world from a stated instant on; deadlines stay real."""

    def __init__(self, begins: datetime, times_faster: float) -> None:
        self._begins = begins.astimezone(UTC)
        self._times_faster = times_faster
        self._started = time.monotonic()

    def now(self) -> datetime:
        """The instant that this clock has reached."""
        passed = (time.monotonic() - self._started) * self._times_faster
        return self._begins + timedelta(seconds=passed)

    def monotonic(self) -> float:
        """Real seconds on the machine's steady clock."""
        return time.monotonic()

    def real_seconds(self, duration: timedelta) -> float:
        """How long the duration takes in the world."""
        return duration.total_seconds() / self._times_faster
