"""From the raw values of a row to a count that can be used, or to the reason why not. Pure."""

from collections import defaultdict
from collections.abc import Callable, Hashable, Iterable, Mapping
from dataclasses import dataclass, field, replace
from zoneinfo import ZoneInfo

from service.sources.document import KeptOut, Row
from service.sources.instants import read_at
from service.sources.numbers import read_count, read_exposure
from service.sources.values import UnusableValue, read_identity, read_title, shown

LONGEST_TEXT = 120
HIDDEN = "[hidden]"


@dataclass(frozen=True, slots=True)
class RowRules:
    """How rows of one source are read: the zone of date-times without one, and texts never to be shown."""

    zone: ZoneInfo
    secrets: tuple[str, ...] = field(default=(), repr=False)


@dataclass(frozen=True, slots=True)
class Sifted:
    """Rows that remain, and those that were kept out."""

    rows: tuple[Row, ...]
    kept_out: tuple[KeptOut, ...]


def understand(values: Mapping[str, object], number: int, rules: RowRules) -> Row | KeptOut:
    """One row from its raw values by field name.

    A field that was not asked for has no key; one that is absent from this row is None.
    """
    try:
        return Row(
            split=_identity(values, "split"),
            at=read_at(values["at"], rules.zone),
            count=read_count(values["count"]),
            release=_identity(values, "release"),
            title=read_title(values.get("title")),
            exposure=read_exposure(values.get("exposure")),
            number=number,
        )
    except UnusableValue as error:
        # Secrets go before anything is cut: half of one would no longer be known as one.
        hidden = UnusableValue(error.name, error.needed, hide_in(error.got, rules.secrets))
        return replace(keep_out(values, number, str(hidden), rules), place=_place(values, number, rules))


def keep_out(values: Mapping[str, object], number: int, why: str, rules: RowRules) -> KeptOut:
    """The row as kept out, its text cut short and free of the source's secrets."""
    clean = {name: hide_in(value, rules.secrets) for name, value in values.items()}
    return KeptOut(number, why, cut(_text(clean)))


def hide_in(value: object, secrets: Iterable[str]) -> object:
    """A raw value without those secrets."""
    return hide(value, secrets) if isinstance(value, str) else value


def hide(text: str, secrets: Iterable[str]) -> str:
    """The text without those secrets, should a source have given back what it was sent."""
    for secret in sorted(filter(None, secrets), key=len, reverse=True):
        text = text.replace(secret, HIDDEN)
    return text


def cut(text: str) -> str:
    """At most `LONGEST_TEXT` characters, saying that there was more."""
    return text if len(text) <= LONGEST_TEXT else text[: LONGEST_TEXT - 1] + "…"


def keep_out_conflicts(rows: Iterable[Row], key_of: Callable[[Row], Hashable]) -> Sifted:
    """Keep out all rows of a key that comes with different values; the same row twice counts once."""
    by_key: dict[Hashable, list[Row]] = defaultdict(list)
    for row in rows:
        by_key[key_of(row)].append(row)
    used = [group[0] for group in by_key.values() if len({_value(row) for row in group}) == 1]
    out = [
        KeptOut(row.number, _conflict(row, group), cut(_text(_fields(row))), replace(row, count=None))
        for group in by_key.values()
        if len({_value(row) for row in group}) > 1
        for row in group
    ]
    return Sifted(
        tuple(sorted(used, key=lambda row: row.number)), tuple(sorted(out, key=lambda one: one.row))
    )


def _place(values: Mapping[str, object], number: int, rules: RowRules) -> Row | None:
    try:
        return Row(_identity(values, "split"), read_at(values["at"], rules.zone), None, number=number)
    except UnusableValue:
        return None


def _identity(values: Mapping[str, object], name: str) -> str | None:
    return read_identity(values[name], name) if name in values else None


def _value(row: Row) -> Hashable:
    """What must agree between rows of one key; when a release came out is part of what it says."""
    return (row.count, row.exposure, row.at if row.release is not None else None)


def _conflict(row: Row, group: list[Row]) -> str:
    others = ", ".join(str(other.number) for other in group[:6] if other is not row)
    return f"its key comes again with other values (row {others}); needed is one row a key."


def _fields(row: Row) -> dict[str, object]:
    named = {"at": row.at.isoformat(), "count": row.count, "split": row.split, "release": row.release}
    return {name: value for name, value in named.items() if value is not None or name == "count"}


def _text(values: Mapping[str, object]) -> str:
    return ", ".join(f"{name}: {shown(value)}" for name, value in values.items())
