"""JSONPath against the examples of RFC 9535."""

import pytest

from service.sources.errors import UnusablePath
from service.sources.json_path import compile_path, fits, nodes

# RFC 9535 (JSONPath: Query Expressions for JSON), section 1.5, figure 1, and the queries of its table 2.
BOOKSTORE = {
    "store": {
        "book": [
            {
                "category": "reference",
                "author": "Nigel Rees",
                "title": "Sayings of the Century",
                "price": 8.95,
            },
            {"category": "fiction", "author": "Evelyn Waugh", "title": "Sword of Honour", "price": 12.99},
            {
                "category": "fiction",
                "author": "Herman Melville",
                "title": "Moby Dick",
                "isbn": "0-553-21311-3",
                "price": 8.99,
            },
            {
                "category": "fiction",
                "author": "J. R. R. Tolkien",
                "title": "The Lord of the Rings",
                "isbn": "0-395-19395-8",
                "price": 22.99,
            },
        ],
        "bicycle": {"color": "red", "price": 399},
    }
}
AUTHORS = ["Nigel Rees", "Evelyn Waugh", "Herman Melville", "J. R. R. Tolkien"]


def found(query, value=BOOKSTORE):
    return nodes(compile_path(query), value)


@pytest.mark.parametrize("query", ["$.store.book[*].author", "$..author"])
def test_authors(query):
    assert found(query) == AUTHORS


def test_everything_in_the_store_and_every_price():
    store = BOOKSTORE["store"]
    assert found("$.store.*") == [store["book"], store["bicycle"]]
    assert sorted(found("$.store..price")) == [8.95, 8.99, 12.99, 22.99, 399]
    assert len(found("$..*")) == 27


@pytest.mark.parametrize(
    ("query", "titles"),
    [
        ("$..book[2]", ["Moby Dick"]),
        ("$..book[-1]", ["The Lord of the Rings"]),
        ("$..book[0,1]", ["Sayings of the Century", "Sword of Honour"]),
        ("$..book[:2]", ["Sayings of the Century", "Sword of Honour"]),
        ("$..book[?@.isbn]", ["Moby Dick", "The Lord of the Rings"]),
        ("$..book[?@.price<10]", ["Sayings of the Century", "Moby Dick"]),
    ],
)
def test_books(query, titles):
    assert [book["title"] for book in found(query)] == titles


def test_one_member_of_one_book():
    assert found("$..book[2].author") == ["Herman Melville"]
    assert found("$..book[2].publisher") == []


@pytest.mark.parametrize(
    "text", ["", "day", "@.day", "$.", "$[", "$.a | $.b", " $.a", "$.a ", "$~", "$[?startswith(@.a, 'x')]"]
)
def test_what_the_standard_does_not_have_is_refused(text):
    with pytest.raises(UnusablePath, match="is no JSONPath of RFC 9535"):
        compile_path(text)


@pytest.mark.parametrize("value", ['{"a": 1}', "text", 7, None, True])
def test_a_scalar_is_itself_and_never_parsed(value):
    assert found("$", value) == [value]
    assert found("$.a", value) == []


@pytest.mark.parametrize(
    ("query", "value", "fit"),
    [
        ("$[*]", [], True),
        ("$.data[*]", {"data": []}, True),
        ("$.data[*].items[*]", {"data": []}, True),
        ("$.data[*].items[*]", {"data": [{"items": []}]}, True),
        ("$.data[?@.ok]", {"data": [{}]}, True),
        ("$.data[2:]", {"data": [1]}, True),
        ("$.data[*].items[*]", {"data": [{"others": []}]}, False),
        ("$.data[*]", {"rows": []}, False),
        ("$.data[*]", {"data": "text"}, False),
        ("$..book[*]", {"store": {}}, False),
        ("$[*]", 5, False),
    ],
)
def test_an_empty_result_is_right_only_where_a_list_is_empty(query, value, fit):
    assert found(query, value) == []
    assert fits(compile_path(query), value) is fit
