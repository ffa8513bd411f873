"""The Link header after RFC 8288."""

import contextlib

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.sources.link_header import next_reference


# The first four follow the examples of RFC 8288, section 3.5, with the relation "next" (from memory).
@pytest.mark.parametrize(
    ("header", "target"),
    [
        (
            '<http://example.com/TheBook/chapter2>; rel="next"; title="next chapter"',
            "http://example.com/TheBook/chapter2",
        ),
        (
            '</TheBook/chapter2>; rel="previous"; title*=UTF-8\'de\'letztes, </chapter4>; rel="next"',
            "/chapter4",
        ),
        ('<http://example.org/>; rel="start http://example.net/relation/other next"', "http://example.org/"),
        ('</>; rel="http://example.net/foo"', None),
        ("<a>;rel=next", "a"),
        ("<a> ; REL = NEXT", "a"),
        ('<a,b;c>; rel="next"', "a,b;c"),
        ('<a>; title="say \\"x, <b>; rel=next\\""; rel="last", <c>; rel=next', "c"),
        ('<a>; rel="last"; rel="next", <b>; rel="next"', "b"),
        ('<a>; rel="next"; anchor="/other", <b>; rel="next"', "b"),
        ("<a>; rel=nextpage", None),
        ("<>; rel=next", ""),
        (", <a>; rel=next;, ,", "a"),
        ("<a>; crossorigin; rel=next", "a"),
        ("", None),
        (" , ", None),
    ],
)
def test_the_next_link(header, target):
    assert next_reference(header) == target


@pytest.mark.parametrize(
    "header", ["a; rel=next", '<a; rel="next"', "<a> rel=next", '<a>; rel="next', "<a>; =x"]
)
def test_a_damaged_header_is_not_passed_over(header):
    with pytest.raises(ValueError, match="link"):
        next_reference(header)


@given(st.text(alphabet='<>;,="\\ arelnxt\t', max_size=60))
def test_any_header_is_read_or_refused(header):
    with contextlib.suppress(ValueError):
        assert next_reference(header) is None or f"<{next_reference(header)}>" in header
