"""Values in their JSON form: instants in UTC, null for what is not a finite number. Pure."""

import datetime
import json
import math
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from enum import Enum

Json = None | bool | int | float | str | list["Json"] | dict[str, "Json"]


def as_json(value: object) -> Json:
    """A value of this program in JSON's own types; bytes are left out of what holds them."""
    match value:
        case None | bool() | int() | str():
            return value.value if isinstance(value, Enum) else value
        case float():
            return value if math.isfinite(value) else None
        case datetime.datetime():
            return instant_text(value)
        case datetime.date():
            return value.isoformat()
        case Mapping():
            return {str(key): as_json(each) for key, each in value.items() if not isinstance(each, bytes)}
        case list() | tuple():
            return [as_json(each) for each in value]
        case _ if is_dataclass(value) and not isinstance(value, type):
            return as_json({field.name: getattr(value, field.name) for field in fields(value)})
    raise TypeError(f"No JSON form is known for {type(value).__name__}.")


def instant_text(instant: datetime.datetime) -> str:
    """An aware instant in UTC, to the second unless it has a fraction: 2026-03-02T13:00:00Z."""
    return instant.astimezone(datetime.UTC).isoformat().replace("+00:00", "Z")


def json_text(value: object) -> str:
    """The JSON text of a value."""
    return json.dumps(as_json(value), ensure_ascii=False, allow_nan=False, indent=2)
