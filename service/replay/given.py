"""The file that was given: a path, or standard input under the name "-"."""

import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from service.sources.errors import SourceUnreadable
from service.sources.plans import Bounds

STANDARD_INPUT = Path("-")
NAME = "standard input"


@contextmanager
def file_given(path: Path) -> Iterator[Path]:
    """The path; what comes on standard input stands in a file of its own meanwhile.

    Raises
    ------
    SourceUnreadable
        If more comes than a source may have.
    """
    if path != STANDARD_INPUT:
        yield path
        return
    largest = Bounds().largest_body
    body = sys.stdin.buffer.read(largest + 1)
    if len(body) > largest:
        raise SourceUnreadable(NAME, f"it has more than the {largest} bytes that are allowed.")
    with tempfile.TemporaryDirectory(prefix="knickpoint-") as folder:
        file = Path(folder) / NAME
        file.write_bytes(body)
        yield file
