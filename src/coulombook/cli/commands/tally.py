"""The command `tally`."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.common import (
    faults_in_words,
    missing,
    plain_words,
    reading_options,
    refuse,
    tell_findings,
)
from coulombook.cli.status import DONE, FAULTS
from coulombook.cli.streams import quiet_pipe, say

FEWEST_DRAWS = 100  # with fewer no interval has ends worth showing


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from pathlib import Path

    from coulombook.findings import DayFaults, Severity
    from coulombook.report.progress import Progress
    from coulombook.report.results import ResultsError, check_destination, write_results
    from coulombook.tally import tally

    day = Path(options.day)
    out = Path(options.out) if options.out else day / "results"
    calibrations = [Path(one) for one in options.calibrations]
    if (problem := missing(day, calibrations)) is not None:
        return refuse(problem)
    try:
        check_destination(out)  # before the work, not after it
        with Progress(sys.stderr) as progress:
            book = tally(
                day,
                calibrations=calibrations,
                draws=options.draws,
                seed=options.seed,
                reconcile=options.reconcile,
                progress=progress,
            )
        if options.strict and any(one.severity is Severity.WARN for one in book.findings):
            tell_findings(book.findings, warnings_too=True)
            say("coulombook: nothing was written, for --strict was given and the findings above may mislead")
            return FAULTS
        written = write_results(book, out, tables_only=options.tables_only)
    except DayFaults as faults:
        tell_findings(faults.findings, warnings_too=not options.quiet)
        say(f"coulombook: {faults_in_words(faults)}; nothing was written")
        return FAULTS
    except ResultsError as error:
        return refuse(str(error))
    except OSError as error:
        return refuse(plain_words(error))
    if options.plain:
        from coulombook.report.table_view import print_plain

        with quiet_pipe():
            print_plain(book.tables["summary"], sys.stdout)
    elif not options.quiet:
        from coulombook.report.terminal import console_for, show_book

        with quiet_pipe():
            show_book(book, console_for(sys.stdout), written=written)
    return DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("day", metavar="DAY", help="the day folder")
    parser.add_argument("--out", metavar="DIR", help="where the results go (default: DAY/results)")
    reading_options(parser)
    parser.add_argument(
        "--strict",
        action="store_true",
        help="write nothing and end with status 1 if a number may mislead (a warning)",
    )
    parser.add_argument(
        "--tables-only",
        action="store_true",
        help="write the tables alone, without workbook and page",
    )
    parser.add_argument(
        "--plain",
        action="store_true",
        help="print the summary as lines of cells parted by tabs, numbers in full, and nothing else",
    )
    parser.add_argument("--quiet", action="store_true", help="print nothing but what stopped the tally")
    parser.add_argument(
        "--draws",
        metavar="N",
        type=_count_of_draws,
        default=0,
        help="also find coverage intervals by N random draws, 200000 or more for the 95 %% level (default: none)",
    )
    parser.add_argument(
        "--seed", metavar="S", type=_seed, default=1, help="the same seed gives the same draws (default: 1)"
    )
    parser.add_argument(
        "--reconcile",
        action="store_true",
        help="also adjust the readings to totals of 100 %%, in a table beside the measured ones",
    )


def _count_of_draws(text: str) -> int:
    if not text.isdecimal() or 0 < int(text) < FEWEST_DRAWS:
        raise argparse.ArgumentTypeError(f"takes 0 or a number of draws from {FEWEST_DRAWS}, not '{text}'")
    return int(text)


def _seed(text: str) -> int:
    if not text.isdecimal():
        raise argparse.ArgumentTypeError(f"takes a whole number from 0, not '{text}'")
    return int(text)
