"""Which written texts could be a secret in the wrong place, so that no fault repeats them."""

import re

_LIKE_A_SECRET = re.compile(
    r"://|:/[^/ ]|whsec_|^(bearer|basic|digest|token) |passw|[A-Za-z0-9+/=_-]{24,}", re.IGNORECASE
)
_LOGIN_VALUE = re.compile(r"^(bearer|basic|digest|token) |whsec_", re.IGNORECASE)


def could_be_secret(text: str) -> bool:
    """Whether a text looks like an address, a key or a token."""
    return _LIKE_A_SECRET.search(text) is not None


def is_login_value(text: str) -> bool:
    """Whether a header with this value lets its sender in, whatever its name."""
    return _LOGIN_VALUE.search(text) is not None


def could_be_secret_path(text: str) -> bool:
    """Whether a text that should be a path is rather the secret, or the address, itself."""
    return "://" in text or "whsec_" in text or not text.isprintable() or not text.strip()
