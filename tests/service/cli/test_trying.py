"""A source tried: read and sorted as a round would, and nothing stored."""

import datetime
import json
import time
from pathlib import Path
from zoneinfo import ZoneInfo

import pytest

from detectors.judge import Rule
from detectors.model import Model
from service.cli.json_form import json_text
from service.cli.source_view import show_tried, tried_json
from service.cli.trying import Tried, try_source
from service.round.calendar import Axis, Interval
from service.round.plans import CalendarShape, RoundPlan, StreamPlan
from service.sources.errors import SourceUnreadable
from service.sources.plans import CsvPlan, FieldPlan, FilePlace

UTC = ZoneInfo("UTC")
NOW = datetime.datetime(2026, 3, 2, tzinfo=UTC)
WEEKS = CalendarShape(Axis(Interval("week"), UTC), "missing")
TABLE = """day,show,plays
2026-01-05,quay,120
2026-01-12,quay,117
2026-01-12,quay,118
2026-01-05,mill,-4
2026-01-12,mill,9
2026-01-12,old,9
"""


def _stream_for(split: str | None) -> StreamPlan | None:
    if split == "old":
        return None
    shown = str(split)
    return StreamPlan(f"plays/{shown}", "plays", split, shown.title(), "house", WEEKS, Model(), Rule(), "f")


def _plan(path: Path) -> RoundPlan:
    source = CsvPlan("plays", FilePlace(path), FieldPlan("day", "plays", split="show"), UTC)
    return RoundPlan("plays", source, datetime.timedelta(hours=1), _stream_for)


@pytest.fixture
def tried(tmp_path: Path) -> Tried:
    path = tmp_path / "plays.csv"
    path.write_text(TABLE, encoding="utf-8")
    return try_source(_plan(path), time.monotonic, NOW)


def test_rows_are_sorted_into_streams_and_conflicts_are_kept_out(tried: Tried) -> None:
    answer = json.loads(json_text(tried_json(tried)))
    assert [(one["id"], [each["count"] for each in one["readings"]]) for one in answer["streams"]] == [
        ("plays/mill", [9]),
        ("plays/quay", [120]),
    ]
    assert [one["row"] for one in answer["kept_out"]] == [2, 3, 4]
    assert answer["left_out"] == 1
    assert [row["row"] for row in answer["rows"]] == [1, 2, 3, 5, 6]


def test_people_see_it_too(tried: Tried, capsys: pytest.CaptureFixture[str]) -> None:
    show_tried(tried, 3)
    out = capsys.readouterr().out
    assert "5 rows understood, 3 kept out, 1 left out" in out
    assert "Nothing was stored" in out
    assert "Quay" in out
    assert "count must be 0 or more" in out
    assert "... and 2 more" in out


def test_a_document_that_cannot_be_read(tmp_path: Path) -> None:
    with pytest.raises(SourceUnreadable, match="plays"):
        try_source(_plan(tmp_path / "nonesuch.csv"), time.monotonic, NOW)
