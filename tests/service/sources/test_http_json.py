"""JSON documents from a real server on loopback: pages, validators, and what makes one unreadable."""

import datetime
import json
import traceback
from zoneinfo import ZoneInfo

import pytest

from service.sources.document import KeptOut, Row, Validators
from service.sources.errors import SourceUnreadable
from service.sources.open_source import read_document
from service.sources.plans import Bounds, FieldPlan, JsonPlan, LinkHeader, NextAddress, WebPlace

UTC = ZoneInfo("UTC")
FIELDS = FieldPlan(at="$.day", count="$.plays")
SECRET = "s3cret-token-9871"
NONE = Validators()


def plan(
    house, path="/counts", rows="$[*]", headers=(), secret=False, fields=FIELDS, paging=None, bounds=None
):
    place = WebPlace(house.address + path, headers, secret)
    return JsonPlan("downloads", place, rows, fields, UTC, paging, bounds or Bounds(deadline_seconds=5))


def days(*counts, first=1):
    return [{"day": f"2026-03-{first + n:02d}", "plays": count} for n, count in enumerate(counts)]


def unreadable(given, tools, validators=NONE):
    with pytest.raises(SourceUnreadable) as caught:
        read_document(given, validators, tools=tools)
    assert SECRET not in "".join(traceback.format_exception(caught.value))
    return str(caught.value)


def test_rows_are_understood_and_bad_ones_kept_out(house, tools):
    house.serve("/counts", '[{"day": "2026-03-01", "plays": 12.0}, {"day": "2026-03-02", "plays": -1}]')
    document = read_document(plan(house), NONE, tools=tools)
    assert document.rows == (Row(None, datetime.date(2026, 3, 1), 12),)
    assert document.rows[0].number == 1
    (out,) = document.kept_out
    assert (out.row, out.text) == (2, 'at: "2026-03-02", count: -1')
    assert out.why == "count must be 0 or more; got -1."


def test_every_field_by_its_own_path(house, tools):
    show = {"id": 7, "names": ["Harbour Lights"]}
    row = {"when": {"at": "2026-03-01T10:00:00Z"}, "n": "5", "show": show, "ep": "e-1", "w": 0.5}
    house.serve("/counts", json.dumps({"data": [row]}))
    fields = FieldPlan("$.when.at", "$.n", "$.show.id", "$.ep", "$.show.names[0]", "$.w")
    document = read_document(plan(house, rows="$.data[*]", fields=fields), NONE, tools=tools)
    instant = datetime.datetime(2026, 3, 1, 10, tzinfo=datetime.UTC)
    assert document.rows == (Row("7", instant, 5, "e-1", "Harbour Lights", 0.5),)


def test_an_absent_or_null_count_is_a_missing_one(house, tools):
    house.serve(
        "/counts",
        '[{"day": "2026-03-01"}, {"day": "2026-03-02", "plays": null}, {"day": "2026-03-03", "plays": 4}]',
    )
    document = read_document(plan(house), NONE, tools=tools)
    assert [row.count for row in document.rows] == [None, None, 4]


@pytest.mark.parametrize("body", ['{"data": []}', '{"data": null}', '{"data": {}}'])
def test_an_empty_list_is_a_document(house, tools, body):
    house.serve("/counts", body)
    assert read_document(plan(house, rows="$.data[*]"), NONE, tools=tools).rows == ()


@pytest.mark.parametrize(
    ("body", "rows", "why"),
    [
        (
            '{"items": [], "total": 0}',
            "$.data[*]",
            "$.data[*] fits nothing in its answer, which is an object with items, total",
        ),
        ('{"data": 5}', "$.data[*]", "fits nothing"),
        ("[]", "$.data[*]", "a list of 0"),
        ('"text"', "$[*]", "a single value"),
        ('[{"date": "2026-03-01", "plays": 1}]', "$[*]", "none of its 1 rows has `at` at $['day']"),
        ('[{"day": "2026-03-01", "count": 1}]', "$[*]", "none of its 1 rows has `count`"),
        ('{"data": [{"day": "2026-03-01", "plays": 1}]}', "$.data", "perhaps `rows` should be $.data[*]"),
        ("[1, 2]", "$[*]", "none of its 2 rows has"),
        ('[{"day": "2026', "$[*]", "page 1 of its answer is no JSON"),
        ("", "$[*]", "is empty where JSON was expected"),
        ("<html>", "$[*]", "is no JSON"),
        ("[" * 100_000, "$[*]", "is nested too deeply"),
        (b'["caf\xe9"]', "$[*]", "is not encoded in UTF-8"),
        ("[]", "data[", "is no JSONPath of RFC 9535"),
    ],
)
def test_a_document_that_does_not_fit_is_unreadable(house, tools, body, rows, why):
    house.serve("/counts", body)
    sentence = unreadable(plan(house, rows=rows), tools)
    assert sentence.startswith('Source "downloads" could not be read: ')
    assert why in sentence


