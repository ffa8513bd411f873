"""Whether settings can be used, for people and for machines."""

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import click

from config.errors import Fault, SettingsFaults
from config.secret import reveal
from config.settings import Settings
from config.sources import SqlSource
from service.cli.opening import settings_with_secrets
from service.cli.options import Given
from service.cli.show import say, show_json
from service.sources.sql_engine import enforces_deadline, enforces_read_only
from service.wiring import UnusableThreshold, require_usable_thresholds


@dataclass(frozen=True, slots=True)
class Checked:
    """What was found. `settings` is None where there are faults."""

    place: Path
    settings: Settings | None
    faults: tuple[Fault, ...]
    sentence: str

    @property
    def warnings(self) -> tuple[str, ...]:
        """What is odd, though it can be used."""
        if self.settings is None:
            return ()
        return (*self.settings.warnings, *_trusted_queries(self.settings))


def check(given: Given) -> Checked:
    """Read the settings and gather all that is wrong with them."""
    try:
        settings = settings_with_secrets(given)
        require_usable_thresholds(settings)
        return Checked(given.settings, settings, (), "")
    except SettingsFaults as error:
        return Checked(given.settings, None, error.faults, str(error))
    except UnusableThreshold as error:
        fault = Fault(
            given.settings,
            f"{error.where} . judgement . threshold",
            str(error.threshold),
            f"a threshold above {error.floor:.3f}",
        )
        return Checked(given.settings, None, (fault,), str(error))


def show_checked(checked: Checked, as_json: bool) -> None:
    """Faults go to standard error for people, and stand in the one document for machines."""
    if as_json:
        show_json(_json(checked))
    elif checked.settings is None:
        click.echo(checked.sentence, err=True)
    else:
        for warning in checked.warnings:
            say(f"Note: {warning}")
        say(_good(checked.place, checked.settings))


def _trusted_queries(settings: Settings) -> Iterator[str]:
    """Queries of which the database itself does not see to it that they only read, or end in time."""
    for source in settings.sources:
        if not isinstance(source, SqlSource):
            continue
        address = reveal(source.address)
        if not enforces_read_only(address):
            yield (
                f'Source "{source.name}": this kind of database does not keep the query from writing; what '
                "it writes is rolled back. Give it a login that may only read."
            )
        if not enforces_deadline(address):
            yield f'Source "{source.name}": its driver does not end a query that hangs at the deadline.'


def _good(place: Path, settings: Settings) -> str:
    sources, outlets = len(settings.sources), len(settings.outlets)
    return (
        f"{place} can be used: {sources} {'source' if sources == 1 else 'sources'}, "
        f"{outlets} {'outlet' if outlets == 1 else 'outlets'}; database {settings.service.database}."
    )


def _json(checked: Checked) -> dict[str, object]:
    names = ("key", "got", "needed", "nearest")
    return {
        "settings": str(checked.place),
        "good": checked.settings is not None,
        "faults": [{name: getattr(fault, name) for name in names} for fault in checked.faults],
        "warnings": checked.warnings,
    }
