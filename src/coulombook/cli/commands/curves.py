"""The command `curves`."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.common import missing, plain_words, refuse, tell_findings
from coulombook.cli.status import DONE, FAULTS
from coulombook.cli.streams import quiet_pipe

TYPE_CHECKING = False
if TYPE_CHECKING:
    from pathlib import Path


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from datetime import date
    from pathlib import Path

    from coulombook.findings import Severity
    from coulombook.library.answer import answer, answer_checks
    from coulombook.library.names import UnknownCurve
    from coulombook.library.shelf import open_library
    from coulombook.prose.text import visible
    from coulombook.report.curves_view import show_answer
    from coulombook.report.terminal import console_for
    from coulombook.species import load_species

    places = [Path(one) for one in options.calibrations] or [Path("calibrations")]
    day = Path(options.checks) if options.checks else None
    if (problem := missing(day, places)) is not None:
        return refuse(problem)
    try:
        on = date.fromisoformat(options.on) if options.on else date.today()
    except ValueError:
        return refuse(f"--on takes a date such as 2043-05-18, not '{options.on}'")
    figure = Path(options.figure) if options.figure else None
    if figure is not None and (problem := _no_figure(figure)) is not None:
        return refuse(problem)
    try:
        library = open_library(places)
        if day is None:
            found = answer(library, options.names, load_species(), on)
        else:
            found = answer_checks(library, options.names, load_species(), on, day, places)
        if figure is not None and found.entry is None:
            raise UnknownCurve("--figure draws one curve; name one, such as gc-2043-04/ethylene@FID")
    except UnknownCurve as error:
        if library.broken:
            tell_findings(library.findings)
        return refuse(str(error))
    except OSError as error:
        return refuse(plain_words(error))
    if not library.calibrations and not library.broken:
        where = ", ".join(f"'{one}'" for one in places)
        return refuse(
            f"there are no calibrations in {where}; each is a folder with calibration.toml and standards.csv"
        )
    with quiet_pipe():
        show_answer(found, library, console_for(sys.stdout), on)
    if figure is not None and found.entry is not None and found.entry.curve is not None:
        try:
            from coulombook.report.figure_files import write_curve

            write_curve(found.entry, figure)
        except OSError as error:
            return refuse(f"the figure cannot be written: {plain_words(error)}")
        with quiet_pipe():
            print(f"Drawn into {visible(options.figure, 1000)}")
    if found.findings:
        tell_findings(found.findings)
    return FAULTS if any(one.severity is Severity.STOP for one in found.findings) else DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("names", metavar="NAME", nargs="*", help="curves or calibrations; none: all")
    parser.add_argument(
        "--calibrations",
        metavar="DIR",
        action="append",
        default=[],
        help="a folder that holds calibrations (default: ./calibrations); may be given several times",
    )
    parser.add_argument("--on", metavar="DATE", help="judge validity on this date (default: today)")
    parser.add_argument(
        "--checks", metavar="DAY", help="show a day's check injections on the control chart of the one curve"
    )
    parser.add_argument(
        "--figure", metavar="FILE", help="write a figure of the one curve: .svg, .png or .pdf"
    )


def _no_figure(path: Path) -> str | None:
    """Why a figure cannot be written there, before any work is done."""
    from coulombook.report.figure_files import ENDINGS

    if path.suffix.lower() not in ENDINGS:
        return f"a figure is written as {', '.join(ENDINGS)}; '{path.name}' has another ending"
    if not path.parent.is_dir():
        return f"the folder of the figure, '{path.parent}', does not exist"
    return f"'{path}' is a folder" if path.is_dir() else None
