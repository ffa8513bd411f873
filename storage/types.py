"""Column types that keep values what they are: aware instants, calendar days, integers, finite numbers."""

import json
import math
import operator
from datetime import UTC, date, datetime
from typing import Any, SupportsIndex, TypeAlias

from sqlalchemy import BigInteger, Dialect, Double, Integer, LargeBinary, Text
from sqlalchemy.types import REAL, TypeDecorator, TypeEngine

from storage.errors import DamagedRow, UnstorableValue

At: TypeAlias = date | datetime
"""Where a count lies: a calendar day, or an aware instant."""

LARGEST_WHOLE = 2**53
_DAY_LENGTH = len("2026-03-02")
_SPOILS_TEXT = {0: "\ufffd"} | dict.fromkeys(range(0xD800, 0xE000), "\ufffd")


def whole(value: object) -> int:
    """The value as a Python int: numpy integers are converted, what is not a whole number is refused."""
    # The usual type is asked for first, because asking for an ability takes twenty times as long.
    if type(value) is not int and (isinstance(value, bool) or not isinstance(value, SupportsIndex)):
        raise UnstorableValue("a whole number", value)
    number = operator.index(value)
    if abs(number) > LARGEST_WHOLE:
        raise UnstorableValue(f"a whole number within ±{LARGEST_WHOLE}", number)
    return number


def real(value: object) -> float:
    """The value as a finite Python float; numpy floats are converted (SQLite would turn NaN into NULL)."""
    if isinstance(value, bool | str) or not hasattr(value, "__float__"):
        raise UnstorableValue("a finite number", value)
    number = float(value)
    if not math.isfinite(number):
        raise UnstorableValue("a finite number", number)
    return number


def instant_text(value: object) -> str:
    """An aware datetime as UTC text of fixed width, so that text order is time order."""
    if not isinstance(value, datetime) or value.utcoffset() is None:
        raise UnstorableValue("an instant with its time zone", value)
    try:
        utc = value.astimezone(UTC)
    except OverflowError as error:
        raise UnstorableValue("an instant of the years 1 to 9999 in UTC", value) from error
    return utc.replace(tzinfo=None).isoformat(timespec="microseconds") + "Z"


def at_text(value: object) -> str:
    """A calendar day as ISO text, an instant as `instant_text` writes it."""
    if isinstance(value, date) and not isinstance(value, datetime):
        return value.isoformat()
    return instant_text(value)


def clean_text(value: str) -> str:
    """The text without the characters that databases refuse (NUL, halves of surrogate pairs)."""
    return value.translate(_SPOILS_TEXT)


def json_text(value: object) -> str:
    """JSON text, the same bytes for the same value, never with NaN."""
    try:
        return json.dumps(value, allow_nan=False, sort_keys=True, separators=(",", ":"))
    except (TypeError, ValueError) as error:
        raise UnstorableValue("a value that JSON can carry", value) from error


class Instant(TypeDecorator[datetime]):
    """An aware instant; naive ones are refused."""

    impl = Text
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> str | None:  # noqa: ARG002
        return None if value is None else instant_text(value)

    def process_result_value(self, value: Any, dialect: Dialect) -> datetime | None:  # noqa: ARG002
        return None if value is None else _read_instant(value)


class DayOrInstant(TypeDecorator[At]):
    """A calendar day or an aware instant: of one kind within a stream, so that text order is time order."""

    impl = Text
    cache_ok = True

    def process_bind_param(self, value: At | None, dialect: Dialect) -> str | None:  # noqa: ARG002
        return None if value is None else at_text(value)

    def process_result_value(self, value: Any, dialect: Dialect) -> At | None:  # noqa: ARG002
        return None if value is None else _read_at(value)


class Whole(TypeDecorator[int]):
    """An integer to 2^53. Numpy integers are converted: SQLite would store them as blobs without a word."""

    impl = BigInteger().with_variant(Integer(), "sqlite")
    cache_ok = True

    def process_bind_param(self, value: int | None, dialect: Dialect) -> int | None:  # noqa: ARG002
        return None if value is None else whole(value)


class Real(TypeDecorator[float]):
    """A finite double."""

    impl: TypeEngine[float] = Double().with_variant(REAL(), "sqlite")
    cache_ok = True

    def process_bind_param(self, value: float | None, dialect: Dialect) -> float | None:  # noqa: ARG002
        return None if value is None else real(value)


class Name(TypeDecorator[str]):
    """An id, key or fixed word: kept exactly, so what cannot be kept exactly is refused."""

    impl = Text
    cache_ok = True

    def process_bind_param(self, value: str | None, dialect: Dialect) -> str | None:  # noqa: ARG002
        if value is not None and (not isinstance(value, str) or clean_text(value) != value):
            raise UnstorableValue("text without NUL and lone surrogates", value)
        return value


class Prose(TypeDecorator[str]):
    """Text for people: characters that no database takes are replaced rather than refused."""

    impl = Text
    cache_ok = True

    def process_bind_param(self, value: str | None, dialect: Dialect) -> str | None:  # noqa: ARG002
        return None if value is None else clean_text(value)


class Document(TypeDecorator[Any]):
    """A small JSON value, as text."""

    impl = Text
    cache_ok = True

    def process_bind_param(self, value: Any, dialect: Dialect) -> str | None:  # noqa: ARG002
        return None if value is None else json_text(value)

    def process_result_value(self, value: Any, dialect: Dialect) -> Any:  # noqa: ARG002
        return None if value is None else _read_json(value)


class Bytes(TypeDecorator[bytes]):
    """Bytes as they are."""

    impl = LargeBinary
    cache_ok = True


def _read_instant(text: str) -> datetime:
    try:
        return datetime.fromisoformat(text).astimezone(UTC)
    except (TypeError, ValueError) as error:
        raise DamagedRow("an instant", text) from error


def _read_at(text: str) -> At:
    if len(text) != _DAY_LENGTH:
        return _read_instant(text)
    try:
        return date.fromisoformat(text)
    except ValueError as error:
        raise DamagedRow("a calendar day", text) from error


def _read_json(text: str) -> Any:
    try:
        return json.loads(text)
    except (TypeError, ValueError) as error:
        raise DamagedRow("JSON text", text) from error
