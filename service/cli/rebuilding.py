"""Rebuilding, with a bar while it goes on."""

from service.cli.opening import reading, require_stream
from service.cli.options import Given
from service.cli.show import Cell, progress
from service.rebuild import Rebuilt, rebuild_stream
from storage.streams import list_streams

REBUILT_COLUMNS = ("stream", "counts folded", "new shifts")


def rebuild_with_progress(given: Given, names: tuple[str, ...]) -> tuple[Rebuilt, ...]:
    """Rebuild the streams of these ids, or all, one after the other.

    Raises
    ------
    UnknownName
        If there is none of an id; then nothing was rebuilt.
    """
    with reading(given) as conn:
        wanted = [require_stream(conn, name) for name in names] or list(list_streams(conn))
    done: list[Rebuilt] = []
    with progress("Rebuilding", len(wanted)) as step:
        for stream in wanted:
            done.append(rebuild_stream(given.settings, stream.id))
            step(1)
    return tuple(done)


def rebuilt_cells(one: Rebuilt) -> list[Cell]:
    """A line of `rebuild`."""
    folded = "none: the settings no longer describe it" if one.folded is None else one.folded
    return [one.stream_id, folded, one.new_shifts]
