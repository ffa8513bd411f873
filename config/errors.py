"""What can be wrong with the settings: every fault at once, each with its place and without any secret."""

from dataclasses import dataclass
from pathlib import Path


class SettingsError(Exception):
    """Base of all errors of this package."""


@dataclass(frozen=True, slots=True)
class Fault:
    """One fault: the file, the key path (empty for the file as a whole), what was needed and what was got.

    In the key path blocks are counted from 1 and named, as in `source[2] "plays" . fields . count`.
    """

    file: Path
    key: str
    expected: str
    got: str
    advice: str = ""

    def __str__(self) -> str:
        place = f"{self.file}: {self.key}" if self.key else str(self.file)
        advice = f" {self.advice}" if self.advice else ""
        return f"{place}: expected {self.expected}; got {self.got}.{advice}"


class SettingsFaults(SettingsError):
    """The settings cannot be used. `faults` holds all that is wrong with them, in the order of the file."""

    def __init__(self, faults: tuple[Fault, ...]) -> None:
        self.faults = faults
        number = "one fault" if len(faults) == 1 else f"{len(faults)} faults"
        lines = "\n".join(f"  {fault}" for fault in faults)
        super().__init__(f"The settings have {number}:\n{lines}")


class SecretNotRead(SettingsError):
    """A secret was asked for where the settings had been read without looking up their secrets."""

    def __init__(self, reference: str) -> None:
        super().__init__(f"The secret from {reference} was not looked up: the settings were only read.")
