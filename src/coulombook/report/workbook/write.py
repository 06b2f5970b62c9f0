"""Sheets to the bytes of a workbook. XlsxWriter is loaded with this module, and this module when a workbook is written.

Every text is written as a string and nothing else, so that none becomes a formula or a link; what a spreadsheet
program cannot hold (characters that act, more than it takes in a cell) is shown by its number or cut.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from datetime import datetime
from functools import lru_cache
from io import BytesIO
from math import ceil

from xlsxwriter import Workbook
from xlsxwriter.worksheet import Worksheet

from coulombook.figures.marks import Style, style_of_product
from coulombook.prose.text import visible
from coulombook.report.workbook.about import CHARTS, Line, Said
from coulombook.report.workbook.cells import FIRST_ROW, HEAD_ROW, Column, Kind, Sheet
from coulombook.report.workbook.charts import Chart
from coulombook.report.workbook.digits import GENERAL, digits_shown
from coulombook.report.workbook.styles import PARTED, Styles

# a cell holds 32,767 units of UTF-16, of which a character may need two
_LONGEST = 16_000
_LONGEST_WRAPPED = 2_000  # of text that makes its row higher
_NARROWEST, _WIDEST, _WRAPPED = 10.5, 44.0, 60.0
_SAID = 110.0  # width of what the sheet "about" says
_LINE, _SMALL_LINE, _HIGHEST = 13.5, 11.0, 400.0  # heights of lines, and of the highest row there can be
_SHORT_HEAD = 14  # characters of a head that stands in one line
_PER_CHARACTER, _PER_SMALL_CHARACTER = 1.0, 0.75  # widths, of the sheet's unit of width
_AS_TYPED = frozenset({Kind.ENTERED, Kind.TEXT})
_LOOKED_AT = 400  # records that decide how wide a column of text is
_CHARTS_FROM, _CHART_ROWS = 3, 24  # rows: of the first chart, and from one to the next
# hatches of the figures, as a spreadsheet names its patterns
_PATTERNS = {"////": "light_upward_diagonal", "\\\\\\\\": "light_downward_diagonal", "xxxx": "diagonal_brick",
             "....": "percent_10", "----": "dashed_horizontal", "||||": "dashed_vertical", "++++": "divot",
             "oooo": "dotted_diamond"}  # fmt: skip
_MARKERS = {"o": "circle", "s": "square", "^": "triangle", "D": "diamond", "X": "x", "P": "plus"}
_OTHER_MARKERS = ("circle", "square", "triangle", "diamond", "x", "star", "plus", "short_dash")


def written(
    sheets: Sequence[Sheet], charts: Sequence[Chart], about: Iterable[Said], title: str, created: datetime
) -> bytes:
    """The workbook: sheets in the order given, the charts behind the first, the sheet ``about`` last."""
    stream = BytesIO()
    workbook = Workbook(
        stream,
        {
            "in_memory": True,
            "strings_to_formulas": False,
            "strings_to_urls": False,
            "strings_to_numbers": False,
        },
    )
    # the day's own date and not the clock's, so that the same day gives the same bytes
    workbook.set_properties({"title": shown(title, 200), "created": created})
    styles = Styles(workbook)
    parted = workbook.add_format(dict(PARTED))
    for number, sheet in enumerate(sheets):
        page = workbook.add_worksheet(sheet.name)
        _write(page, sheet, styles)
        if sheet.parted is not None and sheet.rows:
            _draw_parts(page, sheet, parted)
        _name(workbook, sheet)
        if number == 0 and charts:
            _draw_charts(workbook, charts, styles)
    _write_about(workbook, about, styles)
    workbook.close()
    return stream.getvalue()


@lru_cache(maxsize=8192)
def shown(text: str, longest: int = _LONGEST) -> str:
    """Text as a cell can hold it."""
    return visible(text, longest)


def _write(page: Worksheet, sheet: Sheet, styles: Styles) -> None:
    last = len(sheet.columns) - 1
    page.set_row(0, 24)
    page.write_string(0, 0, sheet.title, styles.look("title"))
    page.write_string(1, 0, sheet.about, styles.look("about"))
    for place, kind in enumerate((Kind.ENTERED, Kind.FORMULA, Kind.COMPUTED)):
        page.write_string(2, place, kind.value.partition(":")[0], styles.words(kind))
    page.write_url(2, 3, "internal:about!A1", styles.look("link"), "what this means")
    widths = [_width(column) for column in sheet.columns]
    page.set_row(2, 18)
    page.set_row(
        HEAD_ROW - 1, _height([one.head for one in sheet.columns], widths, _PER_CHARACTER * 1.1, _LINE) + 6
    )
    page.set_row(
        HEAD_ROW, _height([one.how for one in sheet.columns], widths, _PER_SMALL_CHARACTER, _SMALL_LINE) + 4
    )
    _heighten(page, sheet, widths)
    for place, column in enumerate(sheet.columns):
        page.set_column(place, place, widths[place])
        page.write_string(HEAD_ROW - 1, place, shown(column.head), styles.look("head"))
        page.write_string(HEAD_ROW, place, column.how, styles.look("how"))
        _write_column(page, place, column, styles)
    page.freeze_panes(FIRST_ROW - 1, sheet.frozen)
    if sheet.filtered and sheet.rows:
        page.autofilter(HEAD_ROW - 1, 0, FIRST_ROW + sheet.rows - 2, last)
    # names that look like numbers are names, and neighbours differ where the readings do
    everywhere = f"A1:{sheet.next_letter}{FIRST_ROW + sheet.rows}"
    page.ignore_errors(
        {"number_stored_as_text": everywhere, "formula_differs": everywhere, "formula_range": everywhere}
    )
    page.set_landscape()
    page.set_paper(9)
    page.fit_to_pages(1, 0)
    page.repeat_rows(HEAD_ROW - 1, HEAD_ROW)
    page.set_footer("&L&A&R&P / &N")


def _write_column(page: Worksheet, place: int, column: Column, styles: Styles) -> None:
    if column.kinds is None:
        _write_cells(page, place, column, styles, column.kind, range(len(column.values)))
    else:
        for number, kind in enumerate(column.kinds):
            _write_cells(page, place, column, styles, kind, (number,))
    if column.choices and column.values:
        page.data_validation(
            FIRST_ROW - 1, place, FIRST_ROW + len(column.values) - 2, place,
            {"validate": "list", "source": list(column.choices)},
        )  # fmt: skip


def _write_cells(
    page: Worksheet, place: int, column: Column, styles: Styles, kind: Kind, records: Iterable[int]
) -> None:
    """Some records of a column, all of one kind; among formulas, what has none is a computed value."""
    values, formulas, u = column.values, column.formulas, column.u
    numbers, words = styles.numbers(kind), styles.words(kind, column.wide)
    bare = Kind.COMPUTED if kind is Kind.FORMULA else kind
    bare_numbers, bare_words = styles.numbers(bare), styles.words(bare, column.wide)
    as_typed = column.exact or kind in _AS_TYPED
    longest = _LONGEST_WRAPPED if column.wide else _LONGEST
    for number in records:
        value = values[number]
        if value is None or value == "":
            continue
        row = FIRST_ROW - 1 + number
        formula = None if formulas is None else formulas[number]
        if isinstance(value, str):
            if formula is None:
                page.write_string(row, place, shown(value, longest), bare_words)
            else:
                page.write_formula(row, place, formula, words, value)
            continue
        if as_typed or isinstance(value, int):
            digits = GENERAL
        else:
            spread = None if u is None else u[number]
            digits = digits_shown(value, spread if isinstance(spread, float) else None)
        if formula is None:
            page.write_number(row, place, value, bare_numbers[digits])
        else:
            page.write_formula(row, place, formula, numbers[digits], value)


def _width(column: Column) -> float:
    longest_word = max(map(len, column.head.split()), default=0)
    texts = [len(one) for one in column.values[:_LOOKED_AT] if isinstance(one, str)]
    return min(
        max(_NARROWEST, longest_word * 1.15 + 3.0, max(texts, default=0) + 3.0),
        _WRAPPED if column.wide else _WIDEST,
    )


def _height(texts: Iterable[str], widths: Iterable[float], per_character: float, line: float) -> float:
    """Of a row, as its texts wrap at words in columns of these widths."""
    lines = (
        ceil(len(text) * per_character / (width - 2.0)) for text, width in zip(texts, widths, strict=True)
    )
    return min(max(lines, default=1) * line, _HIGHEST)


def _heighten(page: Worksheet, sheet: Sheet, widths: Sequence[float]) -> None:
    """Make room for text that wraps; spreadsheet programs do not agree on who does."""
    wide = [
        (column.values, width) for column, width in zip(sheet.columns, widths, strict=True) if column.wide
    ]
    if not wide:
        return
    for number in range(sheet.rows):
        texts = [str(values[number] or "")[:_LONGEST_WRAPPED] for values, _ in wide]
        height = _height(texts, [width for _, width in wide], _PER_CHARACTER, _LINE)
        if height > _LINE:
            page.set_row(FIRST_ROW - 1 + number, height)


def _draw_parts(page: Worksheet, sheet: Sheet, parted: object) -> None:
    """A line above each record that begins another run (or whatever parts the sheet)."""
    assert sheet.parted is not None
    letter = sheet.letters[sheet.parted]
    page.conditional_format(
        FIRST_ROW - 1, 0, FIRST_ROW + sheet.rows - 2, len(sheet.columns) - 1,
        {"type": "formula", "criteria": f"=${letter}{FIRST_ROW}<>${letter}{FIRST_ROW - 1}", "format": parted},
    )  # fmt: skip


def _name(workbook: Workbook, sheet: Sheet) -> None:
    """Names for every column of numbers and for single cells."""
    for name, cell in sheet.names.items():
        workbook.define_name(name, f"={sheet.quoted}!{cell}")
    taken: set[str] = set()
    for column in sheet.columns:
        if column.kind is Kind.TEXT or not sheet.rows or column.head == "value":
            continue
        name = base = name_of(sheet.name, column.head)
        number = 2
        while name.casefold() in taken:
            name, number = f"{base}_{number}", number + 1
        taken.add(name.casefold())
        letter = sheet.letters[column.head]
        workbook.define_name(
            name, f"={sheet.quoted}!${letter}${FIRST_ROW}:${letter}${FIRST_ROW + sheet.rows - 1}"
        )


def name_of(sheet: str, head: str) -> str:
    """Name of a column: its sheet and its quantity, in what a name may hold.

    >>> name_of("ledger", "u(FE) / %"), name_of("summary", "C2+/C1"), name_of("chart data", "E vs RHE / V")
    ('ledger_u_FE', 'summary_C2plus_C1', 'chart_data_E_vs_RHE')
    """
    quantity = head.partition(" / ")[0]
    text = f"{sheet}_{quantity}".replace("C2+", "C2plus")
    return re.sub(r"[^A-Za-z0-9]+", "_", text)[:200].strip("_")


def _draw_charts(workbook: Workbook, charts: Sequence[Chart], styles: Styles) -> None:
    name, title = CHARTS
    page = workbook.add_worksheet(name)
    page.hide_gridlines(2)
    page.set_row(0, 24)
    page.write_string(0, 0, title, styles.look("title"))
    page.write_string(
        1, 0, "Means over the runs of each level; drawn from the sheet of chart data.", styles.look("about")
    )
    for number, chart in enumerate(charts):
        down, right = divmod(number, 2)
        page.insert_chart(
            _CHARTS_FROM + _CHART_ROWS * down, 11 * right, _drawn(workbook, chart), {"object_position": 2}
        )
    page.set_landscape()
    page.set_paper(9)
    page.set_print_scale(54)
    # two rows of charts to a page, none of them cut
    page.set_h_pagebreaks(
        range(_CHARTS_FROM + 2 * _CHART_ROWS, _CHARTS_FROM + _CHART_ROWS * len(charts), 2 * _CHART_ROWS)
    )


def _drawn(workbook: Workbook, chart: Chart) -> object:
    kind = (
        {"type": "column", "subtype": "stacked"}
        if chart.stacked
        else {"type": "scatter", "subtype": "straight_with_markers"}
    )
    drawn = workbook.add_chart(kind)
    for number, one in enumerate(chart.series):
        style = style_of_product(one.product)
        drawn.add_series(
            {
                "name": one.name,
                "categories": one.potentials,
                "values": one.heights,
                **(_filled(style) if chart.stacked else _lined(style, number)),
            }
        )
    axis = {"name": "E vs RHE / V", "num_format": "0.00", "num_font": {"size": 9}, "name_font": {"size": 10}}
    if chart.stacked:
        drawn.set_x_axis({**axis, "text_axis": True, "label_position": "low"})
        drawn.set_y_axis(
            {
                "name": "FE / %",
                "min": 0,
                "num_format": "0",
                "major_gridlines": {"visible": True, "line": {"color": "#D5DCE0"}},
            }
        )
    else:
        drawn.set_x_axis({**axis, "label_position": "low", "crossing": "min"})
        drawn.set_y_axis(
            {
                "name": "j / mA cm^-2",
                "log_base": 10,
                "num_format": "General",
                "crossing": "min",
                "major_gridlines": {"visible": True, "line": {"color": "#D5DCE0"}},
            }
        )
    # names are given as cells: as text they would be taken for formulas if they look like one
    drawn.set_title({"name": chart.title, "name_font": {"size": 12}, "overlay": False})
    drawn.set_legend({"position": "right", "font": {"size": 9}})
    drawn.set_size({"width": 680, "height": 450})
    return drawn


def _filled(style: Style) -> dict[str, object]:
    border = {"color": "#FFFFFF", "width": 0.5}
    pattern = _PATTERNS.get(style.hatch, "small_confetti" if style.hatch else None)
    if pattern is None:
        return {"fill": {"color": style.colour}, "border": border, "gap": 60}
    return {
        "pattern": {"pattern": pattern, "fg_color": "#FFFFFF", "bg_color": style.colour},
        "border": border,
        "gap": 60,
    }


def _lined(style: Style, number: int) -> dict[str, object]:
    marker = _MARKERS.get(style.marker) if isinstance(style.marker, str) else None
    return {
        "line": {"color": style.colour, "width": 1.25},
        "marker": {
            "type": marker or _OTHER_MARKERS[number % len(_OTHER_MARKERS)],
            "size": 7,
            "fill": {"color": style.colour},
            "border": {"color": "#222222", "width": 0.5},
        },
    }


def _write_about(workbook: Workbook, lines: Iterable[Said], styles: Styles) -> None:
    page = workbook.add_worksheet("about")
    page.hide_gridlines(2)
    page.set_column(0, 0, 26)
    page.set_column(1, 1, _SAID)
    for row, said in enumerate(lines):
        first, second = (*said.cells, "", "")[:2]
        height = _height([shown(second, _LONGEST_WRAPPED)], [_SAID], _PER_CHARACTER, _LINE)
        if height > _LINE:
            page.set_row(row, height)
        match said.line:
            case Line.TITLE:
                page.set_row(row, 24)
                page.write_string(row, 0, shown(first, 200), styles.look("title"))
            case Line.SECTION:
                page.write_string(row, 0, first, styles.look("section"))
                page.write_blank(row, 1, None, styles.look("section"))
            case Line.STYLE:
                assert said.kind is not None
                page.write_string(row, 0, first, styles.words(said.kind))
                page.write_string(row, 1, second, styles.look("plain"))
            case Line.SHEET:
                page.write_url(row, 0, f"internal:'{first}'!A1", styles.look("link"), first)
                page.write_string(row, 1, second, styles.look("plain"))
            case Line.PLAIN:
                page.write_string(
                    row, 0, shown(first, 200), styles.look("code" if len(first) == 64 else "plain")
                )
                page.write_string(row, 1, shown(second, _LONGEST_WRAPPED), styles.look("plain"))
    page.set_landscape()
    page.set_paper(9)
    page.fit_to_pages(1, 0)
