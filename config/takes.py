"""One kind of check for every single value, so that each can say what it needs."""

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

from pydantic import GetCoreSchemaHandler, ValidationInfo
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from config.secret import LookUp

FAULT_TYPE: Final = "unfit"


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What values are read against: the settings file's folder, and the look-up of secrets."""

    folder: Path
    look_up: LookUp


class Unfit(Exception):
    """A value cannot be used. `got` None shows the value itself; `expected` None is what the check needs."""

    def __init__(self, got: str | None = None, expected: str | None = None) -> None:
        self.got, self.expected = got, expected
        super().__init__(got, expected)


@dataclass(frozen=True, slots=True)
class Takes:
    """Stands in an annotation: what is needed, how it is read, and how it is written to JSON.

    `read` raises Unfit or ValueError; a ValueError's own text is not shown.
    """

    needed: str
    read: Callable[[object, Surroundings], object]
    written: Callable[[Any], object] = str

    def __get_pydantic_core_schema__(self, _source: object, _handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.with_info_plain_validator_function(
            self._read,
            serialization=core_schema.plain_serializer_function_ser_schema(self.written, when_used="json"),
        )

    def _read(self, value: object, info: ValidationInfo) -> object:
        try:
            return self.read(value, info.context)
        except Unfit as unfit:
            expected, got = unfit.expected or self.needed, unfit.got
        except ValueError:
            expected, got = self.needed, None
        # Texts go by context, since a message of pydantic's would read braces in them as places to fill.
        raise PydanticCustomError(FAULT_TYPE, "unfit", {"expected": expected, "got": got})


def as_it_is(value: object) -> object:
    """For numbers and texts, which JSON has itself."""
    return value
