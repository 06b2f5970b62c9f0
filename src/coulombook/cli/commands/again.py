"""The command `again`."""

from __future__ import annotations

import argparse
import os
import sys

from coulombook.cli.common import faults_in_words, missing, plain_words, refuse, tell_findings
from coulombook.cli.status import DONE, FAULTS
from coulombook.cli.streams import quiet_pipe, say

TYPE_CHECKING = False
if TYPE_CHECKING:
    from pathlib import Path

    from coulombook.book import Book
    from coulombook.report.stored import Stored


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from pathlib import Path

    from coulombook.findings import DayFaults
    from coulombook.report.rerun import compare
    from coulombook.report.rerun_view import show_rerun
    from coulombook.report.results import result_files
    from coulombook.report.stored import StoredError, open_results
    from coulombook.report.terminal import console_for

    try:
        stored = open_results(Path(options.results))
        day = Path(options.day) if options.day else stored.folder.resolve().parent
        book = _tally(day, stored, options)
        if isinstance(book, int):
            return book
        tables_only = all(name.endswith((".csv", ".json")) for name in stored.manifest.outputs)
        rerun = compare(stored, book, result_files(book, tables_only=tables_only))
    except (StoredError, NotADirectoryError) as error:
        return refuse(str(error))
    except DayFaults as faults:
        tell_findings(faults.findings)
        say(f"coulombook: {faults_in_words(faults)}; the results cannot be made again")
        return FAULTS
    except OSError as error:
        return refuse(plain_words(error))
    with quiet_pipe():
        show_rerun(stored, rerun, console_for(sys.stdout))
    return DONE if rerun.same and not (stored.changed or stored.missing) else FAULTS


def _tally(day: Path, stored: Stored, options: argparse.Namespace) -> Book | int:
    from pathlib import Path

    from coulombook.report.progress import Progress
    from coulombook.tally import tally

    said = stored.manifest.options
    calibrations = [Path(one) for one in options.calibrations]
    if not calibrations:
        calibrations = [Path(one) for one in said.get("calibrations", "").split(os.pathsep) if one]
    if (problem := missing(day, calibrations)) is not None:
        return refuse(f"{problem}; name the folders with --day and --calibrations")
    with Progress(sys.stderr) as progress:
        return tally(
            day,
            calibrations=calibrations,
            draws=_whole(said.get("draws"), 0),
            seed=_whole(said.get("seed"), 1),
            reconcile=said.get("reconcile") == "yes",
            progress=progress,
        )


def _whole(text: str | None, otherwise: int) -> int:
    return int(text) if text is not None and text.isdecimal() else otherwise


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("results", metavar="RESULTS", help="the results folder, or the day folder it lies in")
    parser.add_argument("--day", metavar="DAY", help="the day folder (default: the one the results lie in)")
    parser.add_argument(
        "--calibrations",
        metavar="DIR",
        action="append",
        default=[],
        help="a folder that holds calibrations (default: as the results were made); may be given several times",
    )
