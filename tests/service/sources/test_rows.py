"""Raw values become counts, or a reason why not."""

import datetime
import math
import uuid
from decimal import Decimal
from fractions import Fraction
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.sources.document import KeptOut, Row
from service.sources.instants import read_at
from service.sources.numbers import LARGEST_COUNT, read_count, read_exposure
from service.sources.rows import LONGEST_TEXT, RowRules, Sifted, keep_out_conflicts, understand
from service.sources.values import Several, UnusableValue, read_identity, read_title

BERLIN = ZoneInfo("Europe/Berlin")
NEW_YORK = ZoneInfo("America/New_York")
RULES = RowRules(BERLIN)
DAY = datetime.date(2026, 3, 2)


@pytest.mark.parametrize(
    ("raw", "count"),
    [
        (12, 12),
        (12.0, 12),
        ("12", 12),
        (" 12 ", 12),
        ("12.0", 12),
        ("12.000000", 12),
        ("0.000", 0),
        ("+12", 12),
        ("012", 12),
        (-0.0, 0),
        ("-0", 0),
        (Decimal("12"), 12),
        (Decimal("1.2E+1"), 12),
        (2**53, 2**53),
        (str(2**53), 2**53),
        (2.0**52, 2**52),
        (None, None),
        ("", None),
        ("  ", None),
    ],
)
def test_counts(raw, count):
    got = read_count(raw)
    assert got == count
    assert type(got) is type(count)


@pytest.mark.parametrize(
    ("raw", "needed"),
    [
        (-1, "0 or more"),
        ("-3", "0 or more"),
        (-0.5, "0 or more"),
        (0.5, "a whole number"),
        ("0.5", "a whole number"),
        (Decimal("0.5"), "a whole number"),
        (Decimal("1E-999999"), "a whole number"),
        (True, "a whole number"),
        (False, "a whole number"),
        ("true", "a whole number, or empty"),
        (math.nan, "a finite number"),
        (math.inf, "a finite number"),
        (-math.inf, "a finite number"),
        (Decimal("NaN"), "a finite number"),
        (Decimal("sNaN"), "a finite number"),
        ("NaN", "a whole number, or empty"),
        (2**53 + 1, "at most 2^53"),
        (str(2**53 + 1), "at most 2^53"),
        (float(2**53), "at most 2^53"),
        (1e300, "at most 2^53"),
        pytest.param(10**5000, "at most 2^53", id="5001 digits"),
        (Decimal("1E+999999"), "at most 2^53"),
        ("9" * 30, "at most 2^53"),
        pytest.param("1" * 5000, "a whole number, or empty", id="text of 5000 digits"),
        ("1,234", "thousands separators"),
        ("1.234.567", "thousands separators"),
        ("1'234", "thousands separators"),
        ("12.000", "thousands separators"),
        ("1 234", "thousands separators"),
        ("1\u202f234", "thousands separators"),
        ("1,234.0", "thousands separators"),
        ("1e3", "without an exponent"),
        ("12,5", "a whole number, or empty"),
        ("0x10", "a whole number, or empty"),
        ("1_000", "thousands separators"),
        ("\u0661\u0662", "a whole number, or empty"),
        ("n/a", "a whole number, or empty"),
        ([1], "a whole number"),
        ({}, "a whole number"),
        (b"12", "a whole number"),
        (Several(2), "a whole number"),
    ],
)
def test_what_is_no_count(raw, needed):
    with pytest.raises(UnusableValue) as caught:
        read_count(raw)
    assert str(caught.value).startswith("count must be ")
    assert needed in str(caught.value)
    assert len(str(caught.value)) < 200


@given(st.integers() | st.floats() | st.decimals() | st.fractions().map(lambda f: f"{float(f)}"))
def test_a_count_is_exactly_its_number_or_refused(raw):
    """Against exact fractions: nothing is rounded, nothing whole and in range is lost."""
    try:
        count = read_count(raw)
    except UnusableValue:
        if isinstance(raw, str) or not (raw.is_finite() if isinstance(raw, Decimal) else math.isfinite(raw)):
            return
        exact = Fraction(raw)
        out_of_range = (
            exact < 0 or exact > LARGEST_COUNT or (isinstance(raw, float) and exact == LARGEST_COUNT)
        )
        assert out_of_range or exact.denominator != 1
    else:
        assert count is not None
        assert Fraction(raw) == count
        assert 0 <= count <= LARGEST_COUNT


@pytest.mark.parametrize(
    ("raw", "exposure"),
    [
        (1, 1.0),
        (0.25, 0.25),
        ("0.25", 0.25),
        ("2.5e-1", 0.25),
        (Decimal("0.25"), 0.25),
        (None, None),
        (" ", None),
    ],
)
def test_exposures(raw, exposure):
    assert read_exposure(raw) == exposure


@pytest.mark.parametrize(
    "raw",
    [
        0,
        -1,
        math.nan,
        math.inf,
        "0",
        "1e999",
        "1,5",
        True,
        "x",
        10**400,
        Decimal("1e-999999"),
        Decimal("sNaN"),
        [1],
    ],
)
def test_what_is_no_exposure(raw):
    with pytest.raises(UnusableValue, match="exposure must be"):
        read_exposure(raw)


