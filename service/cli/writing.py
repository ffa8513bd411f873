"""Files that a command writes."""

from pathlib import Path

from service.cli.errors import AlreadyThere


def write_new(path: Path, text: str) -> None:
    """Write a file that is not there yet.

    Raises
    ------
    AlreadyThere
        If it is; it stays as it was.
    """
    try:
        with path.open("x", encoding="utf-8", newline="\n") as file:
            file.write(text)
    except FileExistsError:
        raise AlreadyThere(path) from None
