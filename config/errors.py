"""What can be wrong with the settings, said in sentences."""

from dataclasses import dataclass
from pathlib import Path


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing that is wrong.

    Attributes
    ----------
    file : Path
        The settings file.
    key : str
        Where it stands, such as `source[2] "plays" . fields . count`; blocks are counted from 1 as a reader
        counts them. Empty if the file as a whole is meant.
    got : str
        What stands there. A secret is described, never repeated.
    needed : str
        What should stand there.
    nearest : str or None
        The known word that an unknown one comes nearest to.
    """

    file: Path
    key: str
    got: str
    needed: str
    nearest: str | None = None

    def __str__(self) -> str:
        place = f"{self.file}: {self.key}" if self.key else str(self.file)
        hint = f' Did you mean "{self.nearest}"?' if self.nearest else ""
        return f"{place}: needed {self.needed}; got {self.got}.{hint}"


class SettingsError(Exception):
    """The settings cannot be used. Its text is one sentence or a list of faults, and holds no secret."""


class SecretNotRead(SettingsError):
    """A secret was asked for where the settings had been read without looking up their secrets."""

    def __init__(self, origin: str) -> None:
        self.origin = origin
        super().__init__(f"{origin} was not looked up: the settings were read without their secrets.")


class SettingsFaults(SettingsError):
    """All that is wrong with a settings file, at once."""

    def __init__(self, path: Path, faults: tuple[Fault, ...]) -> None:
        self.path = path
        self.faults = faults
        super().__init__(path, faults)

    def __str__(self) -> str:
        return "\n".join(str(fault) for fault in self.faults)


class SettingsUnreadable(SettingsFaults):
    """The settings file cannot be read at all, or is no TOML: one fault, said as a sentence."""

    def __init__(self, path: Path, needed: str, got: str, sentence: str) -> None:
        self.sentence = sentence
        super().__init__(path, (Fault(path, "", got, needed),))

    def __str__(self) -> str:
        return self.sentence
