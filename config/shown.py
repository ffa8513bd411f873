"""How a faulty value is shown: cut short, and not at all where it could be a secret."""

import datetime
import math
import re

HIDDEN = "a text (not shown, it could be a secret)"
LONGEST = 60

_LIKE_A_SECRET = re.compile(
    r"://|whsec_|bearer |basic |password|passwd|[A-Za-z0-9+/=_-]{24,}", re.ASCII | re.IGNORECASE
)


def shown(value: object) -> str:
    """What was got, for a person; of tables and lists only what they are."""
    match value:
        case bool():
            return "true" if value else "false"
        case str():
            return shown_text(value)
        case int():
            return str(value) if abs(value) < 10**20 else "a whole number of more than 20 digits"
        case float():
            return f"{value:g}" if math.isfinite(value) else str(value)
        case datetime.date() | datetime.time():
            return value.isoformat()
        case dict():
            return "a table"
        case list():
            return f"a list of {len(value)}" if value else "an empty list"
        case _:
            return "something else"


def shown_text(text: str) -> str:
    """A text in quotes; one that looks like an address, a key or a token is not shown."""
    if looks_secret(text):
        return HIDDEN
    if not text:
        return "an empty text"
    return quoted(text if len(text) <= LONGEST else text[: LONGEST - 3] + "...")


def quoted(text: str) -> str:
    """On one line, whatever stands in it."""
    plain = "".join(sign if sign.isprintable() else "?" for sign in text)
    return f'"{plain}"'


def looks_secret(text: str) -> bool:
    """Whether a text looks like an address with a login, a key or a token."""
    return _LIKE_A_SECRET.search(text) is not None
