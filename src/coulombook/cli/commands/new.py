"""The command `new`."""

from __future__ import annotations

import argparse

from coulombook.cli.common import as_typed, plain_words, refuse
from coulombook.cli.status import DONE
from coulombook.cli.streams import quiet_pipe


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from pathlib import Path

    from coulombook.intake.new_day import write_new_day
    from coulombook.prose.text import visible

    folder = Path(options.folder)
    try:
        write_new_day(folder, options.workbook)
    except OSError as error:
        return refuse(plain_words(error))
    tables = "day.xlsx" if options.workbook else "the tables"
    with quiet_pipe():
        print(
            f"A new day lies in '{visible(options.folder)}'. Fill in day.toml and {tables}, put traces into 'traces',"
        )
        print(f"then see what is missing: coulombook check {as_typed(visible(options.folder))}")
    return DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("folder", metavar="FOLDER", help="the folder to make")
    parser.add_argument("--workbook", action="store_true", help="one workbook instead of CSV files")
