"""The only place that asks what time it is. Everything else is handed a clock."""

import time
from datetime import UTC, datetime
from typing import Protocol


class Clock(Protocol):
    """Tells the time of day and measures how long something takes."""

    def now(self) -> datetime:
        """The present instant, aware and in UTC."""

    def monotonic(self) -> float:
        """Seconds on a clock that never goes back; only differences mean anything."""


class SystemClock:
    """The machine's own clocks."""

    def now(self) -> datetime:
        """The present instant, aware and in UTC."""
        return datetime.now(UTC)

    def monotonic(self) -> float:
        """Seconds on the machine's steady clock."""
        return time.monotonic()
