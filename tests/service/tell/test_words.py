"""The sentences, word for word, over a table of situations (all invented)."""

import datetime
import math
from collections.abc import Callable
from dataclasses import replace

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from detectors.posterior import Quantiles
from service.tell.alert_body import alert_body
from service.tell.plain import LONGEST_TITLE, plain, plain_or_none
from service.tell.story import Marker, ShiftStory
from service.tell.words import CAUTION, probability_words, sentence

Week = Callable[[int], Marker]
SINCE = "most probably from 2026-03-02 (90 %: between 2026-02-23 and 2026-03-09)"
SURE = "probability of a recent shift 0.96."


@pytest.mark.parametrize(
    ("before", "after", "words"),
    [
        ((1010, 1047, 1085), (590, 636, 690), "fell by about 39 %, from about 1,050 to about 640"),
        ((800, 1047, 1400), (450, 636, 880), "fell by about 40 %, from about 1,000 to about 600"),
        ((90, 100, 110), (118, 130, 140), "rose by about 30 %, from about 100 to about 130"),
        ((2.2, 2.7, 3.3), (0.3, 0.4, 0.55), "fell by about 85 %, from about 2.7 to about 0.40"),
        ((0.2, 0.4, 0.8), (2.1, 3.0, 4.1), "rose to about 8 times what it was, from about 0.4 to about 3.0"),
        (
            (8, 12, 17),
            (1000, 1080, 1190),
            "rose to about 90 times what it was, from about 12 to about 1,080",
        ),
        (
            (0.7, 1, 1.5),
            (900, 1000, 1100),
            "rose to about 1,000 times what it was, from about 1.0 to about 1,000",
        ),
        ((1000, 1100, 1200), (2, 4, 8), "fell by more than 99 %, from about 1,100 to about 4"),
        ((900, 1000, 1100), (20, 33, 44), "fell by about 97 %, from about 1,000 to about 35"),
        # Levels known from above only: the lowest that is told apart is 0.01.
        ((1000, 1050, 1100), (0.011, 0.21, 1.04), "fell from about 1,050 to under 1.1"),
        ((0.012, 0.2, 1.1), (55_000, 60_000, 66_000), "rose from under 1.1 to about 60,000"),
        ((0.02, 0.2, 1.2), (3, 5, 8), "rose from under 1.2 to about 5"),
        ((4, 5, 7), (0.01, 0.03, 0.12), "fell from about 5.0 to under 0.12"),
        ((0.01, 0.05, 0.3), (0.012, 0.02, 0.07), "moved from under 0.30 to under 0.070"),
        ((0.03, 0.04, 0.05), (0.015, 0.06, 0.3), "moved from about 0.040 to under 0.30"),
        ((900, 1000, 1100), (0.02, 8, 995), "fell from about 1,000 to under 1,000"),
        ((1000, 1050, 1100), (0, 0, 0), "fell from about 1,050 to under 0.010"),
        ((0, 0, 0), (3, 5, 8), "rose from under 0.010 to about 5"),
        ((4, 5, 7), (0.021, 0.05, 0.12), "fell by about 99 %, from about 5.0 to about 0.05"),
        ((2, 10, 40), (5, 30, 80), "rose to about 3 times what it was, from about 10 to about 30"),
        ((100, 100, 100), (100, 100, 100), "moved by less than 1 %, from about 100 to about 100"),
        ((math.nan, math.nan, math.nan), (1, 2, 3), "moved, from unknown to about 2.0"),
    ],
)
def test_how_much_it_moved(
    story: ShiftStory, before: tuple[float, ...], after: tuple[float, ...], words: str
) -> None:
    moved = replace(story, level_before=Quantiles(*before), level_after=Quantiles(*after))
    assert sentence(moved) == f"Evening Walks: the filtered level {words} counts per week, {SINCE}; {SURE}"


def test_a_region_of_one_place_is_not_named_twice(story: ShiftStory) -> None:
    assert f"most probably from 2026-03-02; {SURE}" in sentence(replace(story, region=(story.start,)))


def test_a_region_with_gaps_is_not_given_as_one_span(story: ShiftStory, weeks: Week) -> None:
    apart = replace(story, region=tuple(weeks(n) for n in (-9, -2, -1, 1)))
    assert "(90 %: 2025-12-22, or between 2026-02-09 and 2026-02-16, or 2026-03-02)" in sentence(apart)


def test_a_region_in_many_pieces_says_how_many(story: ShiftStory, weeks: Week) -> None:
    apart = replace(story, region=tuple(weeks(n) for n in (-9, -7, -5, -3, 1)))
    assert "(90 %: in one of 5 stretches between 2025-12-22 and 2026-03-02)" in sentence(apart)


def marker(at: datetime.date, position: int, title: str | None = None) -> Marker:
    return Marker(at.isoformat(), at, title, position)


def test_months_and_years_are_as_long_as_they_need(story: ShiftStory) -> None:
    march = marker(datetime.date(2026, 3, 1), 30)
    april = marker(datetime.date(2026, 4, 1), 31)
    monthly = replace(story, unit="month", start=march, region=(march, april))
    assert "counts per month, most probably from 2026-03 (90 %: between 2026-03 and 2026-04)" in sentence(
        monthly
    )
    year = marker(datetime.date(1891, 1, 1), 40)
    assert "counts per year, most probably from 1891;" in sentence(
        replace(story, unit="year", start=year, region=(year,))
    )


