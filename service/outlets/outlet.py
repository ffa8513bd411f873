"""What every outlet does, and what can come of an attempt."""

from dataclasses import dataclass
from datetime import datetime
from enum import StrEnum
from typing import Protocol


class Kind(StrEnum):
    """What came of an attempt.

    `REFUSED` is a failure that people may have to mend (a wrong address, a wrong password); it is tried again
    like any other. `ENDED` is the receiver's last word: it wants no more.
    """

    DELIVERED = "delivered"
    TRY_LATER = "try later"
    REFUSED = "refused"
    ENDED = "ended"


@dataclass(frozen=True, slots=True)
class Outcome:
    """What came of an attempt. `error` is a sentence that holds no secret and no address."""

    kind: Kind
    status: int | None = None
    error: str | None = None
    retry_after_seconds: float | None = None


class Outlet(Protocol):
    """A place to which alerts go. `attempt_seconds` is the most that one attempt may take."""

    @property
    def name(self) -> str:
        """The name from the settings."""

    @property
    def attempt_seconds(self) -> float:
        """The most that one attempt may take."""

    def send(self, delivery_id: str, body: bytes, now: datetime) -> Outcome:
        """One attempt. What the receiver or the network does wrong is an outcome, not an exception."""