def test_numbers_that_are_none_cost_their_row_only(house, tools):
    plays = ["9" * 6000, "1e400", "3", "NaN", "Infinity", "-Infinity"]
    rows = [f'{{"day": "2026-03-0{day}", "plays": {digits}}}' for day, digits in enumerate(plays, start=1)]
    house.serve("/counts", f"[{', '.join(rows)}]")
    document = read_document(plan(house), NONE, tools=tools)
    assert [row.count for row in document.rows] == [3]
    assert ["2^53" in out.why or "finite" in out.why for out in document.kept_out] == [True] * 5


def test_an_error_status_names_itself(house, tools):
    house.serve("/counts", "down", status=503)
    assert "127.0.0.1 answered 503 (Service Unavailable)." in unreadable(plan(house), tools)
    assert "answered 404 (Not Found). Check its headers and address." in unreadable(plan(house, "/no"), tools)


def test_secrets_stay_out_of_sentences_and_texts(house, tools):
    address = f"/counts?key={SECRET}"
    given = plan(house, address, headers=(("Authorization", f"Bearer {SECRET}"),), secret=True)
    assert "its address answered 404" in unreadable(given, tools)
    echo = f"{'x' * 40} {SECRET} Bearer {SECRET}"
    house.serve(address, json.dumps([{"day": echo, "plays": 1}]))
    (out,) = read_document(given, NONE, tools=tools).kept_out
    assert SECRET[:6] not in out.why + out.text
    assert "[hidden]" in out.text
    assert SECRET not in repr(given)


def test_a_short_header_value_is_no_secret_and_spoils_no_text(house, tools):
    house.serve("/counts", '[{"day": "2026-03-01", "plays": -2}]')
    given = plan(house, headers=(("X-Version", "2"), ("Accept-Language", "en")))
    (out,) = read_document(given, NONE, tools=tools).kept_out
    assert out.text == 'at: "2026-03-01", count: -2'


def test_a_login_in_the_address_is_sent_as_a_header_on_every_page(house, tools):
    house.serve("/counts", json.dumps({"rows": [], "next": f"{house.address}/two"}))
    house.serve("/two", '{"rows": []}')
    given = plan(house, rows="$.rows[*]", paging=NextAddress("$.next"))
    place = WebPlace(given.place.address.replace("//", "//me:p%40ss@"), (), False)
    read_document(JsonPlan("downloads", place, "$.rows[*]", FIELDS, UTC, given.paging), NONE, tools=tools)
    # Base64 of "me:p@ss".
    assert [asked["authorization"] for _, asked in house.asked] == ["Basic bWU6cEBzcw=="] * 2


def test_unchanged_by_etag(house, tools):
    house.serve("/counts", json.dumps(days(1, 2)), ETag='W/"one"')
    first = read_document(plan(house), NONE, tools=tools)
    assert first.validators.etag == 'W/"one"'
    again = read_document(plan(house), first.validators, tools=tools)
    assert (again.not_modified, again.rows, again.validators) == (True, (), first.validators)


def test_last_modified_is_asked_with(house, tools):
    stamp = "Sun, 06 Nov 1994 08:49:37 GMT"
    house.serve("/counts", "[]", Last_Modified=stamp)
    first = read_document(plan(house), NONE, tools=tools)
    read_document(plan(house), first.validators, tools=tools)
    assert house.asked[1][1]["if-modified-since"] == stamp


def test_validators_are_void_under_a_corrected_plan(house, tools):
    house.serve("/counts", json.dumps(days(1)), ETag='"one"')
    first = read_document(plan(house), NONE, tools=tools)
    corrected = plan(house, fields=FieldPlan(at="$.day", count="$.plays", title="$.day"))
    assert len(read_document(corrected, first.validators, tools=tools).rows) == 1


def test_a_304_that_was_not_asked_for_is_no_document(house, tools):
    house.serve("/counts", "", status=304)
    assert "answered 304" in unreadable(plan(house), tools)


def test_pages_by_link_header(house, tools):
    house.serve("/counts", json.dumps(days(1, 2)), Link='<counts?page=2>; rel="prev next"', ETag='"one"')
    house.serve("/counts?page=2", json.dumps(days(3, first=3)), Link='</counts>; rel="first"')
    document = read_document(plan(house, paging=LinkHeader()), NONE, tools=tools)
    assert [(row.number, row.count) for row in document.rows] == [(1, 1), (2, 2), (3, 3)]
    assert document.validators == NONE, "an unchanged first page says nothing about the second"


