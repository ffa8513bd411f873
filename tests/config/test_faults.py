"""What is said of files that cannot be used."""

from collections.abc import Callable
from pathlib import Path

import pytest

from config.errors import SettingsFaults
from config.loading import load_settings

Faults = Callable[..., list[str]]

STREAMS = '[source.streams]\nshape = "calendar"\ninterval = "day"\nabsent = "zero"\n'
FIELDS = '[source.fields]\nat = "day"\ncount = "plays"\n'
SPLIT = FIELDS + 'split = "show"\n'
HEAD = '[[source]]\nname = "plays"\nkind = "csv"\npath = "counts.csv"\n'
GOOD = HEAD + FIELDS + STREAMS
FILE = "knickpoint.toml: "
PLAYS = FILE + 'source[1] "plays" . '
COLUMN_KEYS = "at, count, exposure, release, split, title"


JSON = (
    '[[source]]\nname = "plays"\nkind = "json"\naddress = "https://counts.example/"\nrows = "$.rows[*]"\n'
    '%s\n[source.fields]\nat = "$.day"\ncount = "$.plays"\n' + STREAMS
)

ONE_FAULT = {
    "unknown key, nearest named": (
        HEAD + FIELDS + 'splt = "show"\n' + STREAMS,
        PLAYS
        + f'fields . splt: needed one of the keys {COLUMN_KEYS}; got an unknown key. Did you mean "split"?',
    ),
    "unknown section": (
        "[judgment]\n" + GOOD,
        FILE + "judgment: needed one of the keys judgement, model, outlet, service, source; "
        'got an unknown key. Did you mean "judgement"?',
    ),
    "unknown key unlike any": (
        "[service]\nqqq = 1\n" + GOOD,
        FILE
        + "service . qqq: needed one of the keys database, good_rounds_address, log_form, log_level, stop_within, zone; "
        "got an unknown key.",
    ),
    "wrong type": (
        HEAD + '[source.fields]\nat = "day"\ncount = 5\n' + STREAMS,
        PLAYS + "fields . count: needed a column name in quotes; got 5.",
    ),
    "missing key": (
        HEAD + '[source.fields]\nat = "day"\n' + STREAMS,
        PLAYS + "fields . count: needed a column name in quotes; got nothing.",
    ),
    "out of bounds": (
        "[judgement]\nthreshold = 1.0\n" + GOOD,
        FILE + "judgement . threshold: needed a number above 0 and below 1; got 1.0.",
    ),
    "not a number": (
        "[model]\nmean_gap = nan\n" + GOOD,
        FILE + "model . mean_gap: needed a number from 1 to 1000000; got nan.",
    ),
    "a truth value is no number": (
        "[judgement]\nwindow = true\n" + GOOD,
        FILE + "judgement . window: needed a whole number from 1 to 10000; got true.",
    ),
    "no text for a number": (
        '[judgement]\nwindow = "40"\n' + GOOD,
        FILE + 'judgement . window: needed a whole number from 1 to 10000; got "40".',
    ),
    "unknown kind": (
        GOOD.replace('"csv"', '"cvs"'),
        PLAYS + 'kind: needed "json", "csv" or "sql"; got "cvs". Did you mean "csv"?',
    ),
    "missing kind": (
        GOOD.replace('kind = "csv"\n', ""),
        PLAYS + 'kind: needed "json", "csv" or "sql"; got nothing.',
    ),
    "unknown shape": (
        GOOD.replace('"calendar"', '"calender"'),
        PLAYS + 'streams . shape: needed "calendar" or "release"; got "calender". Did you mean "calendar"?',
    ),
    "absent is needed": (
        GOOD.replace('absent = "zero"\n', ""),
        PLAYS + 'streams . absent: needed "zero" (an interval without a row had no counts) '
        'or "missing" (nobody knows); got nothing.',
    ),
    "unknown word": (
        GOOD.replace('"zero"', '"zeros"'),
        PLAYS + 'streams . absent: needed "zero" or "missing"; got "zeros". Did you mean "zero"?',
    ),
    "interval": (
        GOOD.replace('"day"\nabsent', '"weeks"\nabsent'),
        PLAYS + 'streams . interval: needed an interval: "hour", "day", "week", "month", "year", '
        'or days such as "14 days"; got "weeks". Did you mean "week"?',
    ),
    "duration": (
        HEAD + 'every = "1 hour"\n' + FIELDS + STREAMS,
        PLAYS + 'every: needed a duration from "1s" to "366d", such as "15m", "1h" or "1d"; got "1 hour".',
    ),
    "zone": (
        '[service]\nzone = "Europe/Lisbn"\n' + GOOD,
        FILE + 'service . zone: needed a zone of the IANA time zone database, such as "UTC" or '
        '"Europe/Lisbon"; got "Europe/Lisbn". Did you mean "Europe/Lisbon"?',
    ),
    "final is needed": (
        HEAD + FIELDS + 'release = "id"\n[source.streams]\nshape = "release"\n',
        PLAYS + 'streams . final: needed a duration from "0s" to "3660d", such as "36h", "7d" or "2w"; '
        "got nothing.",
    ),
    "JSONPath": (
        (JSON % "").replace('"$.rows[*]"', '"rows"'),
        PLAYS + 'rows: needed a JSONPath (RFC 9535), such as "$.shows[*]"; got "rows".',
    ),
    "paging": (
        JSON % "paging = { next = 3 }",
        PLAYS + 'paging . next: needed a JSONPath (RFC 9535), such as "$.shows[*]"; got 3.',
    ),
    "paging in other words": (
        JSON % 'paging = "link heder"',
        PLAYS + 'paging: needed "link header" or { next = "$.next" }; got a text (not repeated). '
        'Did you mean "link header"?',
    ),
    "dispersion": (
        '[model]\ndispersions = [1, "poison"]\n' + GOOD,
        FILE + "model . dispersions[2]: needed up to 64 different numbers above 0, "
        'where "poisson" may stand for infinity; got "poison". Did you mean "poisson"?',
    ),
    "wanders twice": (
        "[model]\nwanders = [[0.1, 1], [0.1, 2]]\n" + GOOD,
        FILE
        + "model . wanders: needed up to 32 pairs [value from 0 to 1, weight above 0] of different values; "
        "got a value twice.",
    ),
    "key of a stream named like a setting": (
        HEAD + SPLIT + STREAMS + '[source.stream.title]\ntitel = "x"\n',
        PLAYS + "stream . title . titel: needed one of the keys judgement, model, slate, title; "
        'got an unknown key. Did you mean "title"?',
    ),
    "title template": (
        GOOD + 'title = "{show}"\n',
        PLAYS + "streams . title: needed one line of up to 200 characters in which {split} and {source} "
        'may stand; got "{show}".',
    ),
    "no source": (
        "[judgement]\nthreshold = 0.9\n",
        FILE + "source: needed one or more tables [[source]]; got nothing.",
    ),
    "a source in single brackets": (
        GOOD.replace("[[source]]", "[source]"),
        FILE + "source: needed one or more tables [[source]]; got a table.",
    ),
    "a name with a slash": (
        GOOD.replace('"plays"\nkind', '"a/b"\nkind'),
        FILE + 'source[1] "a/b" . name: needed a name of up to 60 letters, digits, spaces, dots, hyphens '
        'and underscores; got "a/b".',
    ),
    "size": (
        HEAD + 'largest_body = "2GB"\n' + FIELDS + STREAMS,
        PLAYS + 'largest_body: needed a size from "1kB" to "1GB", such as "25MB"; got "2GB".',
    ),
    "delimiter": (
        HEAD + 'delimiter = "tab"\n' + FIELDS + STREAMS,
        PLAYS + 'delimiter: needed one character; got "tab".',
    ),
    "encoding": (
        HEAD + 'encoding = "utf8000"\n' + FIELDS + STREAMS,
        PLAYS + 'encoding: needed an encoding that Python knows, such as "utf-8"; got "utf8000".',
    ),
    "header name": (
        JSON % 'headers = { "a b" = "x" }',
        PLAYS + 'headers . "a b": needed a header name of letters, digits and hyphens; got another name.',
    ),
    "unknown kind of outlet": (
        GOOD
        + '[[outlet]]\nname = "desk"\nkind = "webhok"\naddress = { env = "A" }\nsecret = { env = "S" }\n',
        FILE + 'outlet[1] "desk" . kind: needed "webhook"; got "webhok". Did you mean "webhook"?',
    ),
}
ENVIRON = {"A": "https://desk.example/in", "S": "whsec_" + "A" * 32}


