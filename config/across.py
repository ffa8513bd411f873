"""Checks across fields. They read the raw file, so that they are made even where other values are faulty."""

import json
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any

from config.addresses import is_login
from config.calendar_words import plain_interval
from config.judging import Judgement, Model
from config.references import NEEDED
from config.words import title_fields

Loc = tuple[str | int, ...]


@dataclass(frozen=True, slots=True)
class Clash:
    """Something that does not go together with something else."""

    loc: Loc
    got: str
    needed: str
    nearest: str | None = None


def clashes_in(raw: dict[str, Any]) -> Iterator[Clash]:
    """All that does not go together in a file."""
    yield from _twice(raw, "source")
    yield from _twice(raw, "outlet")
    yield from _numbers(raw, (), [])
    for loc, source in blocks(raw, "source"):
        yield from _places(source, loc)
        yield from _logins(source, loc)
        yield from _fields(source, loc)
        yield from _left_out(source, loc)
        yield from _anchor(source, loc)
        yield from _numbers_below(raw, source, loc)
    yield from _slates(raw)


def blocks(raw: dict[str, Any], key: str) -> Iterator[tuple[Loc, dict[str, Any]]]:
    """The tables of a list, each with its place; whatever else stands there is left to validation."""
    found = raw.get(key)
    for place, block in enumerate(found if isinstance(found, list) else ()):
        if isinstance(block, dict):
            yield (key, place), block


def table(raw: Any, *keys: str) -> dict[str, Any]:
    """The table at some keys; an empty one if there is none."""
    for key in keys:
        raw = raw.get(key) if isinstance(raw, dict) else None
    return raw if isinstance(raw, dict) else {}


def _twice(raw: dict[str, Any], key: str) -> Iterator[Clash]:
    seen: set[str] = set()
    for loc, block in blocks(raw, key):
        name = block.get("name")
        if isinstance(name, str) and name in seen:
            yield Clash((*loc, "name"), "the name of an earlier one", f"a name that no other {key} has")
        elif isinstance(name, str):
            seen.add(name)


def _places(source: dict[str, Any], loc: Loc) -> Iterator[Clash]:
    if source.get("kind") != "csv":
        return
    if "path" in source and "address" in source:
        yield Clash((*loc, "path"), "both", "either a path or an address")
    if "path" not in source and "address" not in source:
        yield Clash((*loc, "path"), "neither", "either a path or an address")
    if "headers" in source and "address" not in source:
        yield Clash((*loc, "headers"), "headers without an address", "an address to send them to")


def _logins(source: dict[str, Any], loc: Loc) -> Iterator[Clash]:
    for name, value in table(source, "headers").items():
        if isinstance(value, str) and is_login(name):
            yield Clash(
                (*loc, "headers", name), "a text written here (not repeated)", f"a reference, {NEEDED}"
            )


def _fields(source: dict[str, Any], loc: Loc) -> Iterator[Clash]:
    fields, streams = table(source, "fields"), table(source, "streams")
    if streams.get("shape") == "release" and "release" not in fields:
        yield Clash(
            (*loc, "fields", "release"), "nothing", 'a place of the release\'s id, for shape = "release"'
        )
    if "split" in fields:
        return
    needed = "fields . split, which says whose a row is"
    if source.get("leave_out"):
        yield Clash((*loc, "leave_out"), "split values without a split", needed)
    if source.get("stream"):
        yield Clash((*loc, "stream"), "split values without a split", needed)
    if "split" in title_fields(streams.get("title")):
        yield Clash((*loc, "streams", "title"), "{split} without a split", needed)


def _left_out(source: dict[str, Any], loc: Loc) -> Iterator[Clash]:
    left_out = source.get("leave_out")
    for value in table(source, "stream"):
        if isinstance(left_out, list) and value in left_out:
            yield Clash((*loc, "stream", value), "one of leave_out", "a split value that is not left out")


def _anchor(source: dict[str, Any], loc: Loc) -> Iterator[Clash]:
    streams = table(source, "streams")
    interval = streams.get("interval")
    plain = plain_interval(interval) if isinstance(interval, str) else None
    if "anchor" in streams and plain and not plain.endswith("days"):
        got = f'an anchor for interval = "{plain}"'
        yield Clash((*loc, "streams", "anchor"), got, 'none, or an interval such as "14 days"')


def _numbers_below(raw: dict[str, Any], source: dict[str, Any], loc: Loc) -> Iterator[Clash]:
    streams = table(source, "streams")
    yield from _numbers(streams, (*loc, "streams"), [raw])
    for value, changes in table(source, "stream").items():
        yield from _numbers(changes, (*loc, "stream", value), [raw, streams])


def _numbers(here: Any, loc: Loc, above: list[dict[str, Any]]) -> Iterator[Clash]:
    """What is stated here must fit what holds here, much of it stated further up."""
    judgement, model = table(here, "judgement"), table(here, "model")
    lasting = _held("judgement", "lasting", [*above, here], Judgement().lasting)
    window = _held("judgement", "window", [*above, here], Judgement().window)
    if lasting and window and lasting > window and {"lasting", "window"} & set(judgement):
        key = "lasting" if "lasting" in judgement else "window"
        got = f"lasting {lasting} with window {window}"
        yield Clash((*loc, "judgement", key), got, "lasting to be at most the window")
    shape = _held("model", "gap_shape", [*above, here], Model().gap_shape)
    mean = _held("model", "mean_gap", [*above, here], Model().mean_gap)
    if shape and mean and shape > mean and {"gap_shape", "mean_gap"} & set(model):
        key = "gap_shape" if "gap_shape" in model else "mean_gap"
        got = f"gap_shape {shape} with mean_gap {mean}"
        yield Clash((*loc, "model", key), got, "gap_shape to be at most mean_gap")


def _held(section: str, key: str, levels: list[Any], default: float) -> float | None:
    """The value that holds; None where the one that does is no number."""
    held: Any = default
    for level in levels:
        held = table(level, section).get(key, held)
    return held if isinstance(held, int | float) and not isinstance(held, bool) else None


def slates_of(raw: dict[str, Any]) -> set[str]:
    """All slates that a source names."""
    sources = [source for _, source in blocks(raw, "source")]
    templates = [table(source, "streams") for source in sources]
    single = [changes for source in sources for changes in table(source, "stream").values()]
    return {slate for part in [*templates, *single] if isinstance(slate := table(part).get("slate"), str)}


def _slates(raw: dict[str, Any]) -> Iterator[Clash]:
    known = sorted(slates_of(raw))
    needed = f"a slate that a source names: {', '.join(known) or 'there is none'}"
    for loc, outlet in blocks(raw, "outlet"):
        for place, slate in enumerate(_texts(outlet.get("slates"))):
            if slate not in known:
                near = get_close_matches(slate, known, n=1)
                yield Clash(
                    (*loc, "slates", place),
                    json.dumps(slate[:60], ensure_ascii=not slate.isprintable()),
                    needed,
                    near[0] if near else None,
                )


def _texts(raw: Any) -> Iterable[str]:
    return raw if isinstance(raw, list) and all(isinstance(text, str) for text in raw) else ()
