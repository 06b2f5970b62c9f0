"""Figures as files: a folder of all figures of a day with the table of each beside it, or one curve."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from pathlib import Path
from tempfile import mkstemp

from coulombook.book import Book
from coulombook.figures import Drawing, drawings_of, rendered
from coulombook.figures.single import curve_sheet
from coulombook.library.picture import axis_heads, picture
from coulombook.library.shelf import Entry
from coulombook.prose.text import visible
from coulombook.report.manifest import FIGURES
from coulombook.report.results import write_folder
from coulombook.report.tables import csv_text

CAPTIONS = "captions.txt"
_CURVE_MM = 130.0
ENDINGS = (".svg", ".png", ".pdf")

Progress = Callable[[str, int, int], None]


def figure_files(
    book: Book,
    formats: Sequence[str],
    width_mm: float,
    kinds: frozenset[str] | None = None,
    progress: Progress | None = None,
) -> dict[str, bytes]:
    """Every figure of a book in some formats, the table of each, and the captions of all; by file name.

    Parameters
    ----------
    book : Book
    formats : sequence of str
        Of `coulombook.figures.FORMATS`; with none the tables alone.
    width_mm : float
        Width of the sheets.
    kinds : frozenset of str, optional
        Of `coulombook.figures.KINDS`; all by default.
    progress : callable, optional
        Called as progress(what, done, of).
    """
    drawings = drawings_of(book, kinds)
    files: dict[str, bytes] = {}
    for done, drawing in enumerate(drawings, start=1):
        files |= _files_of(drawing, formats, width_mm)
        if progress is not None:
            progress("figures", done, len(drawings))
    files[CAPTIONS] = "\n".join(f"{one.name}\n    {one.title}. {one.caption}\n" for one in drawings).encode()
    return files


def write_figures(book: Book, files: dict[str, bytes], out: Path) -> Path:
    """Write `figure_files` into a folder of their own, whole or not at all; see `coulombook.report.results`."""
    return write_folder(book, files, out, holds=FIGURES)


def _files_of(drawing: Drawing, formats: Sequence[str], width_mm: float) -> dict[str, bytes]:
    files = {f"{drawing.name}.csv": csv_text(drawing.data).encode("utf-8", "backslashreplace")}
    if formats:
        figure = drawing.draw(None, width_mm).get_figure(root=True)
        assert figure is not None  # the axes were made on one
        for one in formats:
            files[f"{drawing.name}.{one}"] = rendered(
                figure, one, title=drawing.title, description=drawing.caption, salt=drawing.name
            )
    return files


def write_curve(entry: Entry, path: Path) -> None:
    """Write a figure of one curve as SVG, PNG or PDF by the name's ending: beside its place first, then into it.

    Raises
    ------
    ValueError
        Another ending, or an entry without curve.
    OSError
        The place cannot be written.
    """
    ending = path.suffix.lower()
    if ending not in ENDINGS:
        raise ValueError(f"a figure is written as {', '.join(ENDINGS)}, not '{path.suffix}'")
    title = f"{visible(entry.name, 60)}, {visible(entry.calibration.name, 60)}"
    figure = curve_sheet(picture(entry), entry.name, axis_heads(entry), title, _CURVE_MM)
    write_file(rendered(figure, ending[1:], title=title), path)


def write_file(content: bytes, path: Path) -> None:
    """Write a file whole or not at all. Raises OSError where it cannot be written."""
    # beside the place it goes to, so that the last step is a change of name
    handle, beside = mkstemp(prefix=".figure-", suffix=path.suffix, dir=path.parent)
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(content)
            stream.flush()
            os.fsync(stream.fileno())
        # a temporary file is private; a figure is like any other file its owner writes
        mask = os.umask(0)
        os.umask(mask)
        os.chmod(beside, 0o666 & ~mask)
        os.replace(beside, path)
    except BaseException:
        os.unlink(beside)
        raise
