"""Figures of a day fit to print, each drawn from a table that is written beside it.

    import coulombook

    book = coulombook.tally("2043-05-18 mesh")
    axes = coulombook.figures.fe_against_potential(book, "annealed copper mesh")
    axes.figure.savefig("fe.pdf")

Every function takes a `Book` and ``ax=None`` and returns the axes it drew on: given axes keep the reader's own
style, otherwise a sheet is made in the style of the house, ``width_mm`` wide. ``data_of("fe_against_potential", book,
"annealed copper mesh")`` is the table that is drawn, with heads `quantity / unit`. `drawings_of` lists every figure a
book has something for, with title, caption, table and a function that draws it. `rendered` gives the bytes of a file,
`inline_svg` an SVG to stand within a page.

Marks that show a row of the table carry its id (``gid`` in matplotlib, ``id`` in SVG), which stands in the row's last
column, ``mark``. Parts of names are per cent encoded, so that colons only ever part them; `mark_id` makes them:

- ``fe:<catalyst>:<level>:<product>`` a bar; ``fe-total:<catalyst>:<level>`` the total of a level;
- ``j-geometric:<catalyst>:<level>:<product>``, ``j-real:...`` a partial current density;
- ``selectivity:<catalyst>:<level>``; ``closure:<run>``;
- ``budget[:<run>]:<output>:<source>:<shared>`` a bar, ``...:rest`` what is not shown singly;
- ``trace:<run>`` a log (``...:I`` and ``...:E`` its two envelopes), ``trace:<run>:window``,
  ``trace:<run>:<injection>`` and ``trace:<run>:<injection>:window``;
- ``curve:<analyte@channel>:<number>`` a standard (``...:residual`` its residual), ``...:curve``,
  ``...:detection-limit``, ``...:quantification-limit``;
- ``capacitance:<electrode>:<number>`` a scan, ``...:line``; ``spectrum:<file>:<number>`` a frequency, ``...:fit``.
"""

from __future__ import annotations

from typing import Any

from coulombook.book.tables import Table
from coulombook.figures import data, details
from coulombook.figures.catalogue import KINDS, Drawing, drawings_of
from coulombook.figures.marks import mark_id, style_of_product, styles_of_catalysts
from coulombook.figures.results import budget, closure, fe_against_potential, partial_currents, selectivity
from coulombook.figures.sheet import COLUMN_MM, FORMATS, PAGE_MM, STYLE, house_style, inline_svg, rendered
from coulombook.figures.single import capacitance, curve_fit, curve_residuals, spectrum, trace

__all__ = [
    "COLUMN_MM",
    "FORMATS",
    "KINDS",
    "PAGE_MM",
    "STYLE",
    "Drawing",
    "budget",
    "capacitance",
    "closure",
    "curve_fit",
    "curve_residuals",
    "data_of",
    "drawings_of",
    "fe_against_potential",
    "house_style",
    "inline_svg",
    "mark_id",
    "partial_currents",
    "rendered",
    "selectivity",
    "spectrum",
    "style_of_product",
    "styles_of_catalysts",
    "trace",
]

_DATA = {
    "budget": data.budget,
    "capacitance": details.capacitance,
    "closure": data.closure,
    "curve_fit": details.curve,
    "curve_residuals": details.curve,
    "fe_against_potential": data.fe_against_potential,
    "partial_currents": data.partial_currents,
    "selectivity": data.selectivity,
    "spectrum": details.spectrum,
    "trace": details.trace,
}


def data_of(figure: str, *arguments: Any, **options: Any) -> Table:
    """The table that the function of this name draws, from the same arguments but the axes.

    Raises ValueError for a figure, catalyst, run... that is not known.
    """
    table: Table = _DATA[data.known("figure", figure, _DATA)](*arguments, **options)  # type: ignore[operator] # mixed
    return table
