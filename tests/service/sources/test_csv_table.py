"""CSV tables from files and from an address."""

import datetime
import os
from zoneinfo import ZoneInfo

import pytest

from service.sources.document import KeptOut, Row, Validators
from service.sources.errors import SourceUnreadable
from service.sources.open_source import read_document
from service.sources.plans import Bounds, CsvPlan, FieldPlan, FilePlace, WebPlace, fingerprint

UTC = ZoneInfo("UTC")
FIELDS = FieldPlan(at="day", count="plays")
NONE = Validators()


@pytest.fixture
def table(tmp_path):
    def write(content, **changes):
        path = tmp_path / "counts.csv"
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return CsvPlan(**{"name": "table", "place": FilePlace(path), "fields": FIELDS, "zone": UTC} | changes)

    return write


def counts(plan, tools):
    return [(row.number, row.count) for row in read_document(plan, NONE, tools=tools).rows]


def unreadable(plan, tools):
    with pytest.raises(SourceUnreadable) as caught:
        read_document(plan, NONE, tools=tools)
    return str(caught.value)


def test_columns_are_found_by_name(table, tools):
    content = 'plays,show,day,what\r\n"1",a,2026-03-01,"x, ""y""\nz"\r\n,b,2026-03-02,\r\n'
    plan = table(content, fields=FieldPlan("day", "plays", split="show", title="what"))
    document = read_document(plan, NONE, tools=tools)
    assert document.rows == (
        Row("a", datetime.date(2026, 3, 1), 1, title='x, "y" z'),
        Row("b", datetime.date(2026, 3, 2), None),
    )


@pytest.mark.parametrize(
    ("content", "changes"),
    [
        (b"\xef\xbb\xbfday,plays\n2026-03-01,7\n", {}),
        ("day,plays\n2026-03-01,7\n".encode("utf-16"), {"encoding": "utf-16"}),
        ("jour;day;plays\né;2026-03-01;7".encode("latin-1"), {"encoding": "latin-1", "delimiter": ";"}),
        (b"day\tplays\n2026-03-01\t7\n", {"delimiter": "\t"}),
        (b" day , plays \n\n2026-03-01, 7 \n\n\n", {}),
        (b"day,plays\r2026-03-01,7\r", {}),
    ],
)
def test_encodings_delimiters_and_blank_lines(table, tools, content, changes):
    assert counts(table(content, **changes), tools) == [(1, 7)]


def test_ragged_and_unusable_rows_are_kept_out(table, tools):
    content = "day,plays\n2026-03-01\n2026-03-02,2\n2026-03-03,3,9\nsoon,4\n2026-03-05,1e3\n"
    document = read_document(table(content), NONE, tools=tools)
    assert [(row.number, row.count) for row in document.rows] == [(2, 2)]
    assert [out.row for out in document.kept_out] == [1, 3, 4, 5]
    assert document.kept_out[1] == KeptOut(
        3, "a row must have 2 cells, as the header line has; got 3.", 'cells: "2026-03-03,3,9"'
    )


def test_a_header_alone_is_an_empty_table(table, tools):
    assert counts(table("day,plays\n"), tools) == []


@pytest.mark.parametrize(
    ("content", "changes", "why"),
    [
        ("", {}, "no header line"),
        ("\n,\n", {}, "no header line"),
        ("date,plays\n", {}, 'it has no column "day"; its columns are "date", "plays".'),
        ("day;plays\n", {}, 'its columns are "day;plays".'),
        ("day,plays,plays\n", {}, 'more than one column "plays"'),
        ('day,plays\n2026-03-01,"7\n', {}, "it is no CSV of RFC 4180 at line 2"),
        ('day,plays\n2026-03-01,"7"8\n', {}, "it is no CSV of RFC 4180 at line 2"),
        (b"day,plays\n\xe9,1\n", {}, "it is not encoded in utf-8"),
        ("day,plays\n", {"encoding": "klingon"}, 'there is no encoding "klingon"'),
        ("day,plays\n", {"encoding": "base64"}, 'there is no encoding "base64"'),
        ("day,plays\n1,1\n1,1\n", {"bounds": Bounds(most_rows=1)}, "more than the 1 rows"),
        ("day,plays\n", {"bounds": Bounds(largest_body=9)}, "more than the 9 bytes"),
        ("day,plays\n" + "x" * 200_000 + ",1\n", {}, "field larger than field limit"),
    ],
)
def test_what_makes_a_table_unreadable(table, tools, content, changes, why):
    assert why in unreadable(table(content, **changes), tools)


def test_a_file_that_is_none(table, tools, tmp_path):
    plan = table("")
    os.mkfifo(tmp_path / "pipe")
    for path, why in (
        (tmp_path / "absent.csv", "No such file"),
        (tmp_path, "Is a directory"),
        (tmp_path / "pipe", "is no ordinary file"),
    ):
        given = CsvPlan("table", FilePlace(path), plan.fields, UTC)
        assert why in unreadable(given, tools)


def test_an_unchanged_file_is_known_again(table, tools):
    plan = table("day,plays\n2026-03-01,7\n")
    first = read_document(plan, NONE, tools=tools)
    again = read_document(plan, first.validators, tools=tools)
    assert (again.not_modified, again.validators) == (True, first.validators)
    changed = table("day,plays\n2026-03-01,8\n")
    assert [row.count for row in read_document(changed, first.validators, tools=tools).rows] == [8]


def test_a_corrected_plan_reads_an_unchanged_file_again(table, tools):
    content = "day,plays,starts\n2026-03-01,7,9\n"
    first = read_document(table(content), NONE, tools=tools)
    corrected = table(content, fields=FieldPlan("day", "starts"))
    assert [row.count for row in read_document(corrected, first.validators, tools=tools).rows] == [9]


def test_from_an_address(house, tools):
    house.serve("/t.csv", "day,plays\n2026-03-01,7\n", ETag='"a"')
    place = WebPlace(house.address + "/t.csv", (("X-Key", "k3y-for-tables"),), address_is_secret=False)
    plan = CsvPlan("table", place, FIELDS, UTC, bounds=Bounds(5))
    first = read_document(plan, NONE, tools=tools)
    assert [row.count for row in first.rows] == [7]
    assert house.asked[0][1]["x-key"] == "k3y-for-tables"
    assert read_document(plan, first.validators, tools=tools).not_modified
    house.serve("/t.csv", "gone", status=410)
    assert "127.0.0.1 answered 410 (Gone)" in unreadable(plan, tools)


def test_the_fingerprint_sees_all_but_header_values(table):
    plan = table("day,plays\n")
    web = CsvPlan("table", WebPlace("http://a.test/x", (("K", "1"),)), FIELDS, UTC)
    moved = CsvPlan("table", WebPlace("http://a.test/y", (("K", "2"),)), FIELDS, UTC)
    renewed = CsvPlan("table", WebPlace("http://a.test/x", (("K", "2"),)), FIELDS, UTC)
    assert len({fingerprint(plan), fingerprint(web), fingerprint(moved)}) == 3
    assert fingerprint(web) == fingerprint(renewed)
