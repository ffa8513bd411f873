"""What a person says of the model and the rule."""

import math

import pytest

from detectors.errors import UnusableParameter
from detectors.judge import Rule
from detectors.model import Model
from service.replay.parameters import Wish, model_for, read_dispersions, read_wanders, read_zone, rule_for


def test_no_wish_leaves_the_defaults() -> None:
    assert model_for(Wish()) == Model()
    assert rule_for(Wish()) == Rule()


def test_wishes_are_put_in() -> None:
    model = model_for(
        Wish(mean_gap=80.0, smallest_shift=0.25, wanders=((0.0, 1.0),), dispersions=(math.inf,))
    )
    assert (model.gap.mean, model.gap.shape) == (80.0, Model().gap.shape)
    assert model.jump.smallest == pytest.approx(math.log(1.25), rel=1e-15)
    assert (model.wanders, model.dispersions) == (((0.0, 1.0),), (math.inf,))
    assert rule_for(Wish(threshold=0.5, lasting=1)) == Rule(threshold=0.5, lasting=1)


def test_a_window_beyond_the_usual_one_is_computed_exactly() -> None:
    wish = Wish(window=90)
    assert model_for(wish).accuracy.exact_run_length == rule_for(wish).window == 90


@pytest.mark.parametrize(
    ("text", "wanders"),
    [
        ("0", ((0.0, 1.0),)),
        ("0.005:1,0.01:0.5", ((0.005, 1.0), (0.01, 0.5))),
        ("0.01, 0.02", ((0.01, 1.0), (0.02, 1.0))),
    ],
)
def test_wanders(text: str, wanders: tuple[tuple[float, float], ...]) -> None:
    assert read_wanders(text) == wanders


@pytest.mark.parametrize("text", ["", "x", "0.1,", "0.1:x", "nan", "0.1,0.1"])
def test_other_wanders_are_refused(text: str) -> None:
    with pytest.raises(UnusableParameter, match="wander"):
        read_wanders(text)


def test_dispersions() -> None:
    assert read_dispersions("4, 16,poisson") == (4.0, 16.0, math.inf)


@pytest.mark.parametrize("text", ["", "4,,8", "many", "4,4"])
def test_other_dispersions_are_refused(text: str) -> None:
    with pytest.raises(UnusableParameter, match="dispersion"):
        read_dispersions(text)


@pytest.mark.parametrize("text", ["", "Nowhere/Town", "../etc/passwd", "/etc/passwd", "Europe"])
def test_a_zone_that_is_none(text: str) -> None:
    with pytest.raises(UnusableParameter, match="zone"):
        read_zone(text)