@pytest.mark.parametrize(
    ("raw", "day"),
    [
        ("2026-03-02", DAY),
        ("20260302", DAY),
        (" 2026-03-02 ", DAY),
        ("2026-W10", DAY),
        ("2026W10", DAY),
        ("2026-W10-1", DAY),
        ("2026-03", datetime.date(2026, 3, 1)),
        ("1851", datetime.date(1851, 1, 1)),
        (DAY, DAY),
        # ISO 8601 weeks, recomputed with Python's own calendar (check: 1977-01-01 is 1976-W53-6).
        ("1976-W53-6", datetime.date(1977, 1, 1)),
        ("1980-W01-1", datetime.date(1979, 12, 31)),
        ("2009-W01-1", datetime.date(2008, 12, 29)),
        ("2004-W53-6", datetime.date(2005, 1, 1)),
    ],
)
def test_days(raw, day):
    got = read_at(raw, BERLIN)
    assert got == day
    assert type(got) is datetime.date


@pytest.mark.parametrize(
    ("raw", "utc"),
    [
        ("2026-03-02T14:00Z", "2026-03-02T14:00"),
        ("2026-03-02t14:00:00z", "2026-03-02T14:00"),
        ("2026-03-02 14:00:00+00:00", "2026-03-02T14:00"),
        ("2026-03-02T14:00+01:00", "2026-03-02T13:00"),
        ("20260302T140000Z", "2026-03-02T14:00"),
        ("2026-03-02T14:00:00.1234567891Z", "2026-03-02T14:00:00.123456"),
        ("2026-03-02T14:00", "2026-03-02T13:00"),
        ("2026-07-02T14:00", "2026-07-02T12:00"),
        (datetime.datetime(2026, 3, 2, 14), "2026-03-02T13:00"),  # noqa: DTZ001 - as a database gives it
    ],
)
def test_instants_are_aware(raw, utc):
    got = read_at(raw, BERLIN)
    assert isinstance(got, datetime.datetime)
    assert (
        got.astimezone(datetime.UTC).replace(tzinfo=None).isoformat()
        == datetime.datetime.fromisoformat(utc).isoformat()
    )


def test_times_that_clocks_skip_or_repeat():
    """RFC 5545 section 3.3.5: in a gap the offset before it, of two the first."""
    skipped, twice = (read_at(text, NEW_YORK) for text in ("2007-03-11T02:30", "2007-11-04T01:30"))
    assert skipped.astimezone(datetime.UTC).isoformat() == "2007-03-11T07:30:00+00:00"
    assert twice.astimezone(datetime.UTC).isoformat() == "2007-11-04T05:30:00+00:00"


@pytest.mark.parametrize(
    "raw",
    [
        None, "", "2026-13-01", "2026-02-30", "2026-W54", "02.03.2026", "3/2/2026", "2026-3-2", "yesterday",
        20260302, 1772409600, 1772409600.0, True, [], Several(2), "2026-03-02T25:00", "2026-03-02T14:00:60Z",
        "2026-03-02X14:00", "2026-03-02T", "2026-03-02T14:00 Europe/Berlin", "2026-03-02T14:00+25:00",
        "2026-060", "0001-01-01", "9999-12-31",
    ],
)  # fmt: skip
def test_what_is_no_date(raw):
    with pytest.raises(UnusableValue, match=r"^at must be .*; got "):
        read_at(raw, BERLIN)


@given(st.datetimes(datetime.datetime(1000, 1, 2), datetime.datetime(9000, 1, 1), timezones=st.timezones()))  # noqa: DTZ001
def test_an_instant_written_down_is_read_back(instant):
    if instant.utcoffset().seconds % 60 == 0:  # ISO 8601 has no seconds in an offset.
        assert read_at(instant.isoformat(), BERLIN) == instant.replace(
            tzinfo=datetime.timezone(instant.utcoffset())
        )


@given(st.text())
def test_any_text_is_a_date_or_refused_in_a_short_sentence(text):
    sentence = ""
    try:
        read = read_at(text, BERLIN)
    except UnusableValue as error:
        sentence = str(error)
    else:
        assert 1000 <= read.year <= 9000
    assert len(sentence) < 250


@pytest.mark.parametrize(
    ("raw", "identity"),
    [
        ("a", "a"),
        (" a b ", "a b"),
        (7, "7"),
        (uuid.UUID(int=5), str(uuid.UUID(int=5))),
        ("Füße \U0001f388", "Füße \U0001f388"),
    ],
)
def test_identities(raw, identity):
    assert read_identity(raw, "split") == identity


@pytest.mark.parametrize("raw", [None, "", " ", True, 1.5, [], "x" * 201, "a\nb", "a\x00", "\ud800", 10**300])
def test_what_is_no_identity(raw):
    with pytest.raises(UnusableValue, match="split must be"):
        read_identity(raw, "split")


