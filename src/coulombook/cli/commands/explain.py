"""The command `explain`."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.common import book_of, reading_options
from coulombook.cli.status import DONE
from coulombook.cli.streams import quiet_pipe


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from coulombook.report.explain_view import show_explanation
    from coulombook.report.terminal import console_for

    book = book_of(options)
    if isinstance(book, int):
        return book
    with quiet_pipe():
        show_explanation(book, console_for(sys.stdout))
    return DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("day", metavar="DAY", help="the day folder")
    reading_options(parser)
