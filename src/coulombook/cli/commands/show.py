"""The command `show`."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.common import refuse
from coulombook.cli.parser import did_you_mean
from coulombook.cli.status import DONE
from coulombook.cli.streams import quiet_pipe, say

TYPE_CHECKING = False
if TYPE_CHECKING:
    from coulombook.book import Book
    from coulombook.report.stored import Stored


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from pathlib import Path

    from coulombook.report.stored import StoredError, open_results, read_book

    try:
        stored = open_results(Path(options.results))
        book = read_book(stored)
    except StoredError as error:
        return refuse(str(error))
    if (problem := _unknown(book, options)) is not None:
        return refuse(problem)
    with quiet_pipe():
        _print(book, stored, options)
    _warn(stored)
    return DONE


def _unknown(book: Book, options: argparse.Namespace) -> str | None:
    if options.table is not None and options.table not in book.tables:
        near = did_you_mean(options.table, list(book.tables)) or f"; known: {', '.join(book.tables)}"
        return f"the results have no table '{options.table}'{near}"
    runs = [str(one) for one in book.tables["summary"].column("run")]
    if options.run is not None and options.run not in runs:
        return f"the results have no run '{options.run}'{did_you_mean(options.run, runs)}"
    return None


def _print(book: Book, stored: Stored, options: argparse.Namespace) -> None:
    from coulombook.book import Table
    from coulombook.report.table_view import print_plain, show_table
    from coulombook.report.terminal import console_for, show_book

    console = console_for(sys.stdout)
    if options.table is None and not options.plain:
        if options.run is None:
            show_book(book, console, written=stored.folder)
        else:
            from coulombook.report.run_view import show_run

            show_run(book, options.run, console)
        return
    # a run is told best by its ledger, a day by its runs
    table = book.tables[options.table or ("summary" if options.run is None else "ledger")]
    if options.run is not None and "run" in table.heads:
        place = table.heads.index("run")
        table = Table(table.name, table.heads, tuple(row for row in table.rows if row[place] == options.run))
    if options.plain:
        print_plain(table, sys.stdout)
    else:
        show_table(table, console)


def _warn(stored: Stored) -> None:
    if stored.interrupted:
        say("coulombook: a tally was interrupted while it replaced these results; they are those of before")
    for words, names in (("changed", stored.changed), ("removed", stored.missing)):
        if names:
            say(f"coulombook: {words} since the results were written: {', '.join(names)}")


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("results", metavar="DAY", help="the day folder, or its results folder")
    parser.add_argument("--run", metavar="R", help="one run: its products, injections, sources, findings")
    parser.add_argument("--table", metavar="NAME", help="one table, such as ledger, series or budget")
    parser.add_argument(
        "--plain",
        action="store_true",
        help="lines of cells parted by tabs, numbers in full: the summary, or the table asked for",
    )
