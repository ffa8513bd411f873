"""Retry-After, RFC 9110 sections 5.6.7 and 10.2.3. The dates and their epochs: check values quoted beside."""

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.outlets.retry_after import retry_after_seconds

# RFC 9110, section 5.6.7: one instant in the three forms; its epoch recomputed independently.
SAME_INSTANT = (
    "Sun, 06 Nov 1994 08:49:37 GMT",
    "Sunday, 06-Nov-94 08:49:37 GMT",
    "Sun Nov  6 08:49:37 1994",
)
EPOCH = 784111777


@pytest.mark.parametrize("text", SAME_INSTANT)
def test_all_three_forms_of_a_date_are_read(text: str):
    assert retry_after_seconds(text, datetime.fromtimestamp(EPOCH - 90, UTC)) == 90.0


def test_a_date_is_utc_whatever_the_zone_of_now():
    now = datetime.fromtimestamp(EPOCH - 90, UTC).astimezone(ZoneInfo("Asia/Kolkata"))
    assert retry_after_seconds(SAME_INSTANT[2], now) == 90.0


def test_the_examples_of_the_rfc():
    # RFC 9110, section 10.2.3 (examples from memory; epoch 946684799 recomputed).
    now = datetime.fromtimestamp(946684799, UTC) - timedelta(hours=2)
    assert retry_after_seconds("Fri, 31 Dec 1999 23:59:59 GMT", now) == 7200.0
    assert retry_after_seconds("120", now) == 120.0


@pytest.mark.parametrize("text", SAME_INSTANT)
def test_a_moment_that_has_passed_is_now(text: str):
    assert retry_after_seconds(text, datetime(2026, 3, 16, tzinfo=UTC)) == 0.0


@pytest.mark.parametrize(
    "text",
    [
        None,
        "",
        "soon",
        "-5",
        "1.5",
        "\u00b2",
        "\u0663",
        "Sun, 06 Nov 99999 08:49:37 GMT",
        "\x00",
        "Sun, 99 Zzz 1994 08:49:37 GMT",
    ],
)
def test_what_cannot_be_read_says_nothing(text: str | None):
    assert retry_after_seconds(text, datetime(2026, 3, 16, tzinfo=UTC)) is None


def test_an_endless_number_is_only_large():
    assert retry_after_seconds("9" * 5000, datetime(2026, 3, 16, tzinfo=UTC)) > 1e9


@given(
    st.text(max_size=60)
    | st.from_regex(r"[A-Z][a-z]{2}, [0-9]{1,3} [A-Z][a-z]{2} [0-9]{1,6} [0-9:]{1,9} GMT")
)
def test_no_text_does_harm(text: str):
    seconds = retry_after_seconds(text, datetime(2026, 3, 16, tzinfo=UTC))
    assert seconds is None or seconds >= 0.0
