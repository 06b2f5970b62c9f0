"""What the commands have in common: options of a reading, refusals, findings on the terminal."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.status import FAULTS, WRONG_CALL
from coulombook.cli.streams import quiet_pipe, say

TYPE_CHECKING = False
if TYPE_CHECKING:
    from collections.abc import Iterable
    from pathlib import Path

    from coulombook.book import Book
    from coulombook.findings import DayFaults, Finding


def book_of(options: argparse.Namespace) -> Book | int:
    """The book of a day that is only to be looked at, or the exit status where there is none."""
    from pathlib import Path

    from coulombook.findings import DayFaults
    from coulombook.report.progress import Progress
    from coulombook.tally import tally

    day = Path(options.day)
    calibrations = [Path(one) for one in options.calibrations]
    if (problem := missing(day, calibrations)) is not None:
        return refuse(problem)
    try:
        with Progress(sys.stderr) as progress:
            return tally(day, calibrations=calibrations, progress=progress)
    except DayFaults as faults:
        tell_findings(faults.findings)
        say(f"coulombook: {faults_in_words(faults)}")
        return FAULTS
    except OSError as error:
        return refuse(plain_words(error))


def faults_in_words(faults: DayFaults) -> str:
    """How many faults the day has."""
    count = len(faults.stops)
    return f"the day's data have {count} {'fault' if count == 1 else 'faults'}"


def missing(day: Path | None, calibrations: Iterable[Path]) -> str | None:
    """Why a folder that was named cannot be read; None where all are there."""
    folders = [("day", day)] if day is not None else []
    for what, folder in (*folders, *(("calibrations", one) for one in calibrations)):
        try:
            if folder.is_dir():
                continue
            state = "is a file, not a folder" if folder.exists() else "does not exist"
        except OSError as error:  # a drive that is gone
            state = f"cannot be read: {error.strerror or error}"
        return f"the folder of the {what}, '{folder}', {state}"
    return None


def tell_findings(findings: Iterable[Finding], *, warnings_too: bool = False) -> None:
    """Show findings on the error stream: what stops, and warnings if wanted."""
    from coulombook.findings import Severity
    from coulombook.report.terminal import console_for, show_findings

    with quiet_pipe():
        show_findings(
            findings, console_for(sys.stderr), least=Severity.WARN if warnings_too else Severity.STOP
        )


def refuse(problem: str) -> int:
    """Say why the call cannot be served; the status to end with."""
    from coulombook.prose.text import visible

    say(f"coulombook: {visible(problem, 1000)}")
    return WRONG_CALL


def plain_words(error: OSError) -> str:
    """An error of the system without its number."""
    return f"'{error.filename}': {error.strerror}" if error.filename and error.strerror else str(error)


def as_typed(text: str) -> str:
    """A name as it would be typed on a command line."""
    return text if text.replace("-", "").replace("_", "").isalnum() else f'"{text}"'


def reading_options(parser: argparse.ArgumentParser) -> None:
    """The option that every command which reads a day takes."""
    parser.add_argument(
        "--calibrations",
        metavar="DIR",
        action="append",
        default=[],
        help="a folder that holds calibrations, searched after DAY/calibrations and before ./calibrations; "
        "may be given several times",
    )
