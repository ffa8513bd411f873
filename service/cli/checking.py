"""Whether settings can be used, for people and for machines."""

from dataclasses import dataclass
from pathlib import Path

import click

from config.errors import Fault, SettingsFaults
from config.settings import Settings
from service.cli.opening import settings_with_secrets
from service.cli.options import Given
from service.cli.show import say, show_json
from service.wiring import require_usable_thresholds


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
        return () if self.settings is None else self.settings.warnings


def check(given: Given) -> Checked:
    """Read the settings and gather all that is wrong with them."""
    try:
        settings = settings_with_secrets(given)
        require_usable_thresholds(settings)
        return Checked(given.settings, settings, (), "")
    except SettingsFaults as error:
        return Checked(given.settings, None, error.faults, str(error))


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
