"""The command `why`."""

from __future__ import annotations

import argparse
import sys

from coulombook.cli.common import refuse
from coulombook.cli.status import DONE
from coulombook.cli.streams import quiet_pipe


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    from coulombook.report.terminal import console_for
    from coulombook.report.why_view import show_kinds, show_page
    from coulombook.why import UnknownKind, page_of

    console = console_for(sys.stdout)
    if not options.kind:
        with quiet_pipe():
            show_kinds(console)
        return DONE
    try:
        page = page_of(" ".join(options.kind))
    except UnknownKind as error:
        near = " or ".join(f"'{one}'" for one in error.near)
        return refuse(
            f"{error}; did you mean {near}?" if near else f"{error}; coulombook why lists those there are"
        )
    with quiet_pipe():
        show_page(page, console)
    return DONE


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument(
        "kind", metavar="KIND", nargs="*", help="a kind of finding, such as unknown-unit; none: list them all"
    )
