"""From what validation found to faults in words."""

import re
from collections.abc import Iterable
from difflib import get_close_matches
from pathlib import Path
from typing import Any

from pydantic_core import ErrorDetails

from config.across import Clash
from config.errors import Fault
from config.guarded import could_be_secret
from config.key_paths import Loc, key_path, known_at, quoted, raw_at, shown

_LITERALS = re.compile(r"'([^']*)'")


def faults_of(
    errors: list[ErrorDetails], clashes: Iterable[Clash], raw: Any, file: Path
) -> tuple[Fault, ...]:
    """All faults of a file, each once, in the order of the settings."""
    found = [_fault(error, raw, file) for error in errors if not _follows(error, errors)]
    found += [Fault(file, key_path(raw, at.loc), at.got, at.needed, at.nearest) for at in clashes]
    return tuple(dict.fromkeys(found))


def _follows(error: ErrorDetails, errors: list[ErrorDetails]) -> bool:
    """A list whose members are faulty counts as too short as well."""
    loc = error["loc"]
    return error["type"] == "too_short" and any(
        other["loc"][: len(loc)] == loc and len(other["loc"]) > len(loc) for other in errors
    )


def _fault(error: ErrorDetails, raw: Any, file: Path) -> Fault:
    loc, context = error["loc"], error.get("ctx", {})
    match error["type"]:
        case "extra_forbidden":
            return _unknown_key(loc, raw, file)
        case "choice":
            return _choice(loc, context["key"], context["known"].split(", "), raw, file)
        case "literal_error":
            known = _LITERALS.findall(context["expected"])
            nearest = nearest_of(raw_at(raw, loc), known)
            return _plain(loc, raw, file, _quoted(known), nearest)
        case "unusable":
            needed = context.get("needed") or _needed(loc)
            return Fault(file, key_path(raw, loc), context["got"], needed)
        case "wrong":
            return _plain(loc, raw, file, _needed(loc), context.get("nearest"))
        case "string_pattern_mismatch" if loc[-1] == "[key]":
            return Fault(
                file, key_path(raw, loc), "another name", "a header name of letters, digits and hyphens"
            )
        case _:
            return _plain(loc, raw, file, _needed(loc), None)


def _plain(loc: Loc, raw: Any, file: Path, needed: str, nearest: str | None) -> Fault:
    return Fault(file, key_path(raw, loc), shown(raw_at(raw, loc), loc), needed, nearest)


def _unknown_key(loc: Loc, raw: Any, file: Path) -> Fault:
    keys = known_at(loc[:-1]).keys
    needed = f"one of the keys {', '.join(keys)}"
    return Fault(file, key_path(raw, loc), "an unknown key", needed, nearest_of(str(loc[-1]), keys))


def _choice(loc: Loc, key: str, known: list[str], raw: Any, file: Path) -> Fault:
    value = raw_at(raw, loc)
    if not isinstance(value, dict):
        return _plain(loc, raw, file, "a table", None)
    at = (*loc, key)
    chosen = value.get(key)
    return Fault(file, key_path(raw, at), _word(chosen), _quoted(known), nearest_of(chosen, known))


def _word(value: Any) -> str:
    if isinstance(value, str):
        return "a text (not repeated)" if could_be_secret(value) else quoted(value)
    return shown(value, ("?",))


def _needed(loc: Loc) -> str:
    return known_at(loc).needed or "a value of another type"


def _quoted(known: list[str]) -> str:
    words = [f'"{word}"' for word in known]
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} or {words[-1]}"


def nearest_of(word: Any, known: Iterable[str]) -> str | None:
    """The known word that an unknown one comes nearest to."""
    found = get_close_matches(word.lower(), list(known), n=1) if isinstance(word, str) else []
    return found[0] if found else None
