"""The parser: help as written, and the nearest word for one it does not know."""

from __future__ import annotations

import argparse
import os
import sys

from coulombook.cli.streams import quiet_pipe

TYPE_CHECKING = False
if TYPE_CHECKING:
    from collections.abc import Sequence
    from typing import Any, NoReturn


class Help(argparse.RawDescriptionHelpFormatter):
    """Texts as written; the width asked of the terminal itself, for importing shutil takes long."""

    def __init__(self, prog: str, **settings: Any) -> None:
        settings.setdefault("width", width() - 2)
        super().__init__(prog, **settings)


def width() -> int:
    """Columns of the terminal; 80 where nobody knows."""
    try:
        return int(os.environ["COLUMNS"])
    except (KeyError, ValueError):
        pass
    try:
        return os.get_terminal_size(sys.stdout.fileno()).columns or 80
    except (OSError, ValueError, AttributeError):
        return 80


class Parser(argparse.ArgumentParser):
    """A parser that names the nearest word for one it does not know."""

    def refuse(self, unknown: Sequence[str], arguments: Sequence[str]) -> NoReturn:
        """Refuse arguments that no command takes."""
        named = next((one for one in arguments if one in _commands(self)), None)
        parser = _commands(self)[named] if named else self
        options = [option for action in parser._actions for option in action.option_strings]
        parser.error(
            f"unknown {'option' if unknown[0].startswith('-') else 'argument'} '{unknown[0]}'"
            + did_you_mean(unknown[0].partition("=")[0], options)
        )

    def _check_value(self, action: argparse.Action, value: Any) -> None:
        if action.choices is not None and value not in action.choices:
            known = [str(one) for one in action.choices]
            raise argparse.ArgumentError(
                None,
                f"unknown {action.dest} '{value}'"
                + (did_you_mean(str(value), known) or f"; known: {', '.join(known)}"),
            )


def _commands(parser: argparse.ArgumentParser) -> dict[str, argparse.ArgumentParser]:
    for action in parser._actions:
        if isinstance(action, argparse._SubParsersAction):
            return dict(action.choices)
    return {}


def did_you_mean(word: str, known: Sequence[str]) -> str:
    """The nearest known word, as the end of a sentence; nothing where none is near."""
    import difflib

    near = difflib.get_close_matches(word, known, 1, 0.6)
    return f"; did you mean '{near[0]}'?" if near else ""


class Version(argparse.Action):
    """Print the version and leave."""

    def __call__(self, parser: argparse.ArgumentParser, *_: object) -> NoReturn:
        """Print and leave."""
        import coulombook

        with quiet_pipe():
            print(f"coulombook {coulombook.__version__}")
        parser.exit()
