"""Published series, replayed by the command as a stranger would, tell their known story.

The model here is not that of the publications: levels jump by a heavy-tailed factor, the dispersion is
unknown and counts arrive one at a time. What must agree is the date, which the counts themselves decide.
"""

import json
from pathlib import Path
from typing import Any

import pytest

from service.cli.main import run_command

VECTORS = Path(__file__).parents[2] / "vectors"


def _replay(capsys: pytest.CaptureFixture[str], name: str, *options: str) -> dict[str, Any]:
    assert run_command(["replay", str(VECTORS / name), "--json", *options]) == 0
    answer: dict[str, Any] = json.loads(capsys.readouterr().out)
    return answer


def test_the_nile_fell_after_1898(capsys: pytest.CaptureFixture[str]) -> None:
    # Annual flow at Aswan 1871-1970. Cobb, The problem of the Nile, Biometrika 65 (1978) 243-251: a change
    # near 1898, so 1899 is the first year at the new level. Means before and after by least squares, with R
    # strucchange 1.5-3, breakpoints(Nile ~ 1): 1097.75 and 849.97; 95 % interval of the date 1895 to 1902.
    answer = _replay(capsys, "nile.csv", "--wander", "0")
    assert answer["interval"] == "year"
    (alert,) = answer["alerts"]
    assert answer["observations"][alert["start_index"]]["at"] == "1899-01-01"
    assert alert["level_before"][1] == pytest.approx(1097.75, rel=0.05)
    assert alert["level_after"][1] == pytest.approx(849.97, rel=0.1)


def test_fewer_drivers_died_from_the_month_of_the_law_on(capsys: pytest.CaptureFixture[str]) -> None:
    # Car drivers killed in Great Britain, monthly, here from 1975-01. Harvey and Durbin, JRSS A 149 (1986)
    # 187-227: seat belts became compulsory on 31 January 1983, so February is the first month under the law.
    answer = _replay(capsys, "uk_drivers_killed.csv", "--wander", "0")
    assert answer["interval"] == "month"
    (alert,) = answer["alerts"]
    assert answer["observations"][alert["start_index"]]["at"] == "1983-02-01"


def test_the_plain_answer_tells_it_first(capsys: pytest.CaptureFixture[str]) -> None:
    assert run_command(["replay", str(VECTORS / "nile.csv"), "--wander", "0"]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert lines[0] == "100 counts, one per year: 1 alert."
    assert "fell" in lines[1]
    assert "1899-01-01" in lines[1]
    assert any(set(line) & set("▁█") for line in lines[2:6])
    assert len(lines) > 100
