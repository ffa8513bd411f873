"""`knickpoint replay`: the whole way from a file to the answer."""

import datetime
import io
import json
from collections.abc import Callable
from typing import Any

import pytest

from detectors.advance import advance, start
from detectors.judge import Rule
from detectors.observation import Observation
from service.cli.main import run_command
from service.replay.parameters import Wish, model_for
from service.sources.plans import Bounds

Replay = Callable[..., dict[str, Any]]
Refused = Callable[..., tuple[int, str]]

HIGH, LOW = (
    [104, 97, 118, 90, 101, 110, 88, 95, 107, 99, 112, 93] * 2,
    [42, 39, 47, 36, 44, 51, 38, 40, 45, 41],
)
NAMES = [
    "index",
    "at",
    "count",
    "recent_shift",
    "run_length_mode",
    "level",
    "one_off",
    "log_predictive",
    "pit",
]
SAID = NAMES[3:]


def _weekly(counts: list[int | None], first: str = "2026-01-05") -> list[str]:
    start_at = datetime.date.fromisoformat(first)
    dates = [start_at + datetime.timedelta(weeks=week) for week in range(len(counts))]
    return [
        "at,count",
        *(f"{date},{'' if count is None else count}" for date, count in zip(dates, counts, strict=True)),
    ]


def test_it_says_what_advance_says(replayed: Replay) -> None:
    counts = HIGH + LOW
    answer = replayed(_weekly(counts))
    model = model_for(Wish(wanders=((0.0, 1.0),), dispersions=(4.0, 16.0)))
    direct = advance(start(model), [Observation(week, count) for week, count in enumerate(counts)], Rule())
    for line, posterior in zip(answer["observations"], direct.posteriors, strict=True):
        assert posterior is not None
        assert line["recent_shift"] == posterior.recent_shift
        assert line["run_length_mode"] == posterior.run_length_mode
        assert line["level"] == [posterior.level.low, posterior.level.mid, posterior.level.high]
        assert (line["one_off"], line["log_predictive"]) == (posterior.one_off, posterior.log_predictive)
        assert line["pit"] == list(posterior.pit)
    (announcement,), (alert,) = direct.announcements, answer["alerts"]
    assert (alert["announced_index"], alert["start_index"]) == (
        announcement.position,
        announcement.start_position,
    )
    assert alert["probability"] == announcement.probability
    after = announcement.level_after
    assert alert["level_after"] == [after.low, after.mid, after.high]


def test_a_fall_is_told_with_its_place_in_the_file(replayed: Replay) -> None:
    (alert,) = replayed(_weekly(HIGH + LOW))["alerts"]
    assert alert["start_index"] == len(HIGH)
    assert len(HIGH) + Rule().lasting - 1 <= alert["announced_index"] < len(HIGH) + 8
    assert alert["level_before"][1] > 90
    assert alert["level_after"][1] < 60
    assert set(alert) == {"announced_index", "start_index", "probability", "level_before", "level_after"}


def test_every_row_has_its_line(replayed: Replay) -> None:
    answer = replayed(_weekly([5, None, 7, 6]))
    assert [line["index"] for line in answer["observations"]] == [0, 1, 2, 3]
    assert all(list(line) == NAMES for line in answer["observations"])
    assert answer["observations"][1] == {
        **dict.fromkeys(NAMES),
        "index": 1,
        "at": "2026-01-12",
    }
    assert (answer["interval"], answer["shape"], answer["alerts"]) == ("week", "calendar", [])


def test_a_missing_count_is_the_same_as_no_row_for_the_rest(replayed: Replay) -> None:
    lines = _weekly([5, 9, 7, 6, 8, 4, 7])
    whole = replayed([*lines[:4], lines[4].partition(",")[0] + ",", *lines[5:]])["observations"]
    shorter = replayed([*lines[:4], *lines[5:]])["observations"]
    said = [{name: line[name] for name in SAID} for line in whole if line["count"] is not None]
    assert said == [{name: line[name] for name in SAID} for line in shorter]


def test_future_dates_are_fine(replayed: Replay) -> None:
    assert replayed(_weekly([5, 6, 7], "2999-01-07"))["interval"] == "week"


def test_rows_in_any_order_are_answered_in_the_order_of_the_file(replayed: Replay) -> None:
    header, *rows = _weekly(HIGH + LOW)
    turned = replayed([header, *rows[::-1]])
    straight = replayed([header, *rows])
    last = len(rows) - 1
    for line in turned["observations"]:
        twin = straight["observations"][last - line["index"]]
        assert {**line, "index": 0} == {**twin, "index": 0}
    (alert,), (twin,) = turned["alerts"], straight["alerts"]
    assert alert["start_index"] == last - twin["start_index"]
    assert alert["announced_index"] == last - twin["announced_index"]


def test_the_interval_can_be_named(replayed: Replay) -> None:
    answer = replayed(_weekly([5, 6, 7, 5]), "--interval", "day")
    assert answer["interval"] == "day"
    # Positions lie seven apart now, so the same counts say something else of shifts.
    assert (
        answer["observations"][3]["log_predictive"]
        != replayed(_weekly([5, 6, 7, 5]))["observations"][3]["log_predictive"]
    )


