"""The sheet a figure is drawn on: its style, its size, and the bytes of its file.

matplotlib is loaded by the functions that need it, and never its windows (pyplot).
"""

from __future__ import annotations

import io
import math
import re
import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

from coulombook.prose.text import visible

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

STYLE = Path(__file__).with_name("coulombook.mplstyle")
"""The style sheet, for ``matplotlib.style.use``."""

COLUMN_MM, PAGE_MM = 85.0, 178.0  # of most journals
FORMATS = ("svg", "pdf", "png")
LONGEST_NAME = 28  # characters of a name within a figure; the table beside it has the rest

_MM_PER_INCH = 25.4
_POINT_MM = _MM_PER_INCH / 72.0
_HEIGHT_SHARE, _HIGHEST_MM = 0.72, 80.0
# groups that matplotlib numbers: in a page of several figures each would come again
_NUMBERED = re.compile(r'<g id="[A-Za-z0-9. ]+_\d+">')
_HEAD = re.compile(r"\A.*?(?=<svg)", re.DOTALL)
_FEW_DECADES = 30.0
# names of title and description, and what would change with the clock
_METADATA_OF = {
    "svg": (("Title", "Description"), ("Date",)),
    "pdf": (("Title", "Subject"), ("CreationDate",)),
    "png": (("Title", "Description"), ()),
}
_METADATA = re.compile(r"\s*<metadata>.*?</metadata>", re.DOTALL)


@contextmanager
def house_style(salt: str = "") -> Iterator[None]:
    """The style of the house, whatever the reader's own settings are; a letter the font lacks becomes a box."""
    import matplotlib as mpl
    import matplotlib.style

    with warnings.catch_warnings(), matplotlib.style.context(STYLE, after_reset=True):
        warnings.filterwarnings("ignore", message=".*missing from.*font", category=UserWarning)
        if salt:
            mpl.rcParams["svg.hashsalt"] = f"coulombook {salt}"
        yield


def new_axes(width_mm: float = COLUMN_MM, height_mm: float | None = None) -> Axes:
    """Empty axes on a sheet of their own."""
    return new_figure(width_mm, height_mm).add_subplot()


def new_figure(width_mm: float, height_mm: float | None = None) -> Figure:
    """An empty sheet; a height of its own where none is given."""
    from matplotlib.figure import Figure

    height = height_mm or min(width_mm * _HEIGHT_SHARE, _HIGHEST_MM)
    return Figure(figsize=(width_mm / _MM_PER_INCH, height / _MM_PER_INCH), layout="constrained")


def grow(axes: Axes, more_mm: float) -> None:
    """Make the sheet higher, for a legend below the axes."""
    figure = axes.figure.get_figure(root=True)
    figure.set_figheight(figure.get_figheight() + more_mm / _MM_PER_INCH)


def width_mm_of(axes: Axes) -> float:
    """Width of the axes as they stand."""
    figure = axes.figure.get_figure(root=True)
    return float(axes.bbox.width / figure.dpi * _MM_PER_INCH)


def shown(name: object, longest: int = LONGEST_NAME) -> str:
    """A name from the files as it stands in a figure."""
    return visible(str(name), longest)


def text_width_mm(text: str, size: float) -> float:
    """Width of a line of letters at a size in points."""
    from matplotlib.font_manager import FontProperties
    from matplotlib.textpath import text_to_path

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        width, _, _ = text_to_path.get_text_width_height_descent(
            text, FontProperties(size=size), ismath=False
        )
    return float(width) * _POINT_MM


def plain_labels(axes: Axes) -> None:
    """Take no text of these axes for a formula, whatever the reader's settings are."""
    for axis in (axes.xaxis, axes.yaxis):
        axis.label.set_parse_math(False)
        for label in axis.get_ticklabels():
            label.set_parse_math(False)


def name_ticks(axes: Axes, names: Sequence[str], *, own: bool) -> None:
    """Names at 0, 1, 2... along x: upright where they do not fit side by side, some left out where not even so."""
    if not names:
        axes.set_xticks([])
        return
    # the legend beside a reader's axes takes its part
    size = float(axes.xaxis.get_ticklabels()[0].get_fontsize())
    place_mm = width_mm_of(axes) * (1.0 if own else 0.5) / len(names)
    across = max(text_width_mm(one, size) for one in names) + 1.0 <= place_mm
    every = 1 if across else max(1, math.ceil(size * _POINT_MM * 0.95 / place_mm))
    places = range(0, len(names), every)
    axes.set_xticks(
        list(places), [names[one] for one in places], rotation=0 if across else 90, parse_math=False
    )
    axes.set_xlim(-0.7, len(names) - 0.3)


def plain_decades(axes: Axes, which: str) -> None:
    """Powers of ten written out on a logarithmic axis whose ends are set; twice and five times them if few."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    from coulombook.prose.numbers import brief

    axis = axes.yaxis if which == "y" else axes.xaxis
    low, high = axis.get_view_interval()
    # a decade or two alone would leave the axis with a label or none
    within = (1.0, 2.0, 5.0) if high < _FEW_DECADES * low else (1.0,)
    axis.set_major_locator(LogLocator(10.0, subs=within, numticks=8))
    # 2 and 5 tell where a decade lies; all eight would take a third of the time that a figure takes
    axis.set_minor_locator(LogLocator(10.0, subs=(2.0, 5.0), numticks=100))
    axis.set_major_formatter(FuncFormatter(lambda value, _: brief(value, 2)))
    axis.set_minor_formatter(NullFormatter())


def rendered(
    figure: Figure, file_format: str, *, title: str = "", description: str = "", salt: str = ""
) -> bytes:
    """The bytes of a figure's file, the same for the same figure.

    Parameters
    ----------
    figure : Figure
    file_format : str
        Of `FORMATS`.
    title, description : str
        Written into the file, for readers that do not see it.
    salt : str
        Makes the ids within an SVG its own, so that several fit into one page.

    Raises
    ------
    ValueError
        Another format.
    """
    if file_format not in FORMATS:
        raise ValueError(f"a figure is written as {', '.join(FORMATS)}, not '{file_format}'")
    words, undated = _METADATA_OF[file_format]
    about: dict[str, str | None] = dict.fromkeys(undated)
    about |= {key: text for key, text in zip(words, (title, description), strict=True) if text}
    stream = io.BytesIO()
    with house_style(salt):
        figure.savefig(stream, format=file_format, metadata=about)
    content = stream.getvalue()
    if file_format == "svg":
        content = _NUMBERED.sub("<g>", content.decode("utf-8")).encode("utf-8")
    return content


def inline_svg(figure: Figure, *, salt: str) -> str:
    """An SVG to stand within a page: without prolog and metadata, its ids its own."""
    text = rendered(figure, "svg", salt=salt).decode("utf-8")
    return _METADATA.sub("", _HEAD.sub("", text, count=1), count=1)
