"""The command `check`."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.common import missing, plain_words, reading_options, refuse
from coulombook.cli.status import DONE, FAULTS
from coulombook.cli.streams import quiet_pipe


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from pathlib import Path

    from coulombook.findings import Severity
    from coulombook.report.terminal import console_for, show_check
    from coulombook.tally import check

    day = Path(options.day)
    calibrations = [Path(one) for one in options.calibrations]
    if (problem := missing(day, calibrations)) is not None:
        return refuse(problem)
    try:
        checked = check(day, calibrations=calibrations)
    except OSError as error:
        return refuse(plain_words(error))
    with quiet_pipe():
        show_check(checked.lines, checked.findings, console_for(sys.stdout))
    wrong = {Severity.STOP, Severity.WARN} if options.strict else {Severity.STOP}
    return FAULTS if any(one.severity in wrong for one in checked.findings) else DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("day", metavar="DAY", help="the day folder")
    reading_options(parser)
    parser.add_argument("--strict", action="store_true", help="end with status 1 for a warning as well")