def test_titles_never_cost_a_row():
    assert read_title(" Harbour\n\x00Lights \ud800") == "Harbour Lights"
    assert read_title(12) == "12"
    assert [read_title(raw) for raw in (None, "", "\n", [], {}, Several(3))] == [None] * 6
    assert len(read_title("x" * 10_000)) == 300


def test_a_row_with_everything():
    raw = {"at": "2026-03-02", "count": "5", "split": "s", "release": 3, "title": "T", "exposure": "0.5"}
    assert understand(raw, 4, RULES) == Row("s", DAY, 5, "3", "T", 0.5, number=4)


def test_a_field_that_was_asked_for_but_is_absent_keeps_the_row_out():
    assert understand({"at": "2026-03-02", "count": 1}, 1, RULES) == Row(None, DAY, 1)
    out = understand({"at": "2026-03-02", "count": 1, "split": None}, 9, RULES)
    assert out == KeptOut(
        9,
        "split must be a text or a whole number; got nothing.",
        'at: "2026-03-02", count: 1, split: nothing',
    )


raw_values = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text() | st.decimals() | st.binary(),
    lambda inner: st.lists(inner, max_size=2) | st.dictionaries(st.text(max_size=3), inner, max_size=2),
    max_leaves=3,
)
ALL_FIELDS = ("at", "count", "split", "release", "title", "exposure")


@given(st.fixed_dictionaries(dict.fromkeys(ALL_FIELDS, raw_values)))
def test_any_row_is_understood_or_kept_out_in_plain_characters(raw):
    got = understand(raw, 1, RULES)
    if isinstance(got, KeptOut):
        assert len(got.text) <= LONGEST_TEXT
        (got.why + got.text).encode()
        assert "\n" not in got.why + got.text
    else:
        assert got.count is None or 0 <= got.count <= LARGEST_COUNT


@given(st.integers(0, 300), st.integers(10, 600), st.sampled_from(ALL_FIELDS))
def test_no_part_of_a_secret_is_shown_wherever_a_text_is_cut(before, length, name):
    secret = "Q" * length
    rules = RowRules(BERLIN, (secret,))
    raw = {"at": "x", "count": "x", "split": "x", "release": "x", "title": "x", "exposure": "x"}
    got = understand({**raw, name: "x" * before + secret}, 1, rules)
    assert isinstance(got, KeptOut)
    assert "Q" not in got.why + got.text
    assert "Q" not in repr(rules)


def by_day(row):
    return (row.split, row.at)


def test_both_rows_of_a_key_with_different_values_are_kept_out():
    rows = [Row("a", DAY, 5, number=1), Row("b", DAY, 5, number=2), Row("a", DAY, 6, number=3)]
    sifted = keep_out_conflicts(rows, by_day)
    assert sifted.rows == (rows[1],)
    assert sifted.kept_out == (
        KeptOut(
            1,
            "its key comes again with other values (row 3); needed is one row a key.",
            'at: "2026-03-02", count: 5, split: "a"',
        ),
        KeptOut(
            3,
            "its key comes again with other values (row 1); needed is one row a key.",
            'at: "2026-03-02", count: 6, split: "a"',
        ),
    )


def test_the_same_row_twice_counts_once_and_a_title_is_no_value():
    rows = [Row("a", DAY, 5, title="A", number=1), Row("a", DAY, 5, title="B", number=2)]
    assert keep_out_conflicts(rows, by_day) == Sifted((rows[0],), ())


def test_a_missing_count_against_a_count_is_a_conflict():
    rows = [Row("a", DAY, None, number=1), Row("a", DAY, 5, number=2)]
    assert [out.row for out in keep_out_conflicts(rows, by_day).kept_out] == [1, 2]


def test_a_release_with_two_dates_is_a_conflict():
    rows = [Row("a", DAY, 5, "e1", number=1), Row("a", DAY + datetime.timedelta(1), 5, "e1", number=2)]
    assert len(keep_out_conflicts(rows, lambda row: row.release).kept_out) == 2


@given(st.lists(st.tuples(st.sampled_from("abc"), st.integers(0, 2))))
def test_sifting_against_a_plain_definition(pairs):
    rows = [Row(split, DAY, count, number=n) for n, (split, count) in enumerate(pairs, start=1)]
    sifted = keep_out_conflicts(rows, by_day)
    values = {split: {count for other, count in pairs if other == split} for split, _ in pairs}
    assert {(row.split, row.count) for row in sifted.rows} == {p for p in pairs if len(values[p[0]]) == 1}
    assert len(sifted.rows) == sum(len(counts) == 1 for counts in values.values())
    assert [out.row for out in sifted.kept_out] == [row.number for row in rows if len(values[row.split]) > 1]


def test_a_row_that_is_kept_out_still_says_whose_count_is_unknown():
    row = understand({"at": "2026-03-02", "count": "1,000", "split": "quay"}, 7, RULES)
    assert isinstance(row, KeptOut)
    assert row.place == Row("quay", DAY, None)
    for lost in ({"at": "2.3.26", "count": 5, "split": "quay"}, {"at": DAY, "count": 5, "split": None}):
        kept_out = understand(lost, 7, RULES)
        assert isinstance(kept_out, KeptOut)
        assert kept_out.place is None
