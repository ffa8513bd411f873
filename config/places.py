"""Values that say where something stands: addresses, secrets, JSONPaths, and titles made from them."""

import base64
import re
from collections.abc import Callable
from typing import Annotated
from urllib.parse import parse_qsl, urlsplit

from jsonpath import JSONPath, JSONPathEnvironment, JSONPathError

from config.lookup import NotThere
from config.secret import Reference, Secret, SecretFile, Variable
from config.shown import HIDDEN, looks_secret
from config.takes import Surroundings, Takes, Unfit, as_it_is
from config.values import required_text

REFERENCE = '{ env = "NAME" } or { file = "path" }'
SIGNING_NEEDED = '"whsec_" followed by 24 to 64 bytes in base64'
LINK_HEADER = "link header"

_VARIABLE = re.compile(r"[A-Z_][A-Z0-9_]{0,99}", re.ASCII)
_HEADER_NAME = re.compile(r"[!#$%&'*+.^_`|~0-9A-Za-z-]+", re.ASCII)
_GUARDED = re.compile(r"auth|cookie|key|token|secret|passw|credential|signature|\bsig\b|session", re.IGNORECASE)
_LOGIN = re.compile(r"^(bearer|basic|digest|token|apikey)\b|whsec_|(?=[A-Za-z_-]*[0-9])[A-Za-z0-9_-]{24,}", re.IGNORECASE)
_BRACES = re.compile(r"\{([^{}]*)\}")
_PATHS = JSONPathEnvironment(strict=True)

Fits = Callable[[str], bool]


def is_guarded(name: str) -> bool:
    """Whether a header or a parameter of this name is likely to hold a secret."""
    return _GUARDED.search(name) is not None


def is_header_name(name: str) -> bool:
    """Whether HTTP allows a header of this name."""
    return _HEADER_NAME.fullmatch(name) is not None


def filled(template: str, *, source: str, split: str | None) -> str:
    """The template with the source's name and the split value put in."""
    given = {"source": source, "split": split or ""}
    return _BRACES.sub(lambda found: given[found[1]], template)


def is_web_address(text: str) -> bool:
    """Whether it is an http or https address with a host."""
    try:
        parts = urlsplit(text)
        return parts.scheme in ("http", "https") and bool(parts.hostname) and parts.port != 0 and _is_clean(text)
    except ValueError:
        return False


def is_signing_secret(text: str) -> bool:
    """Whether it is a secret of the Standard Webhooks specification."""
    coded = text.removeprefix("whsec_").rstrip("=")
    try:
        key = base64.b64decode(coded + "=" * (-len(coded) % 4), validate=True)
    except ValueError:
        return False
    return text.startswith("whsec_") and 24 <= len(key) <= 64


def _is_clean(text: str) -> bool:
    return text.isascii() and text.isprintable() and " " not in text


def _is_database_address(text: str) -> bool:
    return re.match(r"[a-z][a-z0-9_]*(\+[a-z0-9_]+)?:", text, re.ASCII) is not None and text.isprintable()


def _is_header_value(text: str) -> bool:
    return text.isascii() and text.isprintable() and text == text.strip()


def _is_harmless(text: str) -> bool:
    """No login in it, and no parameter that is named like a key."""
    parts = urlsplit(text)
    guarded = any(is_guarded(name) for name, _ in parse_qsl(parts.query, keep_blank_values=True))
    return "@" not in parts.netloc and not guarded and "whsec_" not in text


def _secret(value: object, around: Surroundings, fits: Fits, needed: str) -> Secret:
    reference = _reference(value, around)
    try:
        found = around.look_up(reference)
    except NotThere as missing:
        raise Unfit(missing.got, missing.expected) from None
    if found is not None and not fits(found.value):
        raise Unfit("something else (not shown)", f"{needed} in {reference}")
    return Secret(reference, found)


