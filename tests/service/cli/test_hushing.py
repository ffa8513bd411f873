"""When a hush ends."""

import datetime
from zoneinfo import ZoneInfo

import pytest

from service.cli.errors import WrongUse
from service.cli.hushing import end_of_hush

BERLIN = ZoneInfo("Europe/Berlin")
NOW = datetime.datetime(2026, 3, 2, 12, 0, tzinfo=datetime.UTC)


def test_a_day_is_its_beginning_in_the_zone() -> None:
    ends = end_of_hush(datetime.date(2026, 4, 1), False, NOW, BERLIN)
    assert ends == datetime.datetime(2026, 3, 31, 22, 0, tzinfo=datetime.UTC)


def test_an_instant_without_a_zone_is_read_in_the_zone() -> None:
    naive = datetime.datetime(2026, 4, 1, 8, 0)  # noqa: DTZ001 - as a person types it
    assert end_of_hush(naive, False, NOW, BERLIN) == datetime.datetime(2026, 4, 1, 6, 0, tzinfo=datetime.UTC)


def test_lifting() -> None:
    assert end_of_hush(None, True, NOW, BERLIN) is None


@pytest.mark.parametrize(
    ("until", "lift"),
    [(None, False), (datetime.date(2026, 4, 1), True), (datetime.date(2026, 3, 2), False)],
)
def test_what_makes_no_sense_is_refused(until: datetime.date | None, lift: bool) -> None:
    with pytest.raises(WrongUse):
        end_of_hush(until, lift, NOW, BERLIN)
