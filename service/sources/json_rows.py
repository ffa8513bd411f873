"""The rows of JSON pages, by JSONPath."""

from collections.abc import Iterable

from jsonpath import JSONPath, JSONPathError

from service.sources.document import KeptOut, Row
from service.sources.errors import SourceUnreadable, UnusablePath
from service.sources.json_path import compile_path, fits, nodes
from service.sources.plans import JsonPlan
from service.sources.rows import RowRules, understand
from service.sources.values import Several

# A title may be wanting everywhere; any other field that no row has was looked for in the wrong place.
FIELDS_SOMEWHERE = frozenset({"at", "count", "split", "release", "exposure"})


def rows_of(plan: JsonPlan, pages: list[object], rules: RowRules) -> list[Row | KeptOut]:
    """All rows of all pages, understood or kept out, numbered through.

    Raises
    ------
    SourceUnreadable
        If a path is wrong for this document, or there are too many rows.
    """
    try:
        rows = [row for page in pages for row in _rows_of_page(plan, page)]
        if len(rows) > plan.bounds.most_rows:
            raise SourceUnreadable(plan.name, f"it has more than the {plan.bounds.most_rows} rows allowed.")
        values = _values(plan, rows)
    except UnusablePath as error:
        why = str(error)
    except JSONPathError as error:
        why = f"a JSONPath cannot be followed in it: {error.message}."
    else:
        return [understand(one, number, rules) for number, one in enumerate(values, start=1)]
    raise SourceUnreadable(plan.name, why)


def _rows_of_page(plan: JsonPlan, page: object) -> list[object]:
    path = compile_path(plan.rows)
    found = nodes(path, page)
    if not found and not fits(path, page):
        raise SourceUnreadable(
            plan.name, f"{plan.rows} fits nothing in its answer, which is {_kind(page)}; correct `rows`."
        )
    return found


def _values(plan: JsonPlan, rows: list[object]) -> list[dict[str, object]]:
    paths = {name: compile_path(place) for name, place in plan.fields.named()}
    found = [{name: nodes(path, row) for name, path in paths.items()} for row in rows]
    for name in FIELDS_SOMEWHERE & paths.keys():
        if found and not any(row[name] for row in found):
            raise SourceUnreadable(plan.name, _nowhere(plan, name, paths[name], rows))
    return [{name: _one(values) for name, values in row.items()} for row in found]


def _one(values: list[object]) -> object:
    """A field's value; nothing where the row lacks it."""
    if len(values) > 1:
        return Several(len(values))
    return values[0] if values else None


def _nowhere(plan: JsonPlan, name: str, path: JSONPath, rows: list[object]) -> str:
    hint = "correct its path"
    if all(isinstance(row, list) for row in rows):
        hint = f"each row is a list, perhaps `rows` should be {plan.rows}[*]"
    return f"none of its {len(rows)} rows has `{name}` at {path}; {hint}. {_kind_of_first(rows)}"


def _kind_of_first(rows: Iterable[object]) -> str:
    return f"The first row is {_kind(next(iter(rows)))}."


def _kind(value: object) -> str:
    match value:
        case dict():
            names = ", ".join(str(name)[:40] for name in list(value)[:12])
            return f"an object with {names}" if names else "an empty object"
        case list():
            return f"a list of {len(value)}"
        case None:
            return "null"
        case _:
            return "a single value"
