"""The command `budget`."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.common import book_of, reading_options, refuse
from coulombook.cli.parser import did_you_mean
from coulombook.cli.status import DONE
from coulombook.cli.streams import quiet_pipe


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from coulombook.book.shares import TOTAL, outputs_of, runs_of, source_shares
    from coulombook.report.budget_view import show_budget
    from coulombook.report.terminal import console_for
    from coulombook.species import load_species

    book = book_of(options)
    if isinstance(book, int):
        return book
    table = book.tables["budget"]
    if options.run is not None and options.run not in runs_of(table):
        return refuse(f"the day has no run '{options.run}'{did_you_mean(options.run, runs_of(table))}")
    outputs = outputs_of(table, options.run)
    asked = TOTAL if options.product is None else options.product
    species = load_species().find(asked)
    output = next(
        (one for one in outputs if one.casefold() in (asked.casefold(), species.name if species else "")),
        None,
    )
    if output is None:
        of_run = f" of run '{options.run}'" if options.run is not None else ""
        near = did_you_mean(asked, outputs) or f"; known: {', '.join(outputs) or 'none'}"
        return refuse(f"there is no budget of '{asked}'{of_run}{near}")
    runs, shares = source_shares(table, output, options.run)
    of = (
        f"run {options.run}"
        if options.run is not None
        else f"mean of {runs} {'run' if runs == 1 else 'runs'}"
    )
    unit = " mA/cm^2" if output.startswith("j real ") else "" if output == "C2+/C1" else " %"
    with quiet_pipe():
        show_budget(
            f"{book.day}: variance of {output}, {of}",
            shares,
            unit,
            [one for one in outputs if one != output and not one.startswith("j real ")],
            console_for(sys.stdout),
        )
    return DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("day", metavar="DAY", help="the day folder")
    parser.add_argument("--run", metavar="R", help="one run (default: the mean of all runs)")
    parser.add_argument(
        "--product",
        metavar="P",
        help="a product by any of its names, C2+/C1, C2+ FE, or 'j real ethylene' (default: the total FE)",
    )
    reading_options(parser)
