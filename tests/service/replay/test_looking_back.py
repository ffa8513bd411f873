"""`knickpoint replay --json` has a look back, and --look-back says it in words."""

import datetime
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from detectors.look_back import look_back
from detectors.observation import Observation
from service.cli.main import run_command
from service.replay import looking_back
from service.replay.looking_back_words import rows_words
from service.replay.parameters import Wish, model_for

Replay = Callable[..., dict[str, Any]]

HIGH = [104, 97, 118, 90, 101, 110, 88, 95, 107, 99, 112, 93] * 2
LOW = [42, 39, 47, 36, 44, 51, 38, 40, 45, 41]


def _weekly(counts: list[int | None]) -> list[str]:
    dates = [datetime.date(2026, 1, 5) + datetime.timedelta(weeks=week) for week in range(len(counts))]
    rows = (f"{date},{'' if count is None else count}" for date, count in zip(dates, counts, strict=True))
    return ["at,count", *rows]


def test_it_says_what_look_back_says(replayed: Replay) -> None:
    said = replayed(_weekly([*HIGH, *LOW]))["lookback"]
    model = model_for(Wish(wanders=((0.0, 1.0),), dispersions=(4.0, 16.0)))
    direct = look_back(model, [Observation(week, count) for week, count in enumerate(HIGH + LOW)])
    assert said["shift_probability"] == list(direct.shift_probability)
    assert said["one_off"] == list(direct.one_off)
    assert said["number_of_shifts"] == list(direct.number)
    (line,), (shift,) = said["shifts"], direct.shifts
    assert line["index"] == shift.index == len(HIGH)
    assert line["region"] == list(shift.region.indices)
    assert line["probability"] == shift.probability
    assert line["effect"] == [shift.effect.low, shift.effect.mid, shift.effect.high]
    assert line["level_before"] == [shift.level_before.low, shift.level_before.mid, shift.level_before.high]
    assert said["segmentation"]["indices"] == [len(HIGH)]


def test_missing_counts_and_rows_kept_out_have_none(replayed: Replay) -> None:
    lines = _weekly([*HIGH[:5], None, *HIGH[5:], *LOW])
    lines.insert(3, "not a date,7")
    said = replayed(lines)["lookback"]
    for name in ("shift_probability", "level", "one_off"):
        assert len(said[name]) == len(lines) - 1
        assert [index for index, value in enumerate(said[name]) if value is None] == [2, 6]
    assert said["shifts"][0]["index"] == len(HIGH) + 2
    assert said["shift_probability"][len(HIGH) + 2] == max(p for p in said["shift_probability"] if p)


def test_rows_in_any_order(replayed: Replay) -> None:
    header, *rows = _weekly(HIGH + LOW)
    straight, turned = replayed([header, *rows])["lookback"], replayed([header, *rows[::-1]])["lookback"]
    assert turned["shift_probability"] == straight["shift_probability"][::-1]
    assert turned["shifts"][0]["index"] == len(rows) - 1 - straight["shifts"][0]["index"]


def test_it_is_not_computed_unasked_where_it_takes_long(
    replayed: Replay, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(looking_back, "QUICK_COUNTS", 10)
    assert replayed(_weekly([5] * 11))["lookback"] is None
    assert replayed(_weekly([5] * 11), "--look-back")["lookback"] is not None


def test_a_record_that_is_too_long_is_refused(
    refused: Callable[..., tuple[int, str]], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(looking_back, "MOST_COUNTS", 10)
    code, sentence = refused(_weekly([5] * 11), "--look-back", "--wander", "0", "--dispersion", "4")
    assert code != 0
    assert "at most 10; got 11" in sentence


def test_words(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    file = tmp_path / "counts.csv"
    file.write_text("\n".join(_weekly([*HIGH, *LOW])) + "\n", encoding="utf-8")
    plain = ["replay", str(file), "--wander", "0", "--dispersion", "4,16"]
    assert run_command(plain) == 0
    assert "Looking back" not in capsys.readouterr().out
    assert run_command([*plain, "--look-back"]) == 0
    said = " ".join(capsys.readouterr().out.split())
    assert "Looking back, with all counts known" in said
    assert "most probably from 2026-06-22 (row 24;" in said
    assert "A date in common is not a cause" in said


def test_rows_are_named_in_stretches() -> None:
    assert rows_words([7]) == "row 7"
    assert rows_words([3, 4, 5, 8, 10, 11]) == "rows 3 to 5, 8 and 10 to 11"
