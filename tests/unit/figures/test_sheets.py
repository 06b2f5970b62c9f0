"""Sheets: nothing covers anything, names stay letters, fonts are embedded, the same day gives the same bytes."""

from __future__ import annotations

import itertools
import re
import shutil
import subprocess
import xml.etree.ElementTree as ET
from pathlib import Path

import pytest
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Text
from tests.unit.figures.books import HOSTILE, PRODUCTS, book, hostile_book, odd_books

from coulombook import figures
from coulombook.figures import Drawing, drawings_of, inline_svg, rendered

ODD = odd_books()
IDS = re.compile(r'\bid="([^"]*)"')


def drawn(one: Drawing, width_mm: float) -> Figure:
    found = one.draw(None, width_mm).get_figure(root=True)
    assert isinstance(found, Figure)
    return found


def sheet_of(axes: Axes) -> Figure:
    found = axes.get_figure(root=True)
    assert isinstance(found, Figure)
    return found


def texts(sheet: Figure) -> list[Text]:
    """Every text that is drawn: ticks beyond the ends of an axis are not."""
    beyond = set()
    for axes in sheet.axes:
        for axis, (low, high), place in ((axes.xaxis, axes.get_xlim(), 0), (axes.yaxis, axes.get_ylim(), 1)):
            beyond |= {
                id(label)
                for label in axis.get_ticklabels()
                if not min(low, high) <= label.get_position()[place] <= max(low, high)
            }
    found = [one for one in sheet.findobj(Text) if isinstance(one, Text)]
    return [one for one in found if one.get_text() and one.get_visible() and id(one) not in beyond]


@pytest.mark.parametrize(
    ("name", "width_mm"),
    [*((name, 85.0) for name in ODD), *((name, 178.0) for name in ("usual", "long names", "hostile"))],
)
def test_no_label_is_cut_or_covered_and_no_legend_lies_on_data(name: str, width_mm: float) -> None:
    drawings = drawings_of(ODD[name])
    assert len(drawings) > 2
    for one in drawings:
        sheet = drawn(one, width_mm)
        canvas = FigureCanvasAgg(sheet)
        with figures.house_style():
            canvas.draw()
            renderer = canvas.get_renderer()  # type: ignore[no-untyped-call] # matplotlib gives it no types
        whole = sheet.bbox
        # the labels of the upper axis, which is not shown, are one pixel in a corner
        for box in (text.get_window_extent(renderer) for text in texts(sheet)):
            # a pixel of rounding
            assert box.x0 >= whole.x0 - 1.5, one.name
            assert box.x1 <= whole.x1 + 1.5, one.name
            assert box.y0 >= whole.y0 - 1.5, one.name
            assert box.y1 <= whole.y1 + 1.5, one.name
        assert sheet.get_size_inches()[0] * 25.4 == pytest.approx(width_mm)
        for legend in sheet.legends:
            for axes in sheet.axes:
                low = axes.get_tightbbox(renderer)
                assert low is not None
                assert legend.get_window_extent(renderer).y1 <= low.y0 + 1.5, one.name
        for axes in sheet.axes:
            assert axes.get_window_extent(renderer).height > 0.25 * min(width_mm, 80.0) / 25.4 * sheet.dpi, (
                one.name
            )
            labels = [label for label in axes.get_xticklabels() if label.get_text()]
            boxes = [
                label.get_window_extent(renderer)
                for label in labels
                if axes.get_xlim()[0] <= label.get_position()[0] <= axes.get_xlim()[1]
            ]
            for left, right in itertools.pairwise(boxes):
                # of an upright line a seventh above and below the letters is empty
                assert left.x1 - right.x0 <= 0.15 * min(left.width, right.width), one.name


@pytest.mark.parametrize("name", ODD)
def test_letters_are_of_readable_size(name: str) -> None:
    for one in drawings_of(ODD[name]):
        assert {text.get_fontsize() >= 6.0 for text in texts(drawn(one, 85.0))} == {True}


@pytest.mark.parametrize("name", ["usual", "hostile", "negative", "many products"])
def test_every_row_with_a_mark_has_its_one_id_in_the_drawing(name: str) -> None:
    for one in drawings_of(ODD[name]):
        text = rendered(drawn(one, 85.0), "svg", salt=one.name).decode("utf-8")
        ids = [element.get("id") for element in ET.fromstring(text).iter() if element.get("id")]
        assert len(ids) == len(set(ids)), one.name
        marks = [mark for mark in one.data.column("mark") if mark is not None]
        assert marks
        assert set(marks) <= set(ids), one.name


def test_ids_of_two_figures_in_one_page_never_meet() -> None:
    seen: set[str] = set()
    for one in drawings_of(ODD["usual"]):
        text = inline_svg(drawn(one, 85.0), salt=one.name)
        ids = set(IDS.findall(text))
        assert text.startswith("<svg")
        assert "<metadata" not in text
        assert "matplotlib.org" not in text
        assert ids
        assert not ids & seen, one.name
        seen |= ids


