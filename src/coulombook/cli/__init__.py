"""The command `coulombook`: its options, its exit status, and what goes to which stream.

Exit status: 0 done; 1 the day's data have faults, or --strict was given and something may mislead (nothing is
written in either case); 2 a wrong option, a missing file or a folder that cannot be written; 3 a fault of
ours, shown with its traceback; 130 interrupted.

The help answers at once: everything but argparse is imported by the command that needs it.
"""

from __future__ import annotations

import sys

from coulombook.cli.parser import Help, Parser, Version
from coulombook.cli.status import DONE as DONE
from coulombook.cli.status import FAULTS as FAULTS
from coulombook.cli.status import INTERRUPTED, OUR_FAULT, WRONG_CALL
from coulombook.cli.streams import OutputError, flush, prepare_streams, say
from coulombook.cli.texts import COMMANDS, EXAMPLES, OVERVIEW

TYPE_CHECKING = False  # importing `typing` for it would slow every start
if TYPE_CHECKING:
    from collections.abc import Sequence
    from types import ModuleType


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command and return its exit status; ``arguments`` default to those of the process."""
    prepare_streams()
    try:
        try:
            return _run(sys.argv[1:] if arguments is None else list(arguments))
        finally:
            flush(sys.stdout)
    except SystemExit as stop:  # argparse: the help, or a wrong call
        return stop.code if isinstance(stop.code, int) else WRONG_CALL
    except OutputError as error:
        say(f"coulombook: the output cannot be written: {error}")
        return WRONG_CALL
    except KeyboardInterrupt:
        say("coulombook: interrupted")
        return INTERRUPTED
    except Exception:
        import traceback

        import coulombook

        say(traceback.format_exc().rstrip())
        say(
            f"coulombook {coulombook.__version__}: this is a fault of coulombook, not of your data. "
            "Please report it with the lines above."
        )
        return OUR_FAULT


def _run(arguments: Sequence[str]) -> int:
    parser = _parser(arguments)
    options, unknown = parser.parse_known_args(arguments)
    if unknown:
        parser.refuse(unknown, arguments)
    if options.command is None:
        parser.print_help(sys.stderr)
        return WRONG_CALL
    status: int = _module(options.command).run(options)
    return status


def _parser(arguments: Sequence[str]) -> Parser:
    """The parser; of the commands only those named in the arguments get their options, for each option costs time."""
    parser = Parser(
        prog="coulombook",
        description=OVERVIEW,
        epilog=EXAMPLES,
        formatter_class=Help,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action=Version, nargs=0, help="print the version and leave")
    commands = parser.add_subparsers(dest="command", title="commands", metavar="COMMAND", prog=parser.prog)
    for name, (short, text, examples) in COMMANDS.items():
        command = commands.add_parser(
            name, help=short, description=text, epilog=examples, formatter_class=Help, allow_abbrev=False
        )
        if name in arguments:
            _module(name).give_options(command)
    return parser


def whole_parser() -> Parser:
    """The parser with the options of every command, for what must know all of them."""
    return _parser(list(COMMANDS))


def _module(command: str) -> ModuleType:
    from importlib import import_module

    return import_module(f"coulombook.cli.commands.{command}")
