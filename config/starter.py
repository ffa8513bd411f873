"""The commented starter file."""

from importlib.resources import files

STARTER_FILE = "starter.toml"


def starter_text() -> str:
    """The starter file's text. It loads as it stands."""
    return (files("config") / STARTER_FILE).read_text(encoding="utf-8")
