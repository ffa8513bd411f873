"""Named columns, of a CSV header or of a query's result."""

from collections.abc import Sequence

from service.sources.errors import SourceUnreadable
from service.sources.plans import FieldPlan

MOST_NAMED = 20
LONGEST_NAME = 40


def columns_of(source: str, fields: FieldPlan, header: Sequence[str]) -> tuple[tuple[str, int], ...]:
    """For each field that was asked for, the place of its column.

    Raises
    ------
    SourceUnreadable
        If a column is not there, or there twice.
    """
    asked = fields.named()
    missing = [column for _, column in asked if column not in header]
    if missing:
        raise SourceUnreadable(source, f"it has no column {_list(missing)}; its columns are {_list(header)}.")
    twice = [column for _, column in asked if list(header).count(column) > 1]
    if twice:
        raise SourceUnreadable(source, f"it has more than one column {_list(twice)}; give each its own name.")
    return tuple((name, list(header).index(column)) for name, column in asked)


def _list(names: Sequence[str]) -> str:
    quoted = [f'"{name[:LONGEST_NAME]}"' for name in names[:MOST_NAMED]]
    more = [f"{len(names) - MOST_NAMED} more"] if len(names) > MOST_NAMED else []
    return ", ".join([*quoted, *more])
