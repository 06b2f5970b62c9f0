"""A drawing made part of the page: nothing but what draws gets through."""

from __future__ import annotations

import re

from coulombook.report.page.svg import Styles, adopt

HEAD = (
    '<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" viewBox="0 0 10 10">'
)


def adopted(content: str, marks: dict[str, str] | None = None, styles: Styles | None = None) -> str:
    return adopt(f"{HEAD}{content}</svg>", 1, styles or Styles(), label="a drawing", marks=marks or {}).text


def test_what_acts_or_reaches_out_does_not_get_through() -> None:
    got = adopted(
        '<script>alert(1)</script><foreignObject><p>x</p></foreignObject><image xlink:href="http://a.example/x.png"/>'
        '<a xlink:href="http://a.example"><path d="M 0 0 L 1 1"/></a><style>p{}</style>'
        '<use xlink:href="http://a.example/#x"/><path d="M 0 0 L 1 1" onclick="alert(1)" style="fill: url(http://a.example)"/>'
        '<path d="javascript:alert(1)"/>'
    )
    assert not re.search(r"script|foreign|image|<a|http|onclick|style", got)
    assert got.count("<path") == 2


def test_letters_of_a_drawing_stay_letters() -> None:
    got = adopted(
        '<text x="1" style="font: 6.5px \'DejaVu Sans\', sans-serif; text-anchor: middle">&lt;b&gt; &amp; c</text>'
    )
    assert "&lt;b&gt; &amp; c</text>" in got


def test_ids_become_the_drawing_s_own_and_what_refers_to_them_follows() -> None:
    got = adopted(
        '<defs><path id="m" d="M 0 0 L 1 1"/><clipPath id="c"><rect x="0" width="1" height="1"/></clipPath></defs>'
        '<use xlink:href="#m" x="1"/><g clip-path="url(#c)"><path d="M 0 0 L 2 2"/></g>'
    )
    defined = set(re.findall(r' id="([^"]+)"', got))
    assert defined == set(re.findall(r'(?:href="#|url\(#)([^")]+)', got))
    assert all(one.startswith("d1-") for one in defined)


def test_styles_become_classes_that_equal_ones_share() -> None:
    styles = Styles()
    got = adopted(
        '<path d="M 0 0 L 1 1" style="fill: none; stroke: #0072b2; stroke-width: 0.9"/>' * 2, styles=styles
    )
    (name,) = set(re.findall(r'class="(z\d+)"', got))
    assert styles.sheet() == f".{name}{{fill:none;stroke:#0072b2;stroke-width:0.9}}"


def test_black_and_white_turn_with_the_page_but_not_within_a_colour() -> None:
    styles = Styles()
    adopted('<path d="M 0 0 L 1 1" style="fill: #ffffff; stroke: #222222"/>', styles=styles)
    adopted('<path d="M 0 0 L 1 1" style="fill: #f0e442; stroke: #222222"/>', styles=styles)
    assert "fill:var(--paper);stroke:var(--ink)" in styles.sheet()
    assert "fill:#f0e442;stroke:#222222" in styles.sheet()


def test_a_mark_says_its_value_without_a_script() -> None:
    got = adopted('<g id="fe:a"><path d="M 0 0 L 1 1"/></g>', {"fe:a": 'FE 31.2(14) % of "<a>"'})
    assert '<g class="mark"><title>FE 31.2(14) % of &quot;&lt;a&gt;&quot;</title><path' in got


def test_a_hatch_that_two_drawings_share_is_written_once() -> None:
    styles = Styles()
    hatch = (
        '<path d="M 0 0 L 1 1" style="fill: url(#h)"/><defs><pattern id="h" patternUnits="userSpaceOnUse" x="0" y="0" '
        'width="72" height="72"><path d="M 0 0 L 9 9" style="stroke: #222222"/></pattern></defs>'
    )
    first = adopt(f"{HEAD}{hatch}</svg>", 1, styles, label="", marks={}).text
    second = adopt(f"{HEAD}{hatch}</svg>", 2, styles, label="", marks={}).text
    assert "<pattern" in first
    assert "<pattern" not in second
    (name,) = re.findall(r'<pattern id="([^"]+)"', first)
    assert f"url(#{name})" in styles.sheet()
