"""What all parts of the settings file have in common."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from pydantic import BaseModel, ConfigDict, Discriminator, ValidationInfo
from pydantic_core import PydanticCustomError

TAG = "\0"
"""Stands before the choice of a union in an error's place, so that no key is taken for one."""


class Part(BaseModel):
    """A table of the file: every key known, every value of exactly its type, nothing changed afterwards."""

    model_config = ConfigDict(strict=True, extra="forbid", frozen=True, hide_input_in_errors=True)


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What the file is read in: its folder, the environment, and where warnings gather.

    `environ` None leaves all secrets where they are.
    """

    folder: Path
    environ: Mapping[str, str] | None = field(repr=False)
    warnings: list[str]


def surroundings(info: ValidationInfo) -> Surroundings:
    """The surroundings that the loader gave."""
    found = info.context
    if not isinstance(found, Surroundings):
        raise TypeError("Settings are checked with their surroundings: use config.loading.load_settings.")
    return found


def unusable(got: str, needed: str | None = None) -> PydanticCustomError:
    """An error whose words are given; without `needed`, the field's description says what was needed."""
    context: dict[str, Any] = {"got": got}
    return PydanticCustomError("unusable", "got {got}", context | ({"needed": needed} if needed else {}))


def wrong(nearest: str | None = None) -> PydanticCustomError:
    """An error that leaves it to the loader to say what was got."""
    return PydanticCustomError("wrong", "wrong", {"nearest": nearest} if nearest else {})


def chosen_by(key: str, known: tuple[str, ...]) -> Discriminator:
    """Choose among parts by the text at a key."""

    def choose(raw: Any) -> str | None:
        found = raw.get(key) if isinstance(raw, dict) else getattr(raw, key, None)
        return f"{TAG}{found}" if found in known else None

    chooser: Callable[[Any], str | None] = choose
    return Discriminator(chooser, "choice", "choice", {"key": key, "known": ", ".join(known)})
