"""The commands that look into the database or change what stands there."""

import datetime
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from storage.engine import open_existing_store
from storage.outbox import get_delivery
from storage.streams import get_stream

Run = Callable[..., tuple[int, str, str]]
Ask = Callable[..., Any]

LOOKING = (("streams",), ("history", "quay"), ("shifts",), ("rounds",), ("deliveries",))
CHANGING = (("send-again", "d-1"), ("hush", "quay", "--lift"))


@pytest.mark.parametrize("arguments", [*LOOKING, *CHANGING], ids=" ".join)
def test_without_a_database_it_is_said_and_none_is_made(
    run: Run, tmp_path: Path, arguments: tuple[str, ...]
) -> None:
    code, out, err = run(*arguments)
    assert (code, out) == (6, "")
    assert "store.sqlite" in err
    assert not (tmp_path / "store.sqlite").exists()


@pytest.mark.parametrize("arguments", [*LOOKING, *CHANGING], ids=" ".join)
def test_without_a_settings_file_it_is_said(run: Run, settings: Path, arguments: tuple[str, ...]) -> None:
    settings.unlink()
    code, out, err = run(*arguments)
    assert (code, out) == (3, "")
    assert "knickpoint.toml" in err


def test_migrate_makes_the_database_and_then_finds_nothing_to_do(ask: Ask) -> None:
    first, second = ask("migrate"), ask("migrate")
    assert first["before"] is None
    assert second["before"] == second["after"] == first["after"]


def test_a_fresh_database_has_nothing_to_show(run: Run, ask: Ask) -> None:
    ask("migrate")
    assert [ask(name) for name in ("streams", "shifts", "rounds", "deliveries")] == [[], [], [], []]
    assert "none yet" in run("streams")[1]
    assert "No shift" in run("shifts")[1]


@pytest.mark.usefixtures("filled")
class TestFilled:
    def test_streams(self, run: Run, ask: Ask) -> None:
        (stream,) = ask("streams")
        assert (stream["id"], stream["title"], stream["counts"]) == ("quay", "Quay [Stories]", 5)
        assert stream["newest"]["count"] == 101
        assert stream["first_read"] == "2026-03-02T14:00:00Z"
        assert "Quay [Stories]" in run("streams")[1]

    def test_streams_of_another_slate(self, ask: Ask) -> None:
        assert ask("streams", "--slate", "other") == []

    def test_history_holds_the_whole_run_length_posterior(self, ask: Ask) -> None:
        answer = ask("history", "quay")
        assert [line["count"] for line in answer["history"]] == [104, 97, 118, 90, 101]
        for line in answer["history"]:
            assert sum(group["probability"] for group in line["run_lengths"]) == pytest.approx(1.0, abs=1e-5)
            assert line["run_lengths"][-1]["first_run"]
        assert answer["history"][-1]["dispersion"] == [{"value": 8.0, "probability": 1.0}]

    def test_history_of_some_time(self, ask: Ask) -> None:
        answer = ask("history", "quay", "--since", "2026-01-12", "--until", "2026-01-26")
        assert [line["at"] for line in answer["history"]] == ["2026-01-12", "2026-01-19"]
        newest = ask("history", "quay", "--limit", "2")
        assert [line["at"] for line in newest["history"]] == ["2026-01-26", "2026-02-09"]

    def test_history_for_people(self, run: Run) -> None:
        code, out, _ = run("history", "quay")
        assert code == 0
        assert "before 2026-01-05" in out
        assert "2026-02-09" in out

    def test_a_stream_that_is_not_there_is_told_with_those_that_are(self, run: Run) -> None:
        code, _, err = run("history", "quai")
        assert code == 5
        assert "quay" in err

    def test_shifts(self, run: Run, ask: Ask) -> None:
        (shift,) = ask("shifts", "--stream", "quay")
        assert (shift["id"], shift["title"], shift["told"]) == ("s-1", "Quay [Stories]", None)
        assert (shift["level_before"], shift["level_after"]) == ([90.0, 100.0, 110.0], [50.0, 60.0, 70.0])
        assert shift["start"] == {"key": "2026-01-26", "at": "2026-01-26", "position": 3}
        assert ask("shifts", "--origin", "history") == []
        assert "0.930" in run("shifts")[1]

    def test_rounds(self, run: Run, ask: Ask) -> None:
        newest, older = ask("rounds")
        assert (newest["outcome"], newest["message"]) == ("failed", "The source answered 503.")
        assert older["kept_out"] == [
            {"row": 3, "why": "count must be 0 or more; got -4.", "text": "count: -4"}
        ]
        assert "503" in run("rounds")[1]

    def test_one_round_with_its_rows_kept_out(self, run: Run, ask: Ask) -> None:
        assert ask("rounds", "1")["stored"] == 4
        assert "got -4" in run("rounds", "1")[1]
        assert run("rounds", "99")[0] == 5

    def test_deliveries(self, run: Run, ask: Ask) -> None:
        (delivery,) = ask("deliveries", "--state", "given-up")
        assert (delivery["id"], delivery["body"]) == ("d-1", {"moved": "Quay"})
        assert delivery["attempts"][0]["status"] == 500
        assert ask("deliveries", "--state", "waiting") == []
        assert ask("deliveries", "d-1") == delivery
        assert "The receiver answered 500." in run("deliveries", "d-1")[1]
        assert run("deliveries", "d-9")[0] == 5

    def test_sending_again(self, ask: Ask, tmp_path: Path) -> None:
        assert ask("send-again", "d-1") == {"waiting": ["d-1"]}
        with open_existing_store(str(tmp_path / "store.sqlite")) as store, store.reading() as conn:
            delivery = get_delivery(conn, "d-1")
        assert (delivery.state, delivery.body) == ("waiting", b'{"moved": "Quay"}')

    def test_of_several_to_send_again_none_is_taken_when_one_is_unknown(self, run: Run, ask: Ask) -> None:
        assert run("send-again", "d-1", "d-9")[0] == 5
        assert ask("deliveries", "d-1")["state"] == "given_up"

    def test_a_hush_until_a_day_ends_where_the_day_begins_in_the_zone(self, ask: Ask, tmp_path: Path) -> None:
        assert ask("hush", "quay", "--until", "2999-07-01")["hushed_until"] == "2999-06-30T22:00:00Z"
        with open_existing_store(str(tmp_path / "store.sqlite")) as store, store.reading() as conn:
            until = get_stream(conn, "quay").hushed_until_utc
        assert until == datetime.datetime(2999, 6, 30, 22, 0, tzinfo=datetime.UTC)
        assert ask("hush", "quay", "--lift")["hushed_until"] is None

    def test_a_hush_that_has_passed_is_refused(self, run: Run) -> None:
        assert run("hush", "quay", "--until", "2001-07-01")[0] == 2
        assert run("hush", "quay")[0] == 2
