"""Markup that nothing in it can break."""

from __future__ import annotations

from html.parser import HTMLParser

import pytest
from hypothesis import given
from hypothesis import strategies as st

from coulombook.report.page.html import LONGEST, element, escaped, join, trusted, whole


class _Read(HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.text = ""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        self.text += data


def read(markup: str) -> _Read:
    reader = _Read()
    reader.feed(markup)
    reader.close()
    return reader


@given(st.text(st.characters(codec="utf-8", categories=("L", "N", "P", "S", "Zs")), max_size=80))
def test_any_printed_text_comes_out_as_it_went_in_and_makes_no_element(text: str) -> None:
    found = read(element("p", text, title=text, data_c=text).text)
    assert found.text == text
    assert found.tags == [("p", {"title": text, "data-c": text})]


@pytest.mark.parametrize(
    "text",
    [
        "</p><script>alert(1)</script>",
        '"><img src=x onerror=alert(1)>',
        "' onclick='x",
        "a\x00b",
        "<!--",
        "&lt;",
    ],
)
def test_hostile_text_stays_text(text: str) -> None:
    found = read(element("p", text, title=text).text)
    assert [tag for tag, _ in found.tags] == ["p"]
    assert set(found.tags[0][1]) == {"title"}


def test_acting_characters_are_shown_by_their_number() -> None:
    assert escaped("a\N{RIGHT-TO-LEFT OVERRIDE}b\x1b") == "a\\u202eb\\x1b"


def test_a_text_without_end_is_cut_but_a_record_for_the_script_is_not() -> None:
    assert len(escaped("x" * 10**6)) == LONGEST
    assert len(whole("x" * 10**4).text) == 10**4
    assert whole('{"a":"<&>"}').text == "{&quot;a&quot;:&quot;&lt;&amp;&gt;&quot;}"


def test_an_attribute_of_true_stands_alone_and_one_of_nothing_is_left_out() -> None:
    assert element("p", hidden=True, title=None, open=False, tabindex=0).text == "<p hidden tabindex=0></p>"


def test_cells_and_rows_leave_their_end_to_the_next() -> None:
    rows = element(
        "table", element("tr", element("td", "1"), element("td", "2")), element("tr", element("td", "3"))
    )
    assert rows.text == "<table><tr><td>1<td>2<tr><td>3</table>"


def test_children_may_be_nested_or_absent() -> None:
    assert join("a", None, ["b", ["c"]], trusted("<i>d</i>")).text == "abc<i>d</i>"
