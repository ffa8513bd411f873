"""Options that several commands share. Imports click and nothing heavy."""

import datetime
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any, TypeVar

import click

SETTINGS_VARIABLE = "KNICKPOINT_SETTINGS"
MOMENT = "a day or an instant of ISO 8601, such as 2026-03-02 or 2026-03-02T14:00+01:00"

Decorated = TypeVar("Decorated", bound=Callable[..., Any])


@dataclass(frozen=True, slots=True)
class Given:
    """What was given before the command."""

    settings: Path


def settings_option(function: Decorated) -> Decorated:
    """`--settings FILE` after the command as well as before it."""
    return click.option(
        "--settings",
        type=click.Path(path_type=Path),
        metavar="FILE",
        expose_value=False,
        is_eager=True,
        callback=_take_settings,
        help="The settings file; may also stand before the command.",
    )(function)


def json_option(function: Decorated) -> Decorated:
    """`--json`: for machines."""
    return click.option("--json", "as_json", is_flag=True, help="One JSON document instead of a table.")(
        function
    )


def limit_option(default: int) -> Callable[[Decorated], Decorated]:
    """`--limit N`: the newest N."""
    return click.option(
        "--limit",
        type=click.IntRange(1, 100_000),
        default=default,
        show_default=True,
        help="At most so many, the newest.",
    )


class MomentType(click.ParamType[datetime.date]):
    """A day or an instant of ISO 8601."""

    name = "moment"

    def convert(
        self, value: object, param: click.Parameter | None, ctx: click.Context | None
    ) -> datetime.date | datetime.datetime:
        moment = _moment(str(value).strip())
        if moment is None:
            self.fail(f"needed is {MOMENT}; got {value!r}.", param, ctx)
        return moment


def _moment(text: str) -> datetime.date | datetime.datetime | None:
    for read in (datetime.date.fromisoformat, datetime.datetime.fromisoformat):
        try:
            return read(text)
        except ValueError:
            continue
    return None


def _take_settings(ctx: click.Context, _param: click.Parameter, value: Path | None) -> None:
    if value is not None:
        ctx.obj = Given(value)
