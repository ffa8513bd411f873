"""Texts of a row: which show, which release, what title; and how a raw value is shown to a person."""

import unicodedata
import uuid
from dataclasses import dataclass

LONGEST_IDENTITY = 200
LONGEST_TITLE = 300
LONGEST_SHOWN = 400


class UnusableValue(ValueError):
    """A raw value that its field cannot have."""

    def __init__(self, name: str, needed: str, got: object) -> None:
        self.name, self.needed, self.got = name, needed, got
        super().__init__(f"{name} must be {needed}; got {_clipped(shown(got), 60)}.")


@dataclass(frozen=True, slots=True)
class Several:
    """A path that fits more than one value of a row where one was asked for."""

    number: int


def shown(value: object) -> str:
    """A raw value on one line of plain characters, bounded before anything large is turned into text."""
    match value:
        case None:
            return "nothing"
        case str():
            return '"' + "".join(map(_visible, _clipped(value, LONGEST_SHOWN))) + '"'
        case bool():
            return "true" if value else "false"
        case Several():
            return f"{value.number} values"
        case dict():
            return "an object"
        case list():
            return "a list"
        case bytes() | bytearray() | memoryview():
            return "bytes"
        case int() if value.bit_length() > 200:
            return "a number of more than 60 digits"
        case _:
            return _clipped(str(value), LONGEST_SHOWN)


def read_identity(value: object, name: str) -> str:
    """A stable id: text without blanks around it, or a whole number as text."""
    text = str(value) if _names_something(value) else value
    if not isinstance(text, str) or not text.strip():
        raise UnusableValue(name, "a text or a whole number", value)
    text = text.strip()
    if len(text) > LONGEST_IDENTITY:
        raise UnusableValue(name, f"at most {LONGEST_IDENTITY} characters long", value)
    if not all(map(_plain, text)):
        raise UnusableValue(name, "a text without control characters", value)
    return text


def read_title(value: object) -> str | None:
    """A title for people; what cannot be shown in it is replaced, since no title is worth losing a count."""
    if value is None or isinstance(value, dict | list | bytes | Several):
        return None
    text = " ".join("".join(c if _plain(c) else " " for c in str(value)[: 4 * LONGEST_TITLE]).split())
    return _clipped(text, LONGEST_TITLE) or None


def _names_something(value: object) -> bool:
    if isinstance(value, uuid.UUID):
        return True
    return isinstance(value, int) and not isinstance(value, bool) and value.bit_length() <= 200


def _plain(character: str) -> bool:
    """Neither a control character, nor a line end, nor half of a surrogate pair, which no database stores."""
    return unicodedata.category(character) not in ("Cc", "Cs", "Zl", "Zp")


def _visible(character: str) -> str:
    return character if _plain(character) else "\\u{" + f"{ord(character):x}" + "}"


def _clipped(text: str, longest: int) -> str:
    return text if len(text) <= longest else text[: longest - 1] + "…"
