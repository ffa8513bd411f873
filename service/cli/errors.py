"""What can be wrong with a command. Each error writes its own sentence."""

from collections.abc import Iterable


class CommandError(Exception):
    """Base of all errors of the command line."""


class WrongUse(CommandError):
    """Options that do not go together, or a value that an option cannot have."""


class UnknownName(CommandError):
    """Nothing has this name."""

    def __init__(self, kind: str, name: str, known: Iterable[str]) -> None:
        self.kind, self.name, self.known = kind, name, tuple(known)
        there = ", ".join(self.known[:20]) or "none"
        super().__init__(f'There is no {kind} "{name}". There is: {there}.')


class AlreadyThere(CommandError):
    """A file that would have to be overwritten."""

    def __init__(self, path: object) -> None:
        self.path = path
        super().__init__(
            f"{path} is there already and is left as it is. Give another path, or move it away first."
        )


class MixedInstallation(CommandError):
    """Another distribution's package stands where one of ours should."""

    def __init__(self, package: str, found: str) -> None:
        self.package, self.found = package, found
        super().__init__(
            f'The package "{package}" that Python finds ({found}) is not knickpoint\'s. '
            "Install knickpoint into an environment of its own, and start it as the command knickpoint."
        )