def test_the_settings_of_the_answer_are_in_it(replayed: Replay) -> None:
    answer = replayed(_weekly([5, 6, 7]), "--threshold", "0.8", "--mean-gap", "90", "--fewest-counts", "20")
    rule = Rule(threshold=0.8, fewest_counts=20)
    assert answer["judgement"] == {
        "threshold": 0.8,
        "window": rule.window,
        "lasting": rule.lasting,
        "fewest_counts": 20,
    }
    assert (answer["model"]["mean_gap"], answer["model"]["dispersions"]) == (90.0, [4.0, 16.0])


def test_exposure_scales_the_level(replayed: Replay) -> None:
    plain = replayed(_weekly([100, 96, 104, 99, 101]))["observations"][-1]["level"][1]
    lines = [
        f"{line},{'exposure' if place == 0 else 0.5}"
        for place, line in enumerate(_weekly([100, 96, 104, 99, 101]))
    ]
    assert replayed(lines)["observations"][-1]["level"][1] == pytest.approx(2 * plain, rel=0.1)


def test_an_empty_exposure_is_1(replayed: Replay) -> None:
    lines = [
        line + (",exposure" if place == 0 else ",") for place, line in enumerate(_weekly([100, 96, 104]))
    ]
    assert replayed(lines)["observations"] == replayed(_weekly([100, 96, 104]))["observations"]


def test_with_releases_the_number_counts_and_not_the_date(replayed: Replay) -> None:
    lines = ["at,release,count", "2026-01-01,a,5", "2026-01-01,b,6", "2026-04-01,c,7", "2026-04-02,d,4"]
    answer = replayed(lines)
    assert answer["shape"] == "release"
    daily = ["at,count", "2026-01-01,5", "2026-01-02,6", "2026-01-03,7", "2026-01-04,4"]
    without_at = [{**line, "at": None} for line in answer["observations"]]
    assert without_at == [{**line, "at": None} for line in replayed(daily)["observations"]]


def test_a_row_that_cannot_be_read_is_kept_out_and_shown(replayed: Replay) -> None:
    answer = replayed(
        ["at,count", "2026-01-05,5", "2026-01-12,-3", "2026-01-19,6", "soon,7", "2026-02-02,12.0"]
    )
    assert [line["count"] for line in answer["observations"]] == [5, None, 6, None, 12]
    assert [one["index"] for one in answer["kept_out"]] == [1, 3]
    assert "-3" in answer["kept_out"][0]["why"]


@pytest.mark.parametrize(
    ("lines", "options", "code", "words"),
    [
        (["at,count"], (), 4, "no rows"),
        (["at,count", "x,y"], (), 4, "none of its 1 rows"),
        (["at,number", "2026-01-05,5"], (), 4, '"count"'),
        (["at,count", "2026-01-05,5", "2026-01-05,6", "2026-01-12,6"], (), 4, "index 0 and 1"),
        (["at,count", "2026-01-05,5"], (), 4, "--interval"),
        (["at,count", "2026-01-05,5", "2026-01-06,5"], ("--interval", "fortnight"), 2, "14 days"),
        (["at,count", "2026-01-05,5", "2026-01-06,5"], ("--zone", "Nowhere"), 2, "Nowhere"),
        (["at,count", "2026-01-05,5", "2026-01-06,5"], ("--threshold", "0.1"), 2, "threshold"),
        (["at,count", "2026-01-05,5", "2026-01-06,5"], ("--lasting", "50"), 2, "lasting"),
        (["at,count", "2026-01-05,5", "2026-01-06,5"], ("--wander", "-1"), 2, "wander"),
    ],
)  # fmt: skip
def test_what_cannot_be_replayed_is_said_in_one_sentence(
    refused: Refused, lines: list[str], options: tuple[str, ...], code: int, words: str
) -> None:
    got, sentence = refused(lines, *options)
    assert got == code
    assert words in sentence
    assert sentence.count("\n") == 1


def test_one_row_can_be_replayed_when_its_interval_is_named(replayed: Replay) -> None:
    assert len(replayed(["at,count", "2026-01-05,5"], "--interval", "week")["observations"]) == 1


class _Given:
    """Stands for sys: something that comes on standard input."""

    def __init__(self, body: bytes) -> None:
        self.stdin = io.TextIOWrapper(io.BytesIO(body))


def _replay_given(
    body: bytes, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> tuple[int, str, str]:
    monkeypatch.setattr("service.replay.given.sys", _Given(body))
    code = run_command(["replay", "-", "--json", "--wander", "0", "--dispersion", "4,16"])
    shown = capsys.readouterr()
    return code, shown.out, shown.err


def test_standard_input_is_answered_as_the_same_file_is(
    replayed: Replay, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    lines = _weekly(HIGH + LOW)
    code, out, _ = _replay_given("\n".join(lines).encode(), capsys, monkeypatch)
    assert (code, json.loads(out)) == (0, replayed(lines))


def test_what_is_wrong_with_standard_input_is_said(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    code, out, err = _replay_given(b"at,count\n", capsys, monkeypatch)
    assert (code, out) == (4, "")
    assert err.startswith("knickpoint: standard input cannot be replayed: it has no rows")
    monkeypatch.setattr("service.replay.given.Bounds", lambda: Bounds(largest_body=5))
    code, _, err = _replay_given(b"at,count\n", capsys, monkeypatch)
    assert (code, "more than the 5 bytes" in err) == (4, True)
