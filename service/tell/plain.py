"""Titles made fit to stand in a sentence: one line, no control characters, not too long. Pure."""

import unicodedata

LONGEST_TITLE = 200
# They turn the direction of what follows them, so that a title could rewrite the sentence around it.
TURNING = frozenset("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069\u200e\u200f\u061c")
BREAKS = frozenset({"Cc", "Zl", "Zp"})


def plain(text: str, *, longest: int = LONGEST_TITLE) -> str:
    """The text on one line, as people see it; empty if nothing of it can be seen."""
    line = " ".join("".join(_kept(character) for character in text).split())
    return line if len(line) <= longest else line[: longest - 3].rstrip() + "..."


def plain_or_none(text: str | None) -> str | None:
    """The same for a text that may be lacking or empty."""
    return (plain(text) or None) if text is not None else None


def _kept(character: str) -> str:
    if character in TURNING:
        return ""
    category = unicodedata.category(character)
    if category in BREAKS:
        return " "
    return "\ufffd" if category == "Cs" else character
