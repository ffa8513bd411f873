"""The alert as JSON, against its published schema."""

import datetime
import json
import math
from dataclasses import replace
from pathlib import Path

import pytest
from pydantic import TypeAdapter, ValidationError

import service.tell
from detectors.posterior import Quantiles
from service.outlets.trial import Trial, trial_body
from service.tell.alert_body import Alert, alert_body
from service.tell.alert_schema import SCHEMA_FILE, schema_text
from service.tell.story import ShiftStory
from service.tell.words import CAUTION

COMPOSED = datetime.datetime(
    2026, 3, 23, 7, 0, 5, 123456, tzinfo=datetime.timezone(datetime.timedelta(hours=1))
)


def body(story: ShiftStory) -> bytes:
    return alert_body(story, "msg_1", COMPOSED)


def test_the_whole_alert(story: ShiftStory) -> None:
    assert json.loads(body(story)) == {
        "type": "shift.emerging",
        "schema": 1,
        "id": "msg_1",
        "composed": "2026-03-23T06:00:05Z",
        "sentence": "Evening Walks: the filtered level fell by about 39 %, from about 1,050 to about 640 "
        "counts per week, most probably from 2026-03-02 (90 %: between 2026-02-23 and 2026-03-09); "
        "probability of a recent shift 0.96.",
        "caution": CAUTION,
        "late": False,
        "stream": {
            "id": "walks",
            "title": "Evening Walks",
            "slate": "house",
            "shape": "calendar",
            "unit": "week",
        },
        "shift": {"id": "shift_1", "state": "emerging", "announced": "2026-03-23T06:00:00Z"},
        "figures": {
            "level_before": {"low": 1010.0, "mid": 1047.0, "high": 1085.0, "kind": "filtered"},
            "level_after": {"low": 590.0, "mid": 636.0, "high": 690.0, "kind": "filtered"},
            "recent_shift_probability": 0.9634,
            "start": {"key": "2026-03-02", "at": "2026-03-02", "title": None},
            "region": [
                {"key": "2026-02-23", "at": "2026-02-23", "title": None},
                {"key": "2026-03-02", "at": "2026-03-02", "title": None},
                {"key": "2026-03-09", "at": "2026-03-09", "title": None},
            ],
            "region_probability": 0.9,
            "announced": {"key": "2026-03-16", "at": "2026-03-16", "title": None},
            "counts_since": 3,
        },
        "settings": "f1",
        "reading": 7,
    }


def test_keys_are_sorted_and_the_same_story_gives_the_same_bytes(story: ShiftStory) -> None:
    pairs: list[list[str]] = []
    json.loads(body(story), object_pairs_hook=lambda got: pairs.append([name for name, _ in got]))
    assert all(names == sorted(names) for names in pairs)
    assert body(story) == body(replace(story))


def test_what_is_not_known_is_null_and_never_nan(story: ShiftStory) -> None:
    unknown = replace(
        story,
        level_before=Quantiles(math.nan, math.nan, math.inf),
        probability=math.nan,
        slate=None,
        unit=None,
        reading_id=None,
        counts_since=None,
    )
    text = body(unknown).decode()
    assert "NaN" not in text
    assert "Infinity" not in text
    alert = json.loads(text)
    assert alert["figures"]["level_before"] == {"low": None, "mid": None, "high": None, "kind": "filtered"}
    assert alert["figures"]["recent_shift_probability"] is None
    assert TypeAdapter(Alert).validate_json(text)


def test_a_title_can_break_nothing(story: ShiftStory) -> None:
    nasty = replace(story, title='"}\n<script>\u2028\ud800', stream_id="a\ud800", slate="b\udfff")
    alert = json.loads(body(nasty))
    assert alert["stream"]["title"] == '"} <script> \ufffd'
    assert alert["stream"]["id"] == "a?"


def test_the_published_schema_is_that_of_the_classes() -> None:
    published = (Path(service.tell.__file__).parent / SCHEMA_FILE).read_text(encoding="utf-8")
    assert published == schema_text(), "write it anew: python -m service.tell.alert_schema"


def test_every_field_of_an_alert_is_in_the_published_schema(story: ShiftStory) -> None:
    parts = json.loads(schema_text())["$defs"]
    alert = json.loads(body(story))
    assert set(parts["Alert"]["properties"]) == set(parts["Alert"]["required"]) == set(alert)
    for name, part in (("FiguresPart", alert["figures"]), ("StreamPart", alert["stream"])):
        assert set(parts[name]["properties"]) == set(part)


def test_a_trial_has_the_names_of_an_alert_and_is_in_the_schema_too(story: ShiftStory) -> None:
    schema = json.loads(schema_text())
    assert schema["anyOf"] == [{"$ref": "#/$defs/Alert"}, {"$ref": "#/$defs/Trial"}]
    trial = json.loads(trial_body("desk", "trial_1", COMPOSED))
    assert set(schema["$defs"]["Trial"]["required"]) == set(trial)
    assert set(trial) - {"outlet"} <= set(json.loads(body(story)))
    assert TypeAdapter[Alert | Trial](Alert | Trial).validate_python(trial) == Trial(**trial)
    assert (trial["composed"], trial["schema"]) == ("2026-03-23T06:00:05Z", 1)


def test_the_classes_refuse_another_form(story: ShiftStory) -> None:
    alert = json.loads(body(story))
    with pytest.raises(ValidationError):
        TypeAdapter(Alert).validate_python(alert | {"schema": 2})
