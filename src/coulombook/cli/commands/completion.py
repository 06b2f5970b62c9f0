"""The command `completion`."""

from __future__ import annotations

import argparse

from coulombook.cli.status import DONE
from coulombook.cli.streams import quiet_pipe

SHELLS = ("bash", "zsh", "tcsh")
_FOLDERS = ("DAY", "DIR", "FOLDER", "RESULTS")


def run(options: argparse.Namespace) -> int:
    """Do the work of the command; the exit status."""
    import shtab

    from coulombook.cli import whole_parser

    parser = whole_parser()
    _complete_folders(parser)
    with quiet_pipe():
        print(shtab.complete(parser, shell=options.shell))
    return DONE


def _complete_folders(parser: argparse.ArgumentParser) -> None:
    """Say of every argument that names a folder or a file what to complete it with."""
    import shtab

    for action in parser._actions:
        if isinstance(action, argparse._SubParsersAction):
            for command in action.choices.values():
                _complete_folders(command)
        elif action.metavar in _FOLDERS:
            action.complete = shtab.DIRECTORY  # type: ignore[attr-defined] # where shtab looks for it
        elif action.metavar == "FILE":
            action.complete = shtab.FILE  # type: ignore[attr-defined] # likewise


def give_options(parser: argparse.ArgumentParser) -> None:
    """Options of the command."""
    parser.add_argument("shell", metavar="SHELL", choices=SHELLS, help=f"one of {', '.join(SHELLS)}")
