"""The command `compare`."""

from __future__ import annotations

import argparse
import re
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

_BASES = ("geometric", "real")
_KINDS = ("FE", "C2+/C1", "j")


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from pathlib import Path

    from coulombook.comparison.order import ComparisonError, compare_days
    from coulombook.findings import DayFaults
    from coulombook.report.compare_view import show_comparison
    from coulombook.report.comparison_files import write_comparison
    from coulombook.report.progress import Progress
    from coulombook.report.results import ResultsError
    from coulombook.report.terminal import console_for

    days = [Path(one) for one in options.days]
    calibrations = [Path(one) for one in options.calibrations]
    for day in days:
        if (problem := missing(day, calibrations)) is not None:
            return refuse(problem)
    out = Path(options.out) if options.out else None
    try:
        with Progress(sys.stderr) as progress:
            comparison = compare_days(
                days,
                calibrations=calibrations,
                products=options.product,
                kinds=options.quantity,
                bases=options.basis or _BASES,
                potentials=options.at,
                catalysts=options.catalyst,
                closed_only=options.closed,
                apart=options.apart,
                one_error=options.one_error,
                progress=progress,
            )
        written = None if out is None else write_comparison(comparison, out)
    except DayFaults as faults:
        tell_findings(faults.findings)
        say(f"coulombook: {faults_in_words(faults)}; nothing was compared")
        return FAULTS
    except (ComparisonError, ResultsError) as error:
        return refuse(str(error))
    except OSError as error:
        return refuse(plain_words(error))
    with quiet_pipe():
        show_comparison(comparison, console_for(sys.stdout), written=written)
    return DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    # a list of negative potentials is a value and no option
    parser._negative_number_matcher = re.compile(r"^-[\d.]+([,;\s]+-?[\d.]+)*$")
    parser.add_argument("days", metavar="DAY", nargs="+", help="day folders")
    parser.add_argument(
        "--product",
        metavar="P",
        action="append",
        default=[],
        help="a product by any of its names, or C2+, C1, H2; may be given several times, and the first decides "
        "the verdict (default: C2+ and H2)",
    )
    parser.add_argument(
        "--quantity",
        metavar="Q",
        action="append",
        choices=_KINDS,
        default=[],
        help="FE, C2+/C1 or j, the partial current density; may be given several times (default: all)",
    )
    parser.add_argument(
        "--basis",
        metavar="B",
        action="append",
        choices=_BASES,
        help="area of current densities: geometric or real (default: both)",
    )
    parser.add_argument(
        "--at",
        metavar="E,E",
        type=_potentials,
        help="common potentials vs RHE in V, such as -0.95,-1.05 (default: round ones where the ranges overlap)",
    )
    parser.add_argument(
        "--catalyst",
        metavar="C",
        action="append",
        default=[],
        help="only this one; may be given several times",
    )
    parser.add_argument(
        "--closed", action="store_true", help="leave out runs whose charge balance does not close"
    )
    parser.add_argument(
        "--apart",
        action="store_true",
        help="take a catalyst on one day for another than that of the same name on another day",
    )
    parser.add_argument(
        "--one-error",
        metavar="Q",
        action="append",
        default=[],
        help="a quantity whose error is one over all days, such as 'outlet flow' by one meter; may be given "
        "several times (default: the days are independent but for curves and tables they share)",
    )
    parser.add_argument("--out", metavar="DIR", help="also write the tables there as CSV")
    reading_options(parser)


def _potentials(text: str) -> list[float]:
    try:
        found = [float(one) for one in re.split(r"[,;\s]+", text.strip())]
    except ValueError:
        found = []
    if not found or not all(-100.0 < one < 100.0 for one in found):
        raise argparse.ArgumentTypeError(f"takes potentials such as -0.95,-1.05, not '{text}'")
    return found
