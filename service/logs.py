"""Log lines: one line a record, `key=value` for people or JSON for machines, on standard error.

A line never spans two, whatever a title or a server's answer holds, and never shows a secret that was named
to `hide`. The instant of a line is that of the machine, also where the program runs on another clock.
"""

import json
import logging
import math
import sys
import traceback
import unicodedata
from collections.abc import Iterable, Iterator, Mapping
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Literal, TextIO
from urllib.parse import quote, unquote, urlsplit

Form = Literal["words", "json"]
FORMS: tuple[Form, ...] = ("words", "json")
LEVELS = ("debug", "info", "warning", "error")
LONGEST_VALUE = 2000
MOST_FRAMES = 12
# What is shorter stands in too many harmless words to be blotted out; a short path is no secret.
SHORTEST_SECRET, SHORTEST_PART = 6, 12
BLOT = "(secret)"
TURNING = frozenset("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")
OURS = "knickpoint"


class Log:
    """Takes an event in a few plain words, and facts by name."""

    def __init__(self, name: str) -> None:
        self._logger = logging.getLogger(name)

    # The names of facts are open, so these alone take any keyword.
    def debug(self, event: str, /, **facts: object) -> None:
        """What only helps to find a fault."""
        self._logger.debug(event, extra={"facts": facts})

    def info(self, event: str, /, **facts: object) -> None:
        """What happened in the ordinary run of things."""
        self._logger.info(event, extra={"facts": facts})

    def warning(self, event: str, /, **facts: object) -> None:
        """What somebody should look at."""
        self._logger.warning(event, extra={"facts": facts})

    def error(self, event: str, /, **facts: object) -> None:
        """What went wrong."""
        self._logger.error(event, extra={"facts": facts})

    def exception(self, event: str, /, **facts: object) -> None:
        """What went wrong unforeseen; within `except`, so that the line says which error and where."""
        self._logger.error(event, extra={"facts": facts}, exc_info=True)


log = Log(OURS)


def configure(form: Form, level: str, *, stream: TextIO | None = None) -> None:
    """Send all lines to standard error in this form. Other packages are heard from `warning` on only."""
    handler = logging.StreamHandler(sys.stderr if stream is None else stream)
    handler.setFormatter(_Words() if form == "words" else _Json())
    root, ours = logging.getLogger(), logging.getLogger(OURS)
    root.handlers[:] = [handler]
    # The HTTP library writes addresses, which may be secrets, into lines below this level.
    root.setLevel(logging.WARNING)
    # The scheduler warns whenever a pass outlasts its interval, as every first fold does: that is foreseen.
    logging.getLogger("apscheduler").setLevel(logging.ERROR)
    ours.setLevel(level.upper())


def hide(secrets: Iterable[str]) -> None:
    """Blot these texts out of every line from now on, and the telling parts of those that are addresses."""
    every = {*_hidden, *(part for secret in secrets for part in _parts(secret.strip()))}
    # The longest first: one secret may hold another. In one step, since other threads may be writing lines.
    _hidden[:] = sorted(every, key=len, reverse=True)


def facts_of(record: logging.LogRecord) -> dict[str, object]:
    """All facts of a record in the order in which they are written, cleaned."""
    moment = datetime.fromtimestamp(record.created, UTC)
    own = {
        "at": moment.isoformat(timespec="milliseconds").replace("+00:00", "Z"),
        "level": record.levelname.lower(),
        "event": _clean(record.getMessage()),
    }
    given: Mapping[str, object] = getattr(record, "facts", {})
    named = {(f"{name}_" if name in own else name): _plain(value) for name, value in given.items()}
    origin = {} if record.name == OURS else {"by": _clean(record.name)}
    return own | origin | named | _trouble(record)


class _Words(logging.Formatter):
    def format(self, record: logging.LogRecord) -> str:
        pairs = ((name, value) for name, value in facts_of(record).items() if value is not None)
        return " ".join(f"{name}={_word(value)}" for name, value in pairs)


class _Json(logging.Formatter):
    def format(self, record: logging.LogRecord) -> str:
        return json.dumps(facts_of(record), allow_nan=False)


_hidden: list[str] = []


def _parts(secret: str) -> Iterator[str]:
    if len(secret) >= SHORTEST_SECRET:
        yield from (secret, quote(secret, safe=""), quote(secret), unquote(secret))
    if "://" in secret:
        yield from _parts_of_address(secret)


def _parts_of_address(text: str) -> Iterator[str]:
    try:
        address = urlsplit(text)
        password, pieces = address.password or "", (address.path.strip("/"), address.query, address.fragment)
    except ValueError:
        return
    long_enough = [piece for piece in pieces if len(piece) >= SHORTEST_PART]
    if len(password) >= SHORTEST_SECRET:
        long_enough.append(password)
    for piece in long_enough:
        yield from (piece, unquote(piece))


def _trouble(record: logging.LogRecord) -> dict[str, object]:
    """The error behind a record, in one line: its kind, its sentence, and the places it came through."""
    error = record.exc_info[1] if record.exc_info else None
    if error is None:
        return {}
    sentence = f"{type(error).__name__}: {error}".removesuffix(": ")
    return {"error": _clean(sentence), "where": _clean(_where(error))}


def _where(error: BaseException) -> str:
    frames = traceback.extract_tb(error.__traceback__)[-MOST_FRAMES:]
    own = " > ".join(f"{Path(frame.filename).name}:{frame.lineno}" for frame in frames)
    cause = error.__cause__ or (None if error.__suppress_context__ else error.__context__)
    return own if cause is None else f"{own} < {type(cause).__name__}"


def _plain(value: object) -> object:
    match value:
        case None | bool() | int():
            return value
        case float():
            return value if math.isfinite(value) else None
        case datetime():
            return value.astimezone(UTC).isoformat().replace("+00:00", "Z")
        case date():
            return value.isoformat()
        case _:
            return _clean(str(value))


def _clean(text: str) -> str:
    for secret in _hidden:
        text = text.replace(secret, BLOT)
    clipped = text if len(text) <= LONGEST_VALUE else f"{text[:LONGEST_VALUE]} ..."
    if clipped.isprintable():
        return clipped
    return "".join(_visible(character) for character in clipped)


def _visible(character: str) -> str:
    if character in TURNING or unicodedata.category(character) in ("Cc", "Cs", "Zl", "Zp"):
        return f"\\u{ord(character):04x}"
    return character


def _word(value: object) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    text = str(value)
    if text and not any(character in ' "=\\' or character.isspace() for character in text):
        return text
    return '"' + text.replace('"', "'") + '"'
