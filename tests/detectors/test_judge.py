"""The one rule that rings: what it counts as recent, when it is silent, and that it tells a shift once."""

import math
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from detectors.advance import Advanced, advance, start
from detectors.errors import UnusableParameter
from detectors.gap_prior import GapPrior
from detectors.judge import Rule, prior_floor, recent_slots, region
from detectors.model import Model
from detectors.observation import Observation
from detectors.posterior import Posterior
from detectors.run_slots import RunSlots


def noisy(rng: np.random.Generator, level: float, dispersion: float, size: int) -> list[int]:
    return rng.poisson(level * rng.gamma(dispersion, 1.0 / dispersion, size)).tolist()


def folded(counts: list[int], rule: Rule, model: Model | None = None) -> Advanced:
    return advance(start(model or Model()), [Observation(i, x) for i, x in enumerate(counts)], rule)


def said(advanced: Advanced) -> list[Posterior]:
    return [posterior for posterior in advanced.posteriors if posterior is not None]


# What counts as recent


def slots_of(starts: list[int]) -> SimpleNamespace:
    """A step whose slot 0 holds the first run, the others runs from the given counts on; 0 is empty."""
    newest = np.array([1, *starts])
    return SimpleNamespace(slots=RunSlots(newest.copy(), newest, np.zeros(newest.size, dtype=np.int64)))


def lengths_that_ring(rule: Rule, counted: int, last_announced: int) -> list[int]:
    step = slots_of(list(range(2, counted + 1)))
    chosen = recent_slots(step, counted, last_announced, rule)
    return sorted((counted - step.slots.newest[chosen] + 1).tolist())


@pytest.mark.parametrize(
    ("lasting", "window", "last_announced", "wanted"),
    [
        (3, 6, 0, [3, 4, 5, 6]),
        (1, 2, 0, [1, 2]),
        (4, 4, 0, [4]),
        # Announced at count 16 of 20: starts 17 .. 20 are left, of lengths 4 .. 1.
        (3, 6, 16, [3, 4]),
        (3, 6, 18, []),
        (3, 6, 20, []),
    ],
)
def test_both_ends_of_the_window_are_recent(
    lasting: int, window: int, last_announced: int, wanted: list[int]
) -> None:
    assert lengths_that_ring(Rule(lasting=lasting, window=window), 20, last_announced) == wanted


def test_neither_the_first_run_nor_an_empty_slot_is_recent() -> None:
    step = slots_of([0, 3, 0, 4])
    assert recent_slots(step, 5, 0, Rule(lasting=1, window=40)).tolist() == [2, 4]


def test_recent_shift_is_the_sum_over_the_stored_run_lengths() -> None:
    # The same probability, from what is stored: groups of run lengths, the first run last.
    rng = np.random.default_rng(41)
    counts = noisy(rng, 300.0, 20.0, 70) + noisy(rng, 120.0, 20.0, 30)
    rule = Rule(window=25, lasting=4, threshold=0.8)
    advanced = folded(counts, rule)
    assert len(advanced.announcements) == 1
    last_announced = 0
    for posterior in said(advanced):
        lengths = posterior.run_lengths
        recent = [
            p
            for short, p in zip(lengths.shortest[:-1], lengths.probability[:-1], strict=True)
            if 4 <= short <= 25 and posterior.counted - short + 1 > last_announced
        ]
        assert posterior.recent_shift == pytest.approx(math.fsum(recent), abs=1e-12)
        if posterior.position == advanced.announcements[0].position:
            last_announced = posterior.counted


# When it is silent


@pytest.mark.parametrize("level", [6.0, 80.0, 4_000.0])
def test_unchanged_streams_do_not_ring(level: float) -> None:
    # No bell at all in 900 counts; the full alarm rate, with its standard error, is a long check elsewhere.
    for seed in range(2):
        counts = noisy(np.random.default_rng([seed, int(level)]), level, 8.0, 150)
        assert folded(counts, Rule()).announcements == ()


