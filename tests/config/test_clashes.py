"""What is said of settings that do not go together."""

from collections.abc import Callable

import pytest

Faults = Callable[..., list[str]]

STREAMS = '[source.streams]\nshape = "calendar"\ninterval = "day"\nabsent = "zero"\n'
FIELDS = '[source.fields]\nat = "day"\ncount = "plays"\n'
SPLIT = FIELDS + 'split = "show"\n'
HEAD = '[[source]]\nname = "plays"\nkind = "csv"\npath = "counts.csv"\n'
GOOD = HEAD + FIELDS + STREAMS
FILE = "knickpoint.toml: "
PLAYS = FILE + 'source[1] "plays" . '


CLASHES = {
    "release without its id": (
        HEAD + FIELDS + '[source.streams]\nshape = "release"\nfinal = "7d"\n',
        PLAYS + 'fields . release: needed a place of the release\'s id, for shape = "release"; got nothing.',
    ),
    "two places": (
        HEAD + 'address = "https://counts.example/"\n' + FIELDS + STREAMS,
        PLAYS + "path: needed either a path or an address; got both.",
    ),
    "no place": (
        GOOD.replace('path = "counts.csv"\n', ""),
        PLAYS + "path: needed either a path or an address; got neither.",
    ),
    "the same name": (
        GOOD + GOOD,
        FILE
        + 'source[2] "plays" . name: needed a name that no other source has; got the name of an earlier one.',
    ),
    "lasting beyond window": (
        "[judgement]\nlasting = 41\n" + GOOD,
        FILE + "judgement . lasting: needed lasting to be at most the window; got lasting 41 with window 40.",
    ),
    "lasting beyond the window further up": (
        "[judgement]\nwindow = 10\n"
        + HEAD
        + SPLIT
        + STREAMS
        + '[source.stream."Evening Walks".judgement]\nlasting = 11\n',
        PLAYS + 'stream . "Evening Walks" . judgement . lasting: needed lasting to be at most the window; '
        "got lasting 11 with window 10.",
    ),
    "gap shape beyond mean": (
        GOOD + "[source.streams.model]\nmean_gap = 1.5\n",
        PLAYS + "streams . model . mean_gap: needed gap_shape to be at most mean_gap; "
        "got gap_shape 2 with mean_gap 1.5.",
    ),
    "leave_out without split": (
        HEAD + 'leave_out = ["Trailers"]\n' + FIELDS + STREAMS,
        PLAYS
        + "leave_out: needed fields . split, which says whose a row is; got split values without a split.",
    ),
    "left out and changed": (
        HEAD + 'leave_out = ["Trailers"]\n' + SPLIT + STREAMS + "[source.stream.Trailers]\n",
        PLAYS + "stream . Trailers: needed a split value that is not left out; got one of leave_out.",
    ),
    "title of a split without a split": (
        GOOD + 'title = "{split}"\n',
        PLAYS
        + "streams . title: needed fields . split, which says whose a row is; got {split} without a split.",
    ),
    "anchor without days": (
        GOOD + "anchor = 2026-03-02\n",
        PLAYS + 'streams . anchor: needed none, or an interval such as "14 days"; '
        'got an anchor for interval = "day".',
    ),
    "slate that nobody has": (
        GOOD + 'slate = "Lampwick House"\n[[outlet]]\nname = "desk"\nkind = "webhook"\n'
        'address = { env = "A" }\nsecret = { env = "S" }\nslates = ["Lampwick Hose"]\n',
        FILE + 'outlet[1] "desk" . slates[1]: needed a slate that a source names: Lampwick House; '
        'got "Lampwick Hose". Did you mean "Lampwick House"?',
    ),
}
ENVIRON = {"A": "https://desk.example/in", "S": "whsec_" + "A" * 32}


@pytest.mark.parametrize(("text", "line"), CLASHES.values(), ids=CLASHES)
def test_what_does_not_go_together_is_one_fault(faults: Faults, text: str, line: str) -> None:
    assert faults(text, ENVIRON) == [line]


def test_a_faulty_value_hides_no_clash(faults: Faults) -> None:
    lines = faults("[judgement]\nlasting = 41\nthreshold = 7\n" + GOOD + GOOD, ENVIRON)
    assert [line.removeprefix(FILE).partition(": ")[0] for line in lines] == [
        "judgement . threshold",
        'source[2] "plays" . name',
        "judgement . lasting",
    ]


def test_a_changed_window_that_still_holds_lasting_is_no_fault(load: Callable[[str], object]) -> None:
    more = (
        '[source.streams.judgement]\nwindow = 50\n[source.stream."Evening Walks".judgement]\nlasting = 50\n'
    )
    assert load(HEAD + SPLIT + STREAMS + more)