def test_pages_by_a_path_in_the_document(house, tools):
    def page(counts, onward, first):
        return json.dumps({"rows": days(*counts, first=first), "next": onward})

    house.serve("/counts", page([1], "/two", 1))
    house.serve("/two", page([], f"{house.address}/three", 2))
    house.serve("/three", page([3], None, 3))
    given = plan(house, rows="$.rows[*]", paging=NextAddress("$.next"))
    assert [row.count for row in read_document(given, NONE, tools=tools).rows] == [1, 3]


def test_one_bad_page_makes_the_whole_document_unreadable(house, tools):
    house.serve("/counts", json.dumps({"rows": days(1), "next": "/two"}))
    house.serve("/two", '{"rows": [', status=200)
    given = plan(house, rows="$.rows[*]", paging=NextAddress("$.next"))
    assert "page 2 of its answer is no JSON" in unreadable(given, tools)


def test_pages_that_go_round_or_have_no_end(house, tools):
    house.serve("/counts", '{"rows": [], "next": "/two"}')
    house.serve("/two", '{"rows": [], "next": "/counts#again"}')
    given = plan(house, rows="$.rows[*]", paging=NextAddress("$.next"))
    assert "page 2 names a page as the next that was read already" in unreadable(given, tools)
    for number in range(5):
        house.serve(f"/p{number}", json.dumps({"rows": [], "next": f"/p{number + 1}"}))
    bounds = Bounds(deadline_seconds=5, most_pages=3)
    endless = plan(house, "/p0", rows="$.rows[*]", paging=NextAddress("$.next"), bounds=bounds)
    assert "more than the 3 pages" in unreadable(endless, tools)
    assert [path for path, _ in house.asked][-3:] == ["/p0", "/p1", "/p2"]


@pytest.mark.parametrize(
    ("onward", "why"),
    [("7", "must give one address or null"), ('"ftp://x/"', "no http or https"), ('["/a"]', "must give one")],
)
def test_a_next_page_must_be_an_address(house, tools, onward, why):
    house.serve("/counts", f'{{"rows": [], "next": {onward}}}')
    assert why in unreadable(plan(house, rows="$.rows[*]", paging=NextAddress("$.next")), tools)


def test_a_link_header_that_cannot_be_taken_apart(house, tools):
    house.serve("/counts", "[]", Link='<counts?page=2; rel="next"')
    assert "Link header of page 1 cannot be taken apart" in unreadable(
        plan(house, paging=LinkHeader()), tools
    )


def test_secrets_never_go_to_the_host_of_another_page(house, open_house, tools):
    other = open_house()
    other.serve("/two", json.dumps(days(2, first=2)))
    house.serve("/counts", json.dumps(days(1)), Link=f'<{other.address}/two>; rel="next"')
    secret = plan(house, headers=(("X-Key", SECRET),), paging=LinkHeader())
    assert "names a next page on another host" in unreadable(secret, tools)
    assert other.asked == []
    document = read_document(plan(house, paging=LinkHeader()), NONE, tools=tools)
    assert [row.count for row in document.rows] == [1, 2]


def test_all_pages_share_one_bound_on_their_size(house, tools):
    house.serve("/counts", json.dumps({"rows": [], "pad": "x" * 600, "next": "/two"}))
    house.serve("/two", json.dumps({"rows": [], "pad": "x" * 600}))
    bounds = Bounds(deadline_seconds=5, largest_body=1000)
    given = plan(house, rows="$.rows[*]", paging=NextAddress("$.next"), bounds=bounds)
    assert "bytes that are allowed" in unreadable(given, tools)


def test_more_rows_than_allowed(house, tools):
    house.serve("/counts", json.dumps(days(1, 2, 3)))
    assert "more than the 2 rows" in unreadable(plan(house, bounds=Bounds(5, most_rows=2)), tools)


def test_a_path_with_several_values_keeps_its_row_out(house, tools):
    house.serve("/counts", '[{"day": "2026-03-01", "plays": [1, 2]}, {"day": "2026-03-02", "plays": [3]}]')
    document = read_document(plan(house, fields=FieldPlan("$.day", "$.plays[*]")), NONE, tools=tools)
    assert [row.count for row in document.rows] == [3]
    assert document.kept_out == (
        KeptOut(1, "count must be a whole number; got 2 values.", 'at: "2026-03-01", count: 2 values'),
    )
