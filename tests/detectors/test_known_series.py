"""Published series whose story is known: the filter, told nothing of it, must find the same.

The published analyses look back over the whole record with one change and exchangeable levels. The model here
filters, lets the new level depend on the old one, knows neither dispersion nor number of shifts, and allows
one-offs. The places agree all the same because the changes are large beside the spread of the counts, so that
the likelihood and not the prior decides where they lie; the probabilities differ, and are not compared. Where
the published posterior is itself wide, the place must lie in its 95 % set.

Wander is left out: these analyses have none, and the monthly series have a season, which an unseasonal
filter with wander takes for a wandering level. Sources stand beside each series in `vectors/series.json`.
"""

import json
from pathlib import Path

import pytest

from detectors.advance import Advanced, advance, start
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation

SERIES = json.loads((Path(__file__).parents[1] / "vectors" / "series.json").read_text(encoding="utf-8"))
STANDING_STILL = Model(wanders=((0.0, 1.0),))


def told(name: str, first: int, threshold: float, skip: int = 0) -> Advanced:
    """Fold a series whose first kept count stands at position `first`."""
    counts = SERIES[name]["counts"][skip:]
    observations = [Observation(first + place, count) for place, count in enumerate(counts)]
    return advance(start(STANDING_STILL), observations, Rule(threshold=threshold))


def month(year: int, number: int) -> int:
    return year * 12 + number - 1


def from_1975(name: str, threshold: float) -> Advanced:
    """From 1975 on, as the recomputed one-change analyses: the oil crisis of 1973 is another shift."""
    return told(name, month(1975, 1), threshold, skip=72)


@pytest.mark.parametrize(
    ("name", "size", "total"),
    [
        ("coal", 112, 191),
        ("nile", 100, 91_935),
        ("campylobacteriosis", 140, 1_616),
        ("drivers_killed", 192, 23_578),
        ("front", 192, 160_746),
        ("rear", 192, 77_032),
    ],
)
def test_the_series_are_whole(name: str, size: int, total: int) -> None:
    # Sizes and first three sums as the sources state them; the others guard against a slip of the pen.
    counts = SERIES[name]["counts"]
    assert (len(counts), sum(counts)) == (size, total)


def test_drivers_killed_and_the_seat_belt_law() -> None:
    # Harvey & Durbin (1986): compulsory from 31 January 1983; the first full month is February.
    (alert,) = from_1975("drivers_killed", threshold=0.9).announcements
    assert alert.start_position == month(1983, 2)
    # They estimate 18 % fewer; winter months and summer months are mixed here, so only sign and order.
    assert 0.6 < alert.level_after.mid / alert.level_before.mid < 0.9


def test_front_seats_and_the_seat_belt_law() -> None:
    # One change, recomputed: December 1982 (0.75) or January 1983 (0.24) is the last month before it.
    (alert,) = from_1975("front", threshold=0.9).announcements
    assert alert.start_position in (month(1983, 1), month(1983, 2))
    assert set(alert.region) <= {month(1982, 12), month(1983, 1), month(1983, 2)}


@pytest.mark.parametrize("threshold", [0.9, 0.5])
def test_rear_seats_the_control(threshold: float) -> None:
    # Harvey & Durbin (1986): rear seats were not covered. One change against none: log Bayes factor -0.06.
    advanced = from_1975("rear", threshold)
    assert advanced.announcements == ()
    assert max(p.recent_shift for p in advanced.posteriors if p is not None) < 0.35


def test_nile_1898() -> None:
    # Cobb (1978): "near 1898"; the least-squares break has 1898 as its last year before, 95 % 1895-1902.
    (alert,) = told("nile", 1871, threshold=0.9).announcements
    assert alert.start_position == 1899
    # Least squares: means 1097.75 and 849.97. The level after rests on six or seven years only.
    assert alert.level_before.mid == pytest.approx(1097.75, rel=0.03)
    assert alert.level_after.mid == pytest.approx(849.97, rel=0.08)


def test_coal_1891() -> None:
    # One change, Poisson counts, Gamma(1, 1): the last year before it is 1891, 95 % set 1886-1893 and 1896.
    last_years_before = {*range(1886, 1894), 1896}
    (alert,) = told("coal", 1851, threshold=0.8).announcements
    assert alert.start_position - 1 in last_years_before
    assert 1892 in alert.region
    # At the mode: 127 disasters in 41 years, 64 in 71 years.
    assert alert.level_before.low < 127 / 41 < alert.level_before.high
    assert alert.level_after.low < 64 / 71 < alert.level_after.high


def test_coal_the_published_mode_once_the_years_after_are_known() -> None:
    # A filter's run start moves as years come in. Looking from 1905 the mode is the published one, first
    # year 1892, or a neighbour: 1891 has 0.245, 1890 0.185, 1889 0.143 as last year before the change.
    in_1905 = told("coal", 1851, threshold=0.8).posteriors[1905 - 1851]
    assert in_1905 is not None
    assert 1905 - in_1905.run_length_mode + 1 in (1890, 1891, 1892)


def test_campylobacteriosis_84() -> None:
    # Fokianos & Fried (2010): shift from t = 84, spike at t = 100 (55, 47, 28: three high counts, so that it
    # may ring with `lasting` 3). One exact change: 84 for every dispersion from 5 to the Poisson limit.
    alerts = told("campylobacteriosis", 1, threshold=0.8).announcements
    later = [alert for alert in alerts if alert.start_position > 50]
    assert later[0].start_position == 84
    assert later[0].position < 100
    # Means at the exact change: 8.16 and 16.47.
    assert later[0].level_before.low < 8.16 < later[0].level_before.high
    assert later[0].level_after.low < 16.47 < later[0].level_after.high
    assert all(98 <= alert.start_position <= 103 for alert in later[1:])
