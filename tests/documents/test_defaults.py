"""What the settings take for granted is what the detectors take for granted."""

import pytest
from pydantic import BaseModel

from config.judging import Judgement
from config.judging import Model as WrittenModel
from config.starter import starter_text
from detectors.judge import Rule
from detectors.jump_prior import JumpPrior
from detectors.model import DISPERSIONS, WANDERS, Model
from service.cli.commands.replay import command as replay_command
from service.replay.parameters import Wish, model_for, rule_for
from service.wiring import model_of, rule_of


def test_the_rule() -> None:
    assert rule_of(Judgement()) == Rule()
    assert {name: getattr(Rule(), name) for name in Judgement.model_fields} == Judgement().model_dump()


def test_the_model() -> None:
    assert model_of(WrittenModel(), Judgement()) == Model()


def test_the_smallest_shift_is_that_of_the_jump_prior() -> None:
    jump = model_of(WrittenModel(), Judgement()).jump
    assert isinstance(jump, JumpPrior)
    assert jump == JumpPrior()


def test_a_replay_without_wishes_judges_as_the_daemon_does() -> None:
    assert rule_for(Wish()) == rule_of(Judgement())
    assert model_of(WrittenModel(), Judgement()) == model_for(Wish())


def test_lists_that_are_left_out_are_those_of_the_detectors() -> None:
    assert (WrittenModel().dispersions, WrittenModel().wanders) == (None, None)
    model = model_of(WrittenModel(), Judgement())
    assert (model.dispersions, model.wanders) == (DISPERSIONS, WANDERS)


@pytest.mark.parametrize("part", [Judgement(), WrittenModel()], ids=["judgement", "model"])
def test_the_starter_file_shows_the_defaults(part: BaseModel) -> None:
    shown = [line.removeprefix("#").strip() for line in starter_text().splitlines()]
    for name, value in part:
        if value is not None:
            number = int(value) if float(value).is_integer() else value
            assert f"{name} = {number}" in shown


def test_each_value_can_be_wished_for_in_a_replay() -> None:
    options = {option.name for option in replay_command.params}
    assert options >= {*Judgement.model_fields, "mean_gap", "gap_shape", "smallest_shift", "one_off_share"}
