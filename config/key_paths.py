"""From a place in the raw file to words: its key path, what is known there, what stands there."""

import json
import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, get_args, get_origin

from pydantic.fields import FieldInfo

from config.guarded import could_be_secret
from config.part import TAG, Part
from config.settings import Sections

Loc = tuple[str | int, ...]

HIDDEN_BELOW = frozenset({"address", "secret", "headers", "good_rounds_address", "query"})
LONGEST_SHOWN = 60
_BARE = re.compile(r"[A-Za-z0-9_-]+")
_NAMED = ("source", "outlet")


@dataclass(frozen=True, slots=True)
class Known:
    """What the settings know at a place: the parts it may be, and the field it is."""

    parts: tuple[type[Part], ...]
    field: FieldInfo | None

    @property
    def keys(self) -> list[str]:
        """The keys that may stand there."""
        return sorted(
            {field.alias or name for part in self.parts for name, field in part.model_fields.items()}
        )

    @property
    def needed(self) -> str | None:
        """What should stand there."""
        return _description(self.field) if self.field else None


def plain(loc: Loc) -> Loc:
    """The place without what validation put into it."""
    return tuple(item for item in loc if not str(item).startswith(TAG) and item != "[key]")


def raw_at(raw: Any, loc: Loc) -> Any:
    """What stands at a place; None if nothing does."""
    for item in plain(loc):
        if isinstance(raw, dict):
            raw = raw.get(item)
        elif isinstance(raw, list) and isinstance(item, int) and item < len(raw):
            raw = raw[item]
        else:
            return None
    return raw


def key_path(raw: Any, loc: Loc) -> str:
    """Such as `source[2] "plays" . fields . count`, blocks counted from 1."""
    words: list[str] = []
    for place, item in enumerate(plain(loc)):
        if isinstance(item, int):
            words[-1] += f"[{item + 1}]{_name_of(raw, loc, place)}"
        else:
            words.append(item if _BARE.fullmatch(item) else quoted(item))
    return " . ".join(words)


def known_at(loc: Loc) -> Known:
    """Follows a place through the parts."""
    known, in_container = Known((Sections,), None), False
    for item in loc:
        text = str(item)
        if text.startswith(TAG):
            known = Known(tuple(part for part in known.parts if _is_choice(part, text)), known.field)
        elif in_container:
            in_container = False
        elif isinstance(item, str):
            field = _field(known.parts, item)
            known = Known(_parts_in(field.annotation) if field else (), field)
            in_container = field is not None and _is_container(field.annotation)
    return known


def shown(value: Any, loc: Loc) -> str:
    """What stands at a place, in words; only its type where a secret might stand."""
    match value:
        case None:
            return "nothing"
        case dict():
            return "a table"
        case list():
            return "a list"
        case str() if _may_be_secret(loc) or could_be_secret(value):
            return "a text (not repeated)"
        case str():
            return quoted(value)
        case _ if _may_be_secret(loc):
            return f"a {'truth value' if isinstance(value, bool) else 'number or date'} (not repeated)"
        case bool():
            return "true" if value else "false"
        case _:
            return str(value)


def quoted(text: str) -> str:
    """A text of the file on one line, not too long."""
    short = text if len(text) <= LONGEST_SHOWN else text[:LONGEST_SHOWN] + "..."
    return json.dumps(short, ensure_ascii=not short.isprintable())


def _may_be_secret(loc: Loc) -> bool:
    known = known_at(loc)
    return bool(known.parts) or known.field is None or not HIDDEN_BELOW.isdisjoint(map(str, loc))


def _name_of(raw: Any, loc: Loc, place: int) -> str:
    if place != 1 or loc[0] not in _NAMED:
        return ""
    name = raw_at(raw, (*plain(loc)[:2], "name"))
    return f" {quoted(name)}" if isinstance(name, str) else ""


def _field(parts: tuple[type[Part], ...], key: str) -> FieldInfo | None:
    for part in parts:
        for name, field in part.model_fields.items():
            if key == (field.alias or name):
                return field
    return None


def _description(field: FieldInfo) -> str | None:
    """The field's own, or else that of the type it has."""
    return field.description or next(_descriptions_in(field.annotation), None)


def _descriptions_in(annotation: Any) -> Iterator[str]:
    for inner in getattr(annotation, "__metadata__", ()):
        if isinstance(inner, FieldInfo) and inner.description:
            yield inner.description
    for inner in get_args(annotation):
        yield from _descriptions_in(inner)


def _is_choice(part: type[Part], tag: str) -> bool:
    """Parts without a key of their own for the choice are chosen by their form."""
    kinds = [
        get_args(field.annotation) for name, field in part.model_fields.items() if name in ("kind", "shape")
    ]
    return (tag.removeprefix(TAG),) in kinds or not kinds


def _parts_in(annotation: Any) -> tuple[type[Part], ...]:
    if isinstance(annotation, type) and issubclass(annotation, Part):
        return (annotation,)
    return tuple(part for inner in get_args(annotation) for part in _parts_in(inner))


def _is_container(annotation: Any) -> bool:
    if get_origin(annotation) in (tuple, dict):
        return True
    return any(_is_container(inner) for inner in get_args(annotation)[:1] if not isinstance(inner, str))
