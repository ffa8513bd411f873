"""Addresses of the web and of databases, literal or by reference, and signing secrets."""

import base64
import binascii
import re
from typing import Annotated, Any
from urllib.parse import SplitResult, parse_qsl, urlsplit

from pydantic import Field, PlainValidator, ValidationInfo
from pydantic.functional_serializers import PlainSerializer

from config.guarded import is_login_value
from config.part import Surroundings, surroundings, unusable
from config.references import NEEDED, origin, resolve
from config.secret import Secret

_WHSEC = "whsec_"
_LOGIN = re.compile(r"key|token|secret|passw|signature|^sig$|^auth", re.IGNORECASE)
_SQLITE = "sqlite:///"


def is_login(name: str) -> bool:
    """Whether something of this name usually lets its holder in."""
    return name.lower() in ("authorization", "proxy-authorization", "cookie") or bool(_LOGIN.search(name))


def _web(text: str) -> SplitResult | None:
    try:
        parts = urlsplit(text)
        usable = parts.scheme in ("http", "https") and bool(parts.hostname) and parts.port != 0
    except ValueError:
        return None
    plain = text.isascii() and text.isprintable() and " " not in text
    return parts if usable and plain and not parts.fragment else None


def _source_web(raw: Any, info: ValidationInfo) -> str | Secret:
    if not isinstance(raw, str):
        return _secret_web(raw, info)
    parts = _web(raw)
    if parts is None:
        raise unusable("a text that is none (not repeated)")
    if parts.username or parts.password or any(is_login(name) for name, _ in parse_qsl(parts.query)):
        raise unusable("an address with a login in it (not repeated)", f"a reference for it, {NEEDED}")
    return raw


def _secret_web(raw: Any, info: ValidationInfo) -> Secret:
    found = resolve(raw, surroundings(info))
    if found.is_read and _web(found.reveal()) is None:
        raise unusable(f"{origin(raw)}, which is none", "an http or https address")
    return found


def _database(raw: Any, info: ValidationInfo) -> str | Secret:
    around = surroundings(info)
    if isinstance(raw, str):
        if not raw.startswith(_SQLITE):
            raise unusable("another text written here (not repeated)")
        return _in_folder(raw, around)
    found = resolve(raw, around)
    if not found.is_read:
        return found
    if "://" not in found.reveal():
        raise unusable(f"{origin(raw)}, which is none", "a database address")
    return Secret(_in_folder(found.reveal(), around))


def _in_folder(address: str, around: Surroundings) -> str:
    """A relative SQLite path is meant from the settings file, wherever the program was started."""
    name = address.removeprefix(_SQLITE)
    if name == address:
        return address
    if not name or name.startswith((":memory:", "?")):
        raise unusable(
            "an address without a file", f'a file behind {_SQLITE}, such as "{_SQLITE}counts.sqlite"'
        )
    return address if name.startswith("file:") else f"{_SQLITE}{around.folder / name}"


def _signing(raw: Any, info: ValidationInfo) -> Secret:
    found = resolve(raw, surroundings(info))
    if not found.is_read:
        return found
    length = _signing_bytes(found.reveal().strip())
    if length is None or not 24 <= length <= 64:
        size = "" if length is None else f" ({length} bytes)"
        raise unusable(f"{origin(raw)}, which is none{size}", f'"{_WHSEC}" and 24 to 64 bytes in base64')
    return Secret(found.reveal().strip())


def _signing_bytes(text: str) -> int | None:
    coded = text.removeprefix(_WHSEC).rstrip("=")
    if not text.startswith(_WHSEC):
        return None
    try:
        return len(base64.b64decode(coded + "=" * (-len(coded) % 4), validate=True))
    except (binascii.Error, ValueError):
        return None


def _header(raw: Any, info: ValidationInfo) -> str | Secret:
    value = raw if isinstance(raw, str) else resolve(raw, surroundings(info))
    if isinstance(value, Secret) and not value.is_read:
        return value
    text = value if isinstance(value, str) else value.reveal()
    if isinstance(raw, str) and is_login_value(raw):
        raise unusable("a text written here (not repeated)", f"a reference, {NEEDED}")
    if not (text.isascii() and text.isprintable() and text == text.strip()):
        raise unusable(origin(raw), "printable ASCII characters without blanks around them")
    return value


_masked = PlainSerializer(str, return_type=str)

SourceAddress = Annotated[
    str | Secret,
    PlainValidator(_source_web),
    _masked,
    Field(description=f"an http or https address, written here or by reference, {NEEDED}"),
]
SecretAddress = Annotated[
    Secret,
    PlainValidator(_secret_web),
    _masked,
    Field(description=f"an http or https address by reference, {NEEDED}"),
]
DatabaseAddress = Annotated[
    str | Secret,
    PlainValidator(_database),
    _masked,
    Field(
        description=f'a database address by reference, {NEEDED}, or a file such as "{_SQLITE}counts.sqlite"'
    ),
]
SigningSecret = Annotated[
    Secret,
    PlainValidator(_signing),
    _masked,
    Field(description=f"a signing secret by reference, {NEEDED}"),
]
HeaderName = Annotated[str, Field(pattern=r"^[!#$%&'*+.^_`|~0-9A-Za-z-]+$")]
HeaderValue = Annotated[str | Secret, PlainValidator(_header), _masked]
Headers = Annotated[
    dict[HeaderName, HeaderValue],
    Field(description="a table of header names, each with a text or a reference"),
]
