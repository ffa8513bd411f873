"""Secrets: named in the settings by where they stand, and never printed."""

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from config.errors import SecretNotRead


@dataclass(frozen=True, slots=True)
class Variable:
    """A secret in a variable of the environment."""

    name: str

    def __str__(self) -> str:
        return f"the environment variable {self.name}"


@dataclass(frozen=True, slots=True)
class SecretFile:
    """A secret in a file of its own."""

    path: Path

    def __str__(self) -> str:
        return f"the file {self.path}"


Reference = Variable | SecretFile


@dataclass(frozen=True, slots=True)
class Found:
    """What was found under a reference, and whether people other than its owner can read the file."""

    value: str
    open_to_others: bool = False

    def __repr__(self) -> str:
        return "Found(...)"


class Secret:
    """A text that is shown nowhere: only `reveal` gives it, and everything else names where it stands."""

    __slots__ = ("_found", "reference")

    def __init__(self, reference: Reference, found: Found | None) -> None:
        self.reference: Final = reference
        self._found: Final = found

    def reveal(self) -> str:
        """The secret itself.

        Raises
        ------
        SecretNotRead
            If the settings were read without their secrets.
        """
        if self._found is None:
            raise SecretNotRead(str(self.reference))
        return self._found.value

    @property
    def open_to_others(self) -> bool:
        """Whether it stands in a file that other people of this machine can read."""
        return self._found is not None and self._found.open_to_others

    def as_written(self) -> dict[str, str]:
        """The reference as it stands in the settings."""
        if isinstance(self.reference, Variable):
            return {"env": self.reference.name}
        return {"file": str(self.reference.path)}

    def __repr__(self) -> str:
        return f"Secret(from {self.reference})"

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Secret):
            return NotImplemented
        return (self.reference, self._found) == (other.reference, other._found)

    def __hash__(self) -> int:
        return hash(self.reference)

    def __reduce__(self) -> str:
        raise TypeError("A secret is not written out.")

    def __deepcopy__(self, _memo: object) -> "Secret":
        return self


LookUp = Callable[[Reference], Found | None]
"""Finds what a reference names; None leaves it for later. Raises ValueError with what is wrong."""


def plain_text(value: str | Secret) -> str:
    """A value that may stand in the settings itself or be a secret."""
    return value.reveal() if isinstance(value, Secret) else value
