"""The starter file loads as it stands and with its examples taken in, and the defaults it shows hold."""

import re
from collections.abc import Callable
from pathlib import Path

import pytest

from config.judging import Judgement, Model
from config.outlets import WebhookOutlet
from config.part import Part
from config.settings import Service, Settings
from config.sources import CsvSource, JsonFields, JsonSource, SqlSource
from config.starter import starter_text
from config.streams import stream_settings
from config.streams_part import CalendarStreams, ReleaseStreams

Load = Callable[..., Settings]

PARTS = (
    Service,
    Judgement,
    Model,
    WebhookOutlet,
    JsonSource,
    CsvSource,
    SqlSource,
    JsonFields,
    CalendarStreams,
    ReleaseStreams,
)
SETTING = re.compile(r"^[# ]*([a-z_]+) = ")
TABLE = re.compile(r"^[# ]*\[+([a-z.]+)")
TAKEN_OUT = re.compile(r"^( *)# ( *)(?=\[|[a-z_]+ = )", re.MULTILINE)
DEFAULT = re.compile(
    r"^( *)# (?=(?:database|stop_within|threshold|window|lasting|fewest_counts|mean_gap|gap_shape|"
    r"smallest_shift|one_off_share|delimiter|encoding|deadline|largest_body|most_rows|settling) = )",
    re.MULTILINE,
)
DEFAULTS = 16
ENVIRON = {
    "DESK_ADDRESS": "https://desk.lampwick.example/in",
    "DESK_SECRET": "whsec_" + "A" * 32,
    "LETTERS_DATABASE": "sqlite:///letters.sqlite",
}


def test_it_loads_as_it_stands(load: Load) -> None:
    settings = load(starter_text())
    found = stream_settings(settings, settings.sources[0], "Evening Walks")
    assert found is not None
    assert (found.id, found.title, found.slate) == ("plays/Evening Walks", "Evening Walks", "Lampwick House")
    assert len(settings.warnings) == 1
    assert settings.warnings[0].startswith("There is no outlet")


def test_it_says_that_its_house_is_invented() -> None:
    assert "invented" in starter_text().splitlines()[0]


@pytest.mark.parametrize("part", PARTS, ids=lambda part: part.__name__)
def test_it_names_every_setting(part: type[Part]) -> None:
    lines = starter_text().splitlines()
    named = {match[1] for line in lines if (match := SETTING.match(line))}
    named |= {match[1].strip(".").split(".")[-1] for line in lines if (match := TABLE.match(line))}
    assert {field.alias or name for name, field in part.model_fields.items()} - named == set()


def test_the_defaults_that_it_shows_are_those_that_hold(load: Load) -> None:
    # What follows are examples of changes, of outlets and of other kinds of sources.
    text = starter_text().partition("  # What differs for this source's streams.")[0]
    taken_in, count = DEFAULT.subn(r"\1", text)
    shown, plain = load(taken_in), load(text)
    assert count == DEFAULTS
    assert shown == plain


def test_the_outlet_and_the_other_sources_that_it_shows_load(load: Load, tmp_path: Path) -> None:
    before, mark, after = starter_text().partition("# Take the # away from these lines")
    (tmp_path / "downloads.secret").write_text("Bearer invented\n")
    (tmp_path / "downloads.secret").chmod(0o600)
    settings = load(before + mark + TAKEN_OUT.sub(r"\1\2", after), ENVIRON)
    assert [type(source) for source in settings.sources] == [CsvSource, JsonSource, SqlSource]
    assert [outlet.name for outlet in settings.outlets] == ["desk"]
    assert settings.outlets[0].deadline == WebhookOutlet.model_fields["deadline"].default
    assert settings.warnings == (
        'Source "letters": no outlet takes the streams without a slate; nobody is told of them.',
    )


def test_the_changes_that_it_shows_load(load: Load) -> None:
    before, mark, after = starter_text().partition("  # What differs for this source's streams.")
    changes, _, _ = after.partition("# Where alerts go.")
    settings = load(before + mark + TAKEN_OUT.sub(r"\1\2", changes))
    found = stream_settings(settings, settings.sources[0], "Evening Walks")
    assert found is not None
    assert (found.title, found.slate) == ("Evening Walks (daily)", "Lampwick Mornings")
    assert (found.judgement.threshold, found.judgement.lasting, found.model.mean_gap) == (0.95, 5, 300.0)
