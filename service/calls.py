"""What is asked for over HTTP, what comes back, until when, and what can go wrong. No library of HTTP here.

No error holds an address, a header value or the text of a library's exception, since those may carry secrets.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

Headers = tuple[tuple[str, str], ...]
Monotonic = Callable[[], float]


class FetchError(Exception):
    """A call did not bring an answer. The sentence names the target only as the caller allowed."""

    def __init__(self, named: str, sentence: str) -> None:
        self.named = named
        super().__init__(sentence)


class FetchTimedOut(FetchError):
    """The answer was not there in full when the deadline came."""

    def __init__(self, named: str, seconds: float) -> None:
        self.seconds = seconds
        super().__init__(named, f"{named} did not answer in full within {seconds:g} s.")


class BodyTooLarge(FetchError):
    """The answer is larger than we are willing to hold."""

    def __init__(self, named: str, largest_body: int) -> None:
        self.largest_body = largest_body
        super().__init__(named, f"{named} sent more than the {largest_body} bytes that are allowed.")


class FetchFailed(FetchError):
    """The call failed before an answer was complete, or must not be made as asked."""

    def __init__(self, named: str, why: str) -> None:
        self.why = why
        super().__init__(named, f"{named} could not be called: {why}.")


@dataclass(frozen=True, slots=True)
class Deadline:
    """An end on the monotonic clock that was passed in."""

    seconds: float
    ends: float
    monotonic: Monotonic

    @classmethod
    def after(cls, seconds: float, monotonic: Monotonic) -> "Deadline":
        return cls(seconds, monotonic() + seconds, monotonic)

    def remaining(self) -> float:
        return self.ends - self.monotonic()


@dataclass(frozen=True, slots=True)
class Fetch:
    """A GET. `headers` may carry secrets and go to the first origin only; `open_headers` carry none."""

    address: str = field(repr=False)
    named: str = "its address"
    headers: Headers = field(default=(), repr=False)
    open_headers: Headers = ()


@dataclass(frozen=True, slots=True)
class Post:
    """A POST of bytes that are fixed already."""

    address: str = field(repr=False)
    body: bytes = field(repr=False)
    named: str = "its address"
    headers: Headers = field(default=(), repr=False)


@dataclass(frozen=True, slots=True)
class Answer:
    """A whole answer. Header names are in lower case, repeated ones joined by a comma."""

    status: int
    headers: Mapping[str, str] = field(repr=False)
    body: bytes = field(repr=False)
    address: str = field(default="", repr=False)
