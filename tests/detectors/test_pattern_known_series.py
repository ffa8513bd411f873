"""Published monthly series with a season and a known break: the season goes, the break stays.

Harvey & Durbin (1986), JRSS A 149, 187-227: seat belts compulsory in front from 31 January 1983.
"""

import datetime
import json
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from detectors.advance import Advanced, advance, start
from detectors.cycles import Cycle, months
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation
from detectors.pattern import Pattern, pattern_exposure, with_pattern
from detectors.pattern_estimate import estimate_pattern
from detectors.simulation import as_observations

FloatArray = NDArray[np.float64]
SERIES = json.loads((Path(__file__).parents[1] / "vectors" / "series.json").read_text(encoding="utf-8"))
STANDING_STILL = Model(wanders=((0.0, 1.0),))


def month_starts(year: int, size: int) -> list[datetime.date]:
    return [datetime.date(year + place // 12, place % 12 + 1, 1) for place in range(size)]


def factors(pattern: Pattern, cycle: int = 0) -> FloatArray:
    return np.array([place.factor for place in pattern.cycles[cycle].factors])


def errors(pattern: Pattern, cycle: int = 0) -> FloatArray:
    return np.array([place.relative_sd for place in pattern.cycles[cycle].factors])


def without_season(observations: list[Observation], cycle: Cycle) -> list[Observation]:
    pattern = estimate_pattern(observations, [cycle])
    return with_pattern(observations, [pattern_exposure(pattern, (place,)) for place in cycle.place])


def casualties(name: str, first_year: int, model: Model) -> tuple[Advanced, Advanced]:
    """A series of UK road casualties as it is, and with the season in its exposures."""
    counts = SERIES[name]["counts"][12 * (first_year - 1969) :]
    starts = month_starts(first_year, len(counts))
    plain = [
        Observation(day.year * 12 + day.month - 1, count) for day, count in zip(starts, counts, strict=True)
    ]
    seasonal = without_season(plain, months(starts))
    return advance(start(model), plain, Rule()), advance(start(model), seasonal, Rule())


def month(year: int, number: int) -> int:
    return year * 12 + number - 1


def test_front_seats_the_belt_law_and_no_other() -> None:
    plain, seasonal = casualties("front", 1969, Model())
    # With the standard settings the season hides the break, and taking it out brings it forth, alone.
    assert plain.announcements == ()
    (alert,) = seasonal.announcements
    assert alert.start_position == month(1983, 2)
    # Recomputed with one or two changes, last months before: 1982-12 (0.73) or 1983-01.
    assert set(alert.region) <= {month(1983, 1), month(1983, 2), month(1983, 3)}
    assert alert.level_after.mid / alert.level_before.mid == pytest.approx(573 / 793, abs=0.06)


def test_front_seats_both_known_breaks_without_wander() -> None:
    # Exactly two changes, recomputed: last months before them 1973-12 (oil crisis) and 1982-12, P 0.73; two
    # breaks by least squares (Zeileis et al., strucchange; of all drivers): 1973(10) and 1983(1).
    _, seasonal = casualties("front", 1969, STANDING_STILL)
    oil, belts = seasonal.announcements
    assert month(1973, 10) <= oil.start_position <= month(1974, 1)
    assert belts.start_position == month(1983, 2)


def test_drivers_killed_the_belt_law_and_no_other() -> None:
    # From 1975, exactly one change, NB size 100, recomputed: last month before it 1983-01, P 0.51; means
    # 119.26 and 100.26 with the season left in. (On the whole series the winter of 1973 is another break.)
    _, seasonal = casualties("drivers_killed", 1975, STANDING_STILL)
    (alert,) = seasonal.announcements
    assert month(1983, 2) <= alert.start_position <= month(1983, 4)
    assert alert.level_after.mid / alert.level_before.mid == pytest.approx(0.82, abs=0.06)


@pytest.mark.parametrize("model", [Model(), STANDING_STILL])
def test_rear_seats_the_control(model: Model) -> None:
    # Not covered by the law; one change against none, recomputed: log Bayes factor -0.06.
    _, seasonal = casualties("rear", 1975, model)
    assert seasonal.announcements == ()


def test_drivers_killed_season() -> None:
    # Independent of any model: the mean over 16 years of each month's share of its year's mean.
    counts = np.array(SERIES["drivers_killed"]["counts"], dtype=float).reshape(16, 12)
    by_ratio = (counts / counts.mean(axis=1, keepdims=True)).mean(axis=0)
    starts = month_starts(1969, counts.size)
    pattern = estimate_pattern(as_observations(counts.astype(np.int64).ravel()), [months(starts)])
    weights = np.array(months(starts).weights)
    assert np.average(factors(pattern), weights=weights) == pytest.approx(1.0, abs=1e-12)
    apart = np.log(factors(pattern) / by_ratio) / errors(pattern)
    assert np.abs(apart).max() < 1.0
