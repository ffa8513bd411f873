"""From the settings file to settings, or to all that is wrong with it."""

import re
import tomllib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from config.across import clashes_in
from config.errors import SettingsFaults, SettingsUnreadable
from config.faults import faults_of
from config.part import Surroundings
from config.settings import Sections, Settings

LARGEST_FILE = 10_000_000
_LINE = re.compile(r"\(at line (\d+), column (\d+)\)")


def load_settings(path: Path, environ: Mapping[str, str]) -> Settings:
    """Read the settings file and what it refers to.

    Raises
    ------
    SettingsFaults
        With all that is wrong, and no secret in it.
    """
    return settings_of(_raw(path), path, environ)


def read_settings(path: Path) -> Settings:
    """Read the settings file alone, for commands that need no secret; to reveal one is an error then.

    Raises
    ------
    SettingsFaults
        With all that is wrong with the file.
    """
    return settings_of(_raw(path), path, None)


def settings_of(raw: dict[str, Any], path: Path, environ: Mapping[str, str] | None) -> Settings:
    """Settings from what the file at a path was parsed to; raises as `load_settings` does.

    With `environ` None the secrets stay where they are.
    """
    around = Surroundings(path.absolute().parent, environ, [])
    sections, errors = _validated(raw, around)
    faults = faults_of(errors, clashes_in(raw), raw, path)
    # Raised outside of any handler, so that no traceback carries the values that validation saw.
    if faults or sections is None:
        raise SettingsFaults(path, faults)
    return Settings(
        path=path,
        service=sections.service,
        judgement=sections.judgement,
        model=sections.model,
        sources=sections.sources,
        outlets=sections.outlets,
        warnings=(*around.warnings, *_unheard(sections)),
    )


def _validated(raw: dict[str, Any], around: Surroundings) -> tuple[Sections | None, list[ErrorDetails]]:
    try:
        return Sections.model_validate(raw, context=around), []
    except ValidationError as error:
        return None, error.errors(include_url=False, include_input=False)


def _raw(path: Path) -> dict[str, Any]:
    text = _text(path)
    try:
        return tomllib.loads(text)
    except RecursionError:
        sentence = f"{path} cannot be read: its tables or lists stand too deep in one another."
        failure = SettingsUnreadable(path, "TOML", "lists too deep in one another", sentence)
    except ValueError as error:
        failure = _no_toml(path, str(error))
    raise failure


def _no_toml(path: Path, error: str) -> SettingsUnreadable:
    where = _LINE.search(error)
    line = f"line {where[1]}, column {where[2]}" if where else "its end"
    why = _LINE.sub("", error).replace("(at end of document)", "").strip()
    return SettingsUnreadable(path, "TOML", f"{why} at {line}", f"{path} is no TOML: at {line}: {why}.")


def _text(path: Path) -> str:
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise _unreadable(path, f"it has more than {LARGEST_FILE} bytes")
        return path.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        failure = _missing(path)
    except UnicodeDecodeError:
        failure = _unreadable(path, "it is not UTF-8 text")
    except OSError as error:
        failure = _unreadable(path, error.strerror or type(error).__name__)
    raise failure


def _missing(path: Path) -> SettingsUnreadable:
    sentence = (
        f"There is no settings file {path}. Write a starter file with: knickpoint init; "
        "or name yours with --settings."
    )
    return SettingsUnreadable(path, "a settings file", "no such file", sentence)


def _unreadable(path: Path, why: str) -> SettingsUnreadable:
    return SettingsUnreadable(path, "a readable text file", why, f"{path} cannot be read: {why}.")


def _unheard(sections: Sections) -> Iterator[str]:
    """Streams whose shifts are recorded, but told to nobody."""
    if not sections.outlets:
        yield "There is no outlet: shifts are recorded, and nobody is told. Add an [[outlet]]."
        return
    if any(outlet.slates is None for outlet in sections.outlets):
        return
    heard = {slate for outlet in sections.outlets for slate in outlet.slates or ()}
    for source in sections.sources:
        slates = [
            source.streams.slate,
            *(changes.slate for changes in source.changes.values() if changes.slate),
        ]
        for slate in dict.fromkeys(slates):
            if slate not in heard:
                whose = f'of slate "{slate}"' if slate else "without a slate"
                yield f'Source "{source.name}": no outlet takes the streams {whose}; nobody is told of them.'