def _reference(value: object, around: Surroundings) -> Reference:
    match value:
        case {"env": str(name), **rest} if not rest:
            return _variable(name)
        case {"file": str(path), **rest} if not rest:
            return _secret_file(path, around)
        case str():
            raise Unfit("the text itself, written into this file (not shown)", f"a reference, {REFERENCE}")
        case dict():
            raise Unfit("another table", f"a reference, {REFERENCE}")
        case _:
            raise Unfit(None, f"a reference, {REFERENCE}")


def _variable(name: str) -> Variable:
    if not _VARIABLE.fullmatch(name):
        raise Unfit(
            "something else (not shown, it could be the secret itself)",
            "env to name a variable in capital letters, digits and underscores",
        )
    return Variable(name)


def _secret_file(path: str, around: Surroundings) -> SecretFile:
    if not path.strip() or not path.isprintable() or "://" in path or "whsec_" in path:
        raise Unfit(
            "something else (not shown, it could be the secret itself)", "file to name the path of a file"
        )
    return SecretFile(around.folder / path)


def secret(needed: str, fits: Fits) -> Takes:
    """A secret, by reference only."""
    return Takes(
        f"a reference, {REFERENCE}, to {needed}",
        lambda value, around: _secret(value, around, fits, needed),
        Secret.as_written,
    )


def secret_or_open(needed: str, fits: Fits, may_be_open: Fits) -> Takes:
    """A text that may stand in the file as it is if there is nothing secret in it."""

    def read(value: object, around: Surroundings) -> str | Secret:
        if not isinstance(value, str):
            return _secret(value, around, fits, needed)
        if not fits(value):
            raise Unfit("another text" if looks_secret(value) else None)
        if not may_be_open(value):
            raise Unfit("one that could hold a login or key (not shown)", f"a reference, {REFERENCE}, for it")
        return value

    return Takes(f"{needed}, or a reference, {REFERENCE}", read, _open_as_written)


def _open_as_written(value: str | Secret) -> object:
    return value.as_written() if isinstance(value, Secret) else value


def _is_open_database(text: str) -> bool:
    return not text.startswith("sqlite") and _is_harmless(text)


def _json_path(value: object, _around: Surroundings) -> str:
    path = required_text(value, 1000)
    try:
        fits = isinstance(_PATHS.compile(path), JSONPath)
    except (JSONPathError, RecursionError):
        fits = False
    if not fits:
        raise Unfit
    return path


def _next_page(value: object, around: Surroundings) -> str:
    return value if value == LINK_HEADER else _json_path(value, around)  # type: ignore[return-value]


def _template(value: object, _around: Surroundings) -> str:
    template = required_text(value)
    around_names = _BRACES.sub("", template)
    if {"{", "}"} & set(around_names) or set(_BRACES.findall(template)) - {"source", "split"}:
        raise Unfit
    return template


WebAddress = Annotated[
    str | Secret, secret_or_open("an http or https address without a login or key in it", is_web_address, _is_harmless)
]
DatabaseAddress = Annotated[
    str | Secret,
    secret_or_open(
        "the address of a database (for an SQLite file give path instead)", _is_database_address, _is_open_database
    ),
]
SecretAddress = Annotated[Secret, secret("an http or https address", is_web_address)]
SigningSecret = Annotated[Secret, secret(SIGNING_NEEDED, is_signing_secret)]
HeaderValue = Annotated[
    str | Secret, secret_or_open("a text of printable ASCII", _is_header_value, lambda text: _LOGIN.search(text) is None)
]
RowsPath = Annotated[str, Takes('a JSONPath of RFC 9535 such as "$.data[*]"', _json_path, as_it_is)]
FieldPath = Annotated[str, Takes('a JSONPath from the row such as "$.plays"', _json_path, as_it_is)]
NextPage = Annotated[str, Takes(f'"{LINK_HEADER}" or a JSONPath such as "$.next"', _next_page, as_it_is)]
Template = Annotated[
    str, Takes("a text of 1 to 200 signs, in which only {split} and {source} are filled in", _template, as_it_is)
]