@pytest.mark.parametrize("count", [0, 7, 1_000])
def test_a_constant_stream_never_rings(count: int) -> None:
    # The first run is no shift: with it taken in, every constant stream rang at its third count.
    advanced = folded([count] * 60, Rule(threshold=0.5, fewest_counts=1))
    assert advanced.announcements == ()
    assert max(p.recent_shift for p in said(advanced)) < 0.4


@pytest.mark.parametrize("odd", [0, 6_000, 500_000])
def test_a_single_odd_count_does_not_ring(odd: int) -> None:
    counts = noisy(np.random.default_rng(17), 120.0, 20.0, 90)
    counts[60] = odd
    advanced = folded(counts, Rule())
    assert advanced.announcements == ()
    assert said(advanced)[60].one_off > 0.5
    # And the level is where it was.
    assert said(advanced)[63].level.mid == pytest.approx(said(advanced)[59].level.mid, rel=0.1)


def test_too_few_counts_are_silent() -> None:
    counts = [1_000, 1_020, 985, 1_010, 990, 100, 103, 98, 101, 99]
    patient = folded(counts, Rule(threshold=0.5, fewest_counts=11))
    hasty = folded(counts, Rule(threshold=0.5, fewest_counts=1))
    assert patient.announcements == ()
    assert [a.start_position for a in hasty.announcements] == [5]
    # The probability itself is stated all the same, until the hasty rule has told.
    announced = hasty.announcements[0].position
    assert [p.recent_shift for p in said(patient)[: announced + 1]] == [
        p.recent_shift for p in said(hasty)[: announced + 1]
    ]


# When it rings


def test_one_shift_rings_once() -> None:
    rng = np.random.default_rng(5)
    counts = noisy(rng, 1_000.0, 12.0, 80) + noisy(rng, 350.0, 12.0, 80)
    advanced = folded(counts, Rule())
    (alert,) = advanced.announcements
    assert abs(alert.start_position - 80) <= 2
    assert alert.start_position in alert.region
    assert alert.probability == said(advanced)[alert.position].recent_shift >= 0.9
    assert alert.level_before == said(advanced)[alert.start_position - 1].level
    assert alert.level_after.low < 350.0 < alert.level_after.high
    assert alert.level_before.low < 1_000.0 < alert.level_before.high


def test_after_an_announcement_mass_beside_it_does_not_count() -> None:
    rng = np.random.default_rng(6)
    advanced = folded(noisy(rng, 1_000.0, 12.0, 60) + noisy(rng, 100.0, 12.0, 20), Rule(lasting=3))
    (alert,) = advanced.announcements
    # Runs that start later than the announcing count reach length 3 with the third count after it.
    after = [p.recent_shift for p in said(advanced)[alert.position + 1 :]]
    assert after[:2] == [0.0, 0.0]
    assert max(after) < 0.5


def test_two_falls_ring_twice() -> None:
    rng = np.random.default_rng(7)
    parts = ((1_000.0, 60), (400.0, 50), (140.0, 50))
    counts = [x for level, size in parts for x in noisy(rng, level, 12.0, size)]
    starts = [alert.start_position for alert in folded(counts, Rule()).announcements]
    assert len(starts) == 2
    assert abs(starts[0] - 60) <= 2
    assert abs(starts[1] - 110) <= 2


def test_a_fall_soon_after_a_fall_that_was_told_rings_again() -> None:
    rng = np.random.default_rng(8)
    parts = ((2_000.0, 60), (400.0, 15), (60.0, 30))
    counts = [x for level, size in parts for x in noisy(rng, level, 25.0, size)]
    starts = [alert.start_position for alert in folded(counts, Rule()).announcements]
    assert len(starts) == 2
    assert abs(starts[1] - 75) <= 1


def test_positions_are_the_axis_and_not_the_number_of_the_count() -> None:
    rng = np.random.default_rng(9)
    counts = noisy(rng, 900.0, 20.0, 50) + noisy(rng, 200.0, 20.0, 15)
    observations = [Observation(1_000 + 7 * i, x) for i, x in enumerate(counts)]
    (alert,) = advance(start(Model()), observations, Rule()).announcements
    assert alert.start_position == 1_000 + 7 * 50
    assert (alert.position - 1_000) % 7 == 0
    assert all((position - 1_000) % 7 == 0 for position in alert.region)


