"""What holds for one stream, and when its history must be computed again."""

import datetime
import math
from collections.abc import Callable

import pytest

from config.settings import Settings
from config.streams import Calendar, Releases, StreamSettings, fingerprint, stream_settings

Load = Callable[..., Settings]

SLATE = """
[service]
zone = "Europe/Lisbon"
[judgement]
threshold = 0.8
window = 30
[model]
mean_gap = 200
dispersions = [1, 16, "poisson"]
[[source]]
name = "plays"
kind = "csv"
path = "counts.csv"
leave_out = ["Trailers"]
[source.fields]
at = "day"
count = "plays"
split = "show"
[source.streams]
shape = "calendar"
interval = "14 days"
anchor = 2026-03-02
absent = "missing"
settling = "6h"
slate = "Lampwick House"
title = "{split} ({source})"
[source.streams.judgement]
threshold = 0.95
[source.streams.model]
smallest_shift = 0.3
[source.stream."Evening Walks"]
title = "Walks in the {evening}"
slate = "Mornings"
[source.stream."Evening Walks".judgement]
lasting = 5
[source.stream."Evening Walks".model]
wanders = [[0.0, 1], [0.05, 0.5]]
"""


def stream(settings: Settings, split: str | None = "The Ferry Clerk") -> StreamSettings:
    found = stream_settings(settings, settings.sources[0], split)
    assert found is not None
    return found


def test_one_block_serves_every_split_value(load: Load) -> None:
    settings = load(SLATE)
    found = [stream(settings, f"Show {number}") for number in range(40)]
    assert {one.id for one in found} == {f"plays/Show {number}" for number in range(40)}
    assert found[7].title == "Show 7 (plays)"
    assert len({fingerprint(one) for one in found}) == 1


def test_a_stream_has_what_the_template_and_all_above_it_say(load: Load) -> None:
    found = stream(load(SLATE))
    assert (found.id, found.source, found.split) == ("plays/The Ferry Clerk", "plays", "The Ferry Clerk")
    assert (found.title, found.slate, found.zone) == (
        "The Ferry Clerk (plays)",
        "Lampwick House",
        "Europe/Lisbon",
    )
    assert found.shape == Calendar(
        "14 days", datetime.date(2026, 3, 2), "missing", datetime.timedelta(hours=6)
    )
    assert (found.judgement.threshold, found.judgement.window, found.judgement.lasting) == (0.95, 30, 3)
    assert (found.model.mean_gap, found.model.smallest_shift, found.model.gap_shape) == (200.0, 0.3, 2)
    assert found.model.dispersions == (1.0, 16.0, math.inf)
    assert found.model.wanders is None


def test_what_is_said_of_one_stream_comes_last(load: Load) -> None:
    found = stream(load(SLATE), "Evening Walks")
    assert (found.title, found.slate) == ("Walks in the {evening}", "Mornings")
    assert (found.judgement.threshold, found.judgement.lasting) == (0.95, 5)
    assert found.model.wanders == ((0.0, 1.0), (0.05, 0.5))
    assert found.model.smallest_shift == 0.3


def test_a_split_value_that_is_left_out_is_no_stream(load: Load) -> None:
    settings = load(SLATE)
    assert stream_settings(settings, settings.sources[0], "Trailers") is None


def test_a_source_without_a_split_is_one_stream(load: Load) -> None:
    text = """
        [[source]]
        name = "letters"
        kind = "csv"
        path = "letters.csv"
        zone = "Asia/Kolkata"
        [source.fields]
        at = "sent"
        count = "opens"
        release = "issue"
        [source.streams]
        shape = "release"
        final = "7d"
    """
    found = stream(load(text), None)
    assert (found.id, found.title, found.slate, found.zone) == ("letters", "letters", None, "Asia/Kolkata")
    assert found.shape == Releases(datetime.timedelta(days=7))


CHANGES = {
    "threshold": ("threshold = 0.95", "threshold = 0.96"),
    "window": ("window = 30", "window = 31"),
    "mean gap": ("mean_gap = 200", "mean_gap = 200.5"),
    "smallest shift": ("smallest_shift = 0.3", "smallest_shift = 0.31"),
    "dispersions": ('16, "poisson"', "16"),
    "interval": ('"14 days"', '"15 days"'),
    "anchor": ("2026-03-02", "2026-03-03"),
    "absent": ('"missing"', '"zero"'),
    "settling": ('"6h"', '"7h"'),
    "zone": ("Europe/Lisbon", "Europe/Berlin"),
}


@pytest.mark.parametrize(("old", "new"), CHANGES.values(), ids=CHANGES)
def test_the_fingerprint_follows_what_changes_the_posterior(load: Load, old: str, new: str) -> None:
    assert old in SLATE
    assert fingerprint(stream(load(SLATE))) != fingerprint(stream(load(SLATE.replace(old, new))))


SAME = {
    "title": ("{split} ({source})", "{split}"),
    "slate": ("Lampwick House", "Lampwick Nights"),
    "how often": ('path = "counts.csv"', 'path = "counts.csv"\nevery = "15m"'),
    "where": ("counts.csv", "other.csv"),
    "another stream's": ("lasting = 5", "lasting = 6"),
    "an overridden value": ("threshold = 0.8", "threshold = 0.7"),
    "the same number": ("mean_gap = 200", "mean_gap = 200.0"),
    "the same interval": ('"14 days"', '"14  Days"'),
    "the same duration": ('"6h"', '"360m"'),
}


@pytest.mark.parametrize(("old", "new"), SAME.values(), ids=SAME)
def test_the_fingerprint_follows_nothing_else(load: Load, old: str, new: str) -> None:
    assert old in SLATE
    assert fingerprint(stream(load(SLATE))) == fingerprint(stream(load(SLATE.replace(old, new))))


def test_the_fingerprint_of_releases_follows_their_final_age(load: Load) -> None:
    release = SLATE.replace('split = "show"', 'split = "show"\nrelease = "id"')
    for line in (
        'interval = "14 days"\n',
        "anchor = 2026-03-02\n",
        'absent = "missing"\n',
        'settling = "6h"\n',
    ):
        release = release.replace(line, "")
    release = release.replace('"calendar"', '"release"\nfinal = "7d"')
    week, fortnight = stream(load(release)), stream(load(release.replace('"7d"', '"2w"')))
    assert len({fingerprint(week), fingerprint(fortnight), fingerprint(stream(load(SLATE)))}) == 3


def test_a_fingerprint_is_32_hexadecimal_digits_and_stays(load: Load) -> None:
    # The second is what this program said when the test was written: it must not change by accident, since
    # every stream would be computed again.
    found = fingerprint(stream(load(SLATE)))
    assert (len(found), int(found, 16) >= 0) == (32, True)
    assert found == "332d24c1c96901be315746a8b7b7eaee"
