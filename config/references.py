"""Values that stand elsewhere: in an environment variable or in a file of their own."""

import os
import re
import stat
from pathlib import Path
from typing import Any

from config.guarded import could_be_secret_path
from config.part import Surroundings, unusable
from config.secret import Secret

LARGEST_SECRET_FILE = 65_536
NEEDED = '{ env = "NAME" } or { file = "path" }'
# Capital letters only: a token written here by mistake has small ones, and must not come back in a fault.
_VARIABLE = re.compile(r"[A-Z_][A-Z0-9_]{0,99}")


def resolve(raw: Any, around: Surroundings) -> Secret:
    """The secret that a reference leads to. No error repeats what is written or found."""
    match raw:
        case Secret():
            return raw
        case {"env": str() as name} if len(raw) == 1:
            return _from_environment(name, around)
        case {"file": str() as name} if len(raw) == 1:
            return _from_file(name, around)
        case str():
            raise unusable("a text written here (not repeated)", f"a reference, {NEEDED}")
        case _:
            raise unusable("something else", f"a reference, {NEEDED}")


def origin(raw: Any) -> str:
    """Where a value came from, without the value."""
    match raw:
        case {"env": str() as name}:
            return f"the value of the environment variable {name}"
        case {"file": str() as name}:
            return f"the content of the file {name}"
        case _:
            return "a text that is none (not repeated)"


def _from_environment(name: str, around: Surroundings) -> Secret:
    if _VARIABLE.fullmatch(name) is None:
        raise unusable(
            "another text (not repeated)", "the name of a variable in capital letters, digits and underscores"
        )
    if around.environ is None:
        return Secret(None, f"The environment variable {name}")
    found = around.environ.get(name)
    if not found:
        raise unusable(
            "no such variable" if found is None else "an empty one", f"the variable {name} to be set"
        )
    return Secret(found)


def _from_file(name: str, around: Surroundings) -> Secret:
    if could_be_secret_path(name):
        raise unusable("another text (not repeated)", "the path of a file")
    path = around.folder / name
    if around.environ is None:
        return Secret(None, f"The file {path}")
    needed = f"the file {path} with the secret in it"
    try:
        content = _read(path)
        text = content.decode("utf-8")
    except FileNotFoundError:
        raise unusable("no such file", needed) from None
    except UnicodeDecodeError:
        raise unusable("a file that is not UTF-8 text", needed) from None
    except (OSError, ValueError) as error:
        raise unusable(f"a file that cannot be read ({type(error).__name__})", needed) from None
    if len(content) > LARGEST_SECRET_FILE:
        raise unusable(f"a file of more than {LARGEST_SECRET_FILE} bytes", needed)
    text = text.rstrip("\r\n")
    if not text:
        raise unusable("an empty file", needed)
    _warn_if_open(path, around)
    return Secret(text)


def _read(path: Path) -> bytes:
    """Its bytes; opening a pipe that nobody writes to would wait for ever."""
    with open(path, "rb", opener=_without_waiting) as file:
        if not stat.S_ISREG(os.fstat(file.fileno()).st_mode):
            raise OSError(f"{path} is no ordinary file")
        return file.read(LARGEST_SECRET_FILE + 1)


def _without_waiting(path: str, flags: int) -> int:
    return os.open(path, flags | getattr(os, "O_NONBLOCK", 0))


def _warn_if_open(path: Path, around: Surroundings) -> None:
    if os.name != "posix" or not path.stat().st_mode & stat.S_IROTH:
        return
    warning = f"The secret file {path} can be read by everybody on this machine; run: chmod o-r {path}"
    if warning not in around.warnings:
        around.warnings.append(warning)
