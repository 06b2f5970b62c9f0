"""The command `figures`."""

from __future__ import annotations

import argparse

from coulombook.cli.common import book_of, reading_options, refuse
from coulombook.cli.parser import did_you_mean
from coulombook.cli.status import DONE
from coulombook.cli.streams import quiet_pipe

FORMATS = ("svg", "pdf", "png")
NARROWEST_MM, WIDEST_MM = 40.0, 400.0
_COLUMN_MM = 85.0
_MM = {"mm": 1.0, "cm": 10.0, "in": 25.4}


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    import sys
    from pathlib import Path

    from coulombook.figures import KINDS
    from coulombook.prose.text import visible
    from coulombook.report.figure_files import figure_files, write_figures
    from coulombook.report.manifest import FIGURES
    from coulombook.report.progress import Progress
    from coulombook.report.results import ResultsError, check_destination

    unknown = [one for one in options.only if one not in KINDS]
    if unknown:
        near = did_you_mean(unknown[0], list(KINDS)) or f"; known: {', '.join(KINDS)}"
        return refuse(f"there is no figure '{unknown[0]}'{near}")
    out = Path(options.out) if options.out else Path(options.day) / "figures"
    if Path(options.day).is_dir():
        try:
            check_destination(out, FIGURES)  # before the work, not after it
        except ResultsError as error:
            return refuse(str(error))
    book = book_of(options)
    if isinstance(book, int):
        return book
    kinds = frozenset(options.only) or None
    with Progress(sys.stderr) as progress:
        files = figure_files(book, options.format, options.width, kinds, progress)
    tables = sum(name.endswith(".csv") for name in files)
    if not tables:
        return refuse(f"the day has nothing to draw for {', '.join(options.only)}; nothing was written")
    try:
        write_figures(book, files, out)
    except ResultsError as error:
        return refuse(str(error))
    with quiet_pipe():
        drawn = f"{tables} figure{'' if tables == 1 else 's'} as {', '.join(options.format)}"
        print(f"{drawn}, each with its table, written to {visible(str(out), 1000)}")
    return DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("day", metavar="DAY", help="the day folder")
    parser.add_argument(
        "--format",
        metavar="F,F",
        type=_formats,
        default=("svg", "pdf"),
        help="svg, pdf and png, parted by commas (default: svg,pdf)",
    )
    parser.add_argument(
        "--width",
        metavar="W",
        type=_width_mm,
        default=_COLUMN_MM,
        help="width of the figures in mm, cm or in (default: 85mm, a column; 178mm is a page)",
    )
    parser.add_argument("--out", metavar="DIR", help="where the figures go (default: DAY/figures)")
    parser.add_argument(
        "--only",
        metavar="NAME",
        action="append",
        default=[],
        help="one kind of figure, listed below; may be given several times (default: all)",
    )
    reading_options(parser)


def _formats(text: str) -> tuple[str, ...]:
    asked = tuple(dict.fromkeys(one.strip().casefold() for one in text.split(",")))
    unknown = [one for one in asked if one not in FORMATS]
    if unknown:
        raise argparse.ArgumentTypeError(f"takes {', '.join(FORMATS)}, parted by commas, not '{unknown[0]}'")
    return asked


def _width_mm(text: str) -> float:
    number, unit = text.strip()[:-2].strip(), text.strip()[-2:].casefold()
    try:
        width = float(number) * _MM[unit]
    except (KeyError, ValueError):
        raise argparse.ArgumentTypeError(
            f"takes a width with its unit, such as 85mm, 8.5cm or 3.35in, not '{text}'"
        ) from None
    if not NARROWEST_MM <= width <= WIDEST_MM:  # not a number fails as well
        raise argparse.ArgumentTypeError(
            f"takes a width from {NARROWEST_MM:g} mm to {WIDEST_MM:g} mm, not '{text}'"
        )
    return width
