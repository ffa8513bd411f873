"""What one count of a calendar stream covers, as a calendar value: a day is not 24 hours."""

import re
from dataclasses import dataclass
from typing import Literal, get_args

Unit = Literal["hour", "day", "week", "month", "year"]

NEEDED = '"hour", "day", "week", "month", "year", or a number of days such as "3 days"'
MOST_DAYS = 3660

_DAYS = re.compile(r"([1-9][0-9]{0,3}) days?", re.ASCII)


@dataclass(frozen=True, slots=True)
class Interval:
    """So many units of the calendar; only days come in numbers other than one."""

    unit: Unit
    count: int = 1

    def __post_init__(self) -> None:
        if not 1 <= self.count <= (MOST_DAYS if self.unit == "day" else 1):
            raise ValueError(f"expected {NEEDED}, at most {MOST_DAYS} days; got {self.count} {self.unit}")

    def __str__(self) -> str:
        return self.unit if self.count == 1 else f"{self.count} days"


def parse_interval(text: str) -> Interval:
    """The interval of that name; the text of an interval gives it back.

    Raises
    ------
    ValueError
        If the text names none.
    """
    for unit in get_args(Unit):
        if text == unit:
            return Interval(unit)
    days = _DAYS.fullmatch(text)
    if days is None:
        raise ValueError(f"expected {NEEDED}; got {text!r}")
    return Interval("day", int(days[1]))
