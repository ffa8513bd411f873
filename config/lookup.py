"""Where secrets are found: in variables and in files."""

import os
import stat
from collections.abc import Mapping
from pathlib import Path

from config.secret import Found, LookUp, Reference, SecretFile

LARGEST_SECRET = 65_536


class NotThere(ValueError):
    """Nothing usable stands where a reference points: what was needed there and what was got."""

    def __init__(self, expected: str, got: str) -> None:
        self.expected, self.got = expected, got
        super().__init__(f"expected {expected}; got {got}")


def look_up_in(environ: Mapping[str, str]) -> LookUp:
    """A look-up in these variables and in the file system."""

    def look_up(reference: Reference) -> Found:
        if isinstance(reference, SecretFile):
            return _in_file(reference)
        value = environ.get(reference.name)
        if value is None:
            raise NotThere(f"{reference} to be set", "no such variable")
        return Found(_required(value, f"{reference} to hold the secret"))

    return look_up


def look_nowhere(_reference: Reference) -> None:
    """Leaves every secret unread, for commands that need none."""


def _in_file(reference: SecretFile) -> Found:
    needed = f"{reference} to hold the secret"
    try:
        content, mode = _content(reference.path)
    except OSError as error:
        raise NotThere(needed, (error.strerror or type(error).__name__).lower()) from None
    if not stat.S_ISREG(mode):
        raise NotThere(needed, "something that is no ordinary file")
    if len(content) > LARGEST_SECRET:
        raise NotThere(needed, f"a file of more than {LARGEST_SECRET} bytes")
    try:
        text = content.decode("utf-8")
    except UnicodeDecodeError:
        text = None
    if text is None:
        raise NotThere(needed, "bytes that are not UTF-8")
    return Found(_required(_without_newline(text), needed), bool(mode & stat.S_IROTH))


def _content(path: Path) -> tuple[bytes, int]:
    """The file's bytes and mode; a pipe that nobody writes to must not hold the program up."""
    descriptor = os.open(path, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0))
    with os.fdopen(descriptor, "rb") as file:
        mode = os.fstat(descriptor).st_mode
        return (file.read(LARGEST_SECRET + 1) if stat.S_ISREG(mode) else b""), mode


def _without_newline(text: str) -> str:
    return text.removesuffix("\n").removesuffix("\r")


def _required(value: str, needed: str) -> str:
    if not value.strip():
        raise NotThere(needed, "nothing: it is empty")
    return value