def test_what_an_svg_refers_to_is_within_it() -> None:
    for one in drawings_of(ODD["usual"]):
        text = rendered(drawn(one, 85.0), "svg").decode("utf-8")
        ids = set(IDS.findall(text))
        refers = set(re.findall(r"url\(#([^)]*)\)", text)) | set(re.findall(r'href="#([^"]*)"', text))
        assert refers
        assert refers <= ids
        assert not re.search(r'href="(?!#)', text)


def test_hostile_names_are_shown_as_they_are_and_obeyed_by_nobody() -> None:
    made = hostile_book()
    for one in drawings_of(made):
        text = rendered(drawn(one, 178.0), "svg", title=one.title, description=one.caption).decode("utf-8")
        assert "<script" not in text
        assert not re.search("[\x00-\x08\x0b-\x1f\u202e]", text)
        ET.fromstring(text)  # well-formed whatever the names
    sheet = sheet_of(figures.fe_against_potential(made, HOSTILE[0], width_mm=178.0))
    legend = [text.get_text() for text in sheet.legends[0].get_texts()]
    svg = rendered(sheet, "svg").decode("utf-8")
    assert r">$\frac{1}{0}$</text>" in svg
    assert "&lt;script&gt;alert(1)&lt;/script&gt;</text>" in svg
    assert {"two\\nlines", "right\\u202eto left", "bell\\x07", "=cmd|' /C calc'!A0"} <= set(legend)
    assert max(map(len, legend)) <= 28


@pytest.mark.parametrize("file_format", figures.FORMATS)
def test_the_same_book_gives_the_same_bytes(file_format: str) -> None:
    made = [drawings_of(book(["one"], products=PRODUCTS[:4])) for _ in range(2)]
    for one, other in zip(*made, strict=True):
        first, second = (rendered(drawn(each, 85.0), file_format, salt=each.name) for each in (one, other))
        assert first == second


def test_settings_of_the_reader_change_no_figure() -> None:
    import matplotlib as mpl

    usual = rendered(sheet_of(figures.closure(book())), "svg")
    with mpl.rc_context(
        {"axes.facecolor": "red", "svg.fonttype": "path", "font.size": 30.0, "lines.linewidth": 9.0}
    ):
        assert rendered(sheet_of(figures.closure(book())), "svg") == usual
        assert mpl.rcParams["axes.facecolor"] == "red"


def test_letters_stay_letters_in_an_svg() -> None:
    text = rendered(sheet_of(figures.fe_against_potential(book(), "silver foam")), "svg").decode("utf-8")
    for word in ("hydrogen", "allyl alcohol", "total", "E vs RHE / V", "FE / %", "−0.62", "100"):
        assert f">{word}</text>" in text


def test_letters_of_a_pdf_are_embedded_as_truetype(tmp_path: Path) -> None:
    content = rendered(sheet_of(figures.fe_against_potential(book(), "silver foam")), "pdf")
    assert b"/FontFile2" in content
    assert b"/Type3" not in content
    if (tool := shutil.which("pdffonts")) is None:
        return  # the bytes above say the same
    (tmp_path / "f.pdf").write_bytes(content)
    told = subprocess.run(
        [tool, tmp_path / "f.pdf"], check=True, capture_output=True, text=True, timeout=60
    ).stdout
    fonts = told.splitlines()[2:]
    assert fonts
    # name, type (TrueType, possibly with a CID), encoding, embedded, subset
    assert all("TrueType" in line and " yes yes " in line for line in fonts), told


def test_a_png_has_the_resolution_that_journals_ask_of_line_drawings() -> None:
    content = rendered(sheet_of(figures.closure(book(), width_mm=85.0)), "png")
    assert int.from_bytes(content[16:20], "big") == pytest.approx(85.0 / 25.4 * 600, abs=1)


def test_another_format_is_refused() -> None:
    with pytest.raises(ValueError, match="svg, pdf, png, not 'bmp'"):
        rendered(sheet_of(figures.closure(book())), "bmp")


def test_no_figure_opens_a_window() -> None:
    code = (
        "import sys; from tests.unit.figures.books import book; from coulombook import figures\n"
        "assert 'matplotlib' not in sys.modules\n"
        "figures.rendered(figures.closure(book()).figure, 'png')\n"
        "assert 'matplotlib.figure' in sys.modules and 'matplotlib.pyplot' not in sys.modules"
    )
    import sys

    subprocess.run([sys.executable, "-c", code], check=True, timeout=60)


def test_names_of_figures_are_fit_for_any_file_system_and_unique() -> None:
    names = [one.name for one in drawings_of(hostile_book())]
    assert len(set(names)) == len(names)
    assert all(re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", name) and len(name) <= 64 for name in names)