def test_hours_keep_their_offset(story: ShiftStory) -> None:
    zone = datetime.timezone(datetime.timedelta(hours=1))
    at = datetime.datetime(2026, 3, 2, 14, 0, tzinfo=zone)
    hour = Marker(at.isoformat(timespec="minutes"), at, None, 5)
    hourly = replace(story, unit="hour", start=hour, region=(hour,))
    assert "counts per hour, most probably from 2026-03-02T14:00+01:00;" in sentence(hourly)


def test_releases_are_named_by_title_and_date(story: ShiftStory) -> None:
    first = marker(datetime.date(2026, 3, 2), 117, "Low Tide")
    second = marker(datetime.date(2026, 3, 9), 118, "The Weir")
    shows = replace(story, shape="release", unit="release", start=second, region=(first, second))
    assert (
        'counts per release, most probably from "The Weir" of 2026-03-09 '
        "(90 %: between 2026-03-02 and 2026-03-09)"
    ) in sentence(shows)


def test_an_unknown_unit_is_not_guessed(story: ShiftStory) -> None:
    assert "counts per interval, most" in sentence(replace(story, unit=None))


def test_a_late_alert_says_so(story: ShiftStory) -> None:
    late = replace(story, late=True, readable_utc=datetime.datetime(2026, 3, 23, tzinfo=datetime.UTC))
    assert sentence(late).endswith(
        "0.96. This alert is late: its last count was complete at 2026-03-23 00:00 UTC "
        "but was only read by 2026-03-23 06:00 UTC."
    )
    assert sentence(replace(late, readable_utc=None)).endswith(
        "This alert is late: the counts were there before they were read, at 2026-03-23 06:00 UTC."
    )
    assert "late" not in sentence(story)


@pytest.mark.parametrize(
    ("probability", "words"),
    [
        (0.9, "0.90"),
        (0.9634, "0.96"),
        (0.9949, "0.99"),
        (0.9966, "0.9966"),
        (0.99996, "above 0.9999"),
        (1.0, "1.00"),
        (math.nan, "unknown"),
    ],
)
def test_a_probability_never_reads_as_more_than_it_is(probability: float, words: str) -> None:
    assert probability_words(probability) == f"probability of a recent shift {words}"


@pytest.mark.parametrize(
    ("title", "shown"),
    [
        ("Evening\r\nWalks", "Evening Walks"),
        ("  Evening \t Walks\x00\x1b[31m", "Evening Walks [31m"),
        ("Walks\u2028and\u2029talks\x85here", "Walks and talks here"),
        ("sklaW\u202e gninevE\u202c", "sklaW gninevE"),
        ("<script>alert(1)</script>", "<script>alert(1)</script>"),
        ("=cmd()", "=cmd()"),
        ("half \ud800 pair", "half \ufffd pair"),
        ("夜の散歩 👩‍👧", "夜の散歩 👩‍👧"),
        ("x" * 500, "x" * (LONGEST_TITLE - 3) + "..."),
    ],
)
def test_titles_stay_on_one_line_and_change_nothing_around_them(title: str, shown: str) -> None:
    assert plain(title) == shown


def test_a_title_with_nothing_to_see_gives_way_to_the_id(story: ShiftStory) -> None:
    assert sentence(replace(story, title="\n\u202e")).startswith("walks: the filtered level")
    assert plain_or_none("\n") is None
    assert plain_or_none(None) is None


def test_the_caution_names_no_cause() -> None:
    assert CAUTION == (
        "A date in common is not a cause; look at what else changed then before deciding anything about "
        "people's work."
    )


LEVELS = st.floats(0, allow_subnormal=True) | st.just(math.nan) | st.floats(0, 2000)
QUANTILES = st.tuples(LEVELS, LEVELS, LEVELS).map(lambda three: Quantiles(*sorted(three)))


@given(QUANTILES, QUANTILES, st.floats(), st.text(), st.text(max_size=8))
@example(Quantiles(0.0, 1.0, 1.7e308), Quantiles(1.797e308, 1.797e308, 1.797e308), 0.9, "", "")
@example(Quantiles(0.0, 1.0, 1.797e308), Quantiles(0.01, 5e-324, 0.0), 0.9, "", "")
def test_no_figure_and_no_title_breaks_a_sentence(before, after, probability, title, release) -> None:
    first = Marker("a", datetime.date(2026, 3, 2), release, 7)
    told = ShiftStory(
        shift_id="shift_1",
        stream_id="walks",
        title=title,
        slate=None,
        shape="release",
        unit="release",
        level_before=before,
        level_after=after,
        probability=probability,
        start=first,
        region=(first,),
        announced=first,
        announced_utc=datetime.datetime(2026, 3, 23, tzinfo=datetime.UTC),
        readable_utc=None,
        counts_since=None,
        late=False,
        settings="f1",
        reading_id=None,
    )
    words = sentence(told)
    assert "the filtered level " in words
    assert len(words.splitlines()) == 1
    assert not any(
        wrong in words.removeprefix(plain(title)) for wrong in ("nan ", "inf ", "e+", "-0 ", "100 %")
    )
    alert_body(told, "msg_1", told.announced_utc).decode("utf-8")
