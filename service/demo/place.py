"""The demo's folder: a settings file as a person would write it, and the two secrets beside it."""

import base64
import os
import tempfile
from pathlib import Path

from service.demo.story import HOUSE, UNIT

SETTINGS, LOG = "knickpoint.toml", "daemon.log"
ADDRESS, SECRET = "desk-address.secret", "desk-signing.secret"
SOURCE = "counts"
EVERY_HOURS = 12

TEXT = f"""\
# {HOUSE} is invented, and so are its shows and all its counts.

[service]
database = "knickpoint.sqlite"

[[source]]
name = "{SOURCE}"
kind = "json"
address = "COUNTING"
rows = "$.counts[*]"
every = "{EVERY_HOURS}h"

  [source.fields]
  at = "$.day"
  count = "$.{UNIT}"
  split = "$.show"

  [source.streams]
  shape = "calendar"
  interval = "day"
  absent = "missing"
  slate = "{HOUSE}"

[[outlet]]
name = "desk"
kind = "webhook"
address = {{ file = "{ADDRESS}" }}
secret = {{ file = "{SECRET}" }}
"""


def make_folder(folder: Path | None) -> Path:
    """The folder to write to: a new temporary one unless one is named.

    Raises
    ------
    FileExistsError
        If a settings file is there already: it, and the database beside it, are left as they are.
    """
    if folder is None:
        return Path(tempfile.mkdtemp(prefix="knickpoint-demo-"))
    folder.mkdir(parents=True, exist_ok=True)
    if (folder / SETTINGS).exists():
        raise FileExistsError(
            f"The demo needs a folder without a {SETTINGS}, and {folder} holds one: name another folder, "
            "or none at all."
        )
    return folder.absolute()


def new_secret() -> str:
    """A signing secret that nobody else has."""
    return "whsec_" + base64.b64encode(os.urandom(32)).decode("ascii")


def write_settings(folder: Path, *, counting: str, desk: str, secret: str) -> Path:
    """Write the settings file and its secrets; gives the path of the former."""
    _write_secret(folder / ADDRESS, desk)
    _write_secret(folder / SECRET, secret)
    path = folder / SETTINGS
    path.write_text(TEXT.replace("COUNTING", counting), encoding="utf-8")
    return path


def stream_id(show: str) -> str:
    """The id of a show's stream under these settings."""
    return f"{SOURCE}/{show}"


def _write_secret(path: Path, text: str) -> None:
    with open(path, "w", encoding="utf-8", opener=_only_for_its_owner) as file:
        file.write(text + "\n")


def _only_for_its_owner(path: str, flags: int) -> int:
    return os.open(path, flags, 0o600)