# The floor


@pytest.mark.parametrize("gap", [GapPrior(1, 100.0), GapPrior(2, 150.0), GapPrior(3, 60.0)], ids=str)
def test_floor_is_the_chance_that_a_renewal_process_was_renewed_lately(gap: GapPrior) -> None:
    # By simulation of the gap prior alone: an equilibrium age, here the age at a far-off moment.
    rng = np.random.default_rng(12)
    rule = Rule(window=40, lasting=3)
    runs, moment = 4_000, 2_000
    ends = np.cumsum(
        rng.negative_binomial(gap.shape, gap.p, (runs, int(6 * moment / gap.mean))) + gap.shape, axis=1
    )
    assert (ends[:, -1] > moment).all()
    born = np.where(ends <= moment, ends, 0).max(axis=1)
    length = moment - born + 1
    share = float(np.mean((length >= rule.lasting) & (length <= rule.window)))
    floor = prior_floor(gap, rule)
    assert share == pytest.approx(floor, abs=4.0 * math.sqrt(floor * (1.0 - floor) / runs))


def test_floor_is_what_the_filter_says_when_counts_say_nothing() -> None:
    # An exposure known to within a factor of thousands leaves every level as likely as any other. What little
    # mass the jump prior throws beyond the ends of the level grid is lost: hence the tolerance.
    gap, rule = GapPrior(2, 60.0), Rule(window=30, lasting=3)
    model = Model(gap=gap, one_off_share=0.0, dispersions=(4.0,), wanders=((0.0, 1.0),))
    silent = [Observation(i, 0, 1.0, 1e4) for i in range(200)]
    posterior = advance(start(model), silent, rule).posteriors[-1]
    assert posterior is not None
    assert posterior.recent_shift == pytest.approx(prior_floor(gap, rule), rel=0.05)


# The region


@given(
    st.lists(
        st.tuples(st.integers(0, 200), st.floats(1e-6, 1.0)),
        min_size=1,
        max_size=12,
        unique_by=lambda pair: pair[0],
    ),
    st.floats(0.05, 0.99),
)
@settings(max_examples=150, deadline=None)
def test_region_is_the_smallest_set_that_holds_the_share(
    pairs: list[tuple[int, float]], share: float
) -> None:
    positions, mass = (np.array(column) for column in zip(*pairs, strict=True))
    got = region(positions, mass, share)
    assert list(got) == sorted(set(got))
    total = math.fsum(mass)
    held = math.fsum(m for p, m in pairs if p in got)
    assert held >= share * total * (1.0 - 1e-9)
    one_fewer = math.fsum(sorted(mass.tolist())[mass.size - len(got) + 1 :]) if len(got) > 1 else 0.0
    assert one_fewer < share * total * (1.0 + 1e-9)


def test_region_of_equals_takes_the_later_ones() -> None:
    assert region(np.array([1, 2, 3, 4]), np.full(4, 0.25), 0.5) == (3, 4)


def test_region_may_have_holes() -> None:
    # Hyndman (1996), Computing and graphing highest density regions, American Statistician 50, 120-126: such
    # a set need not be an interval.
    assert region(np.array([5, 6, 7, 8]), np.array([0.5, 0.02, 0.08, 0.4]), 0.9) == (5, 8)


@pytest.mark.parametrize(
    ("field", "value"),
    [("threshold", 0.0), ("threshold", 1.0), ("lasting", 0), ("lasting", 41), ("fewest_counts", 0)],
)
def test_unusable_rules(field: str, value: float) -> None:
    with pytest.raises(UnusableParameter, match=field):
        Rule(**{field: value})


def test_a_window_longer_than_the_exact_run_lengths_is_refused() -> None:
    with pytest.raises(UnusableParameter, match="window must be at most exact_run_length, 40; got 41"):
        folded([1, 2, 3], Rule(window=41))
