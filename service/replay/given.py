"""The file that was given: a path, or standard input under the name "-"."""

import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from service.sources.plans import Bounds

STANDARD_INPUT = Path("-")


@contextmanager
def file_given(path: Path) -> Iterator[Path]:
    """The path; what comes on standard input stands in a file of its own meanwhile."""
    if path != STANDARD_INPUT:
        yield path
        return
    with tempfile.TemporaryDirectory(prefix="knickpoint-") as folder:
        file = Path(folder) / "standard input"
        # One byte more than is allowed, so that the reader of the file says that it is too long.
        file.write_bytes(sys.stdin.buffer.read(Bounds().largest_body + 1))
        yield file