@pytest.mark.parametrize(("text", "line"), ONE_FAULT.values(), ids=ONE_FAULT)
def test_a_fault_says_where_what_was_got_and_what_was_needed(faults: Faults, text: str, line: str) -> None:
    assert faults(text, ENVIRON) == [line]


def test_all_faults_are_listed_at_once(faults: Faults) -> None:
    text = "\n".join(
        (
            '[service]\nzone = "Nowhere"\ndatabse = "x"',
            "[judgement]\nthreshold = 2\nlasting = 50",
            GOOD.replace("day", "", 1).replace('"zero"', '"none"'),
            GOOD.replace("csv", "sql", 1),
            '[[outlet]]\nname = "desk"\nkind = "webhook"\naddress = "x"\nslates = ["S"]',
        )
    )
    keys = [line.removeprefix(FILE).partition(": ")[0] for line in faults(text)]
    assert keys == [
        "service . zone",
        "service . databse",
        "judgement . threshold",
        'source[1] "plays" . streams . absent',
        'source[1] "plays" . fields . at',
        'source[2] "plays" . address',
        'source[2] "plays" . query',
        'source[2] "plays" . path',
        'outlet[1] "desk" . address',
        'outlet[1] "desk" . secret',
        'source[2] "plays" . name',
        "judgement . lasting",
        'outlet[1] "desk" . slates[1]',
    ]


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[service]\nzone = UTC\n", "is no TOML: at line 2, column 8: Invalid value."),
        ('zone = "UTC', "is no TOML: at its end: Unterminated string."),
        ("a = " + "[" * 5000, "cannot be read: its tables or lists stand too deep in one another."),
    ],
)
def test_what_is_no_toml_gets_one_sentence_with_its_line(tmp_path: Path, text: str, words: str) -> None:
    path = tmp_path / "knickpoint.toml"
    path.write_text(text)
    with pytest.raises(SettingsFaults) as caught:
        load_settings(path, {})
    assert str(caught.value) == f"{path} {words}"
    assert len(caught.value.faults) == 1


def test_a_missing_file_names_the_command_that_writes_one(tmp_path: Path) -> None:
    path = tmp_path / "none.toml"
    with pytest.raises(SettingsFaults) as caught:
        load_settings(path, {})
    assert str(caught.value) == (
        f"There is no settings file {path}. Write a starter file with: knickpoint init; "
        "or name yours with --settings."
    )


@pytest.mark.parametrize("content", [b"\xff\xfe", None])
def test_a_file_that_cannot_be_read_gets_one_sentence(tmp_path: Path, content: bytes | None) -> None:
    path = tmp_path
    if content is not None:
        path = tmp_path / "knickpoint.toml"
        path.write_bytes(content)
    with pytest.raises(SettingsFaults, match=r"cannot be read: (it is not UTF-8 text|Is a directory)"):
        load_settings(path, {})
