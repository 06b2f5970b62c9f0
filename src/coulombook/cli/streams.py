"""What goes to which stream, and what happens when a stream takes it no longer."""

from __future__ import annotations

import os
import sys

TYPE_CHECKING = False  # importing `typing` for it would slow every start
if TYPE_CHECKING:
    from typing import TextIO


def say(text: str) -> None:
    """Tell the error stream."""
    from contextlib import suppress

    with suppress(OSError):  # nobody is left to be told
        print(text, file=sys.stderr)


class OutputError(Exception):
    """What we print cannot be written where it was sent, such as a full disk."""


class quiet_pipe:
    """Let a reader that stops early (`| head`) stop us from printing, and from nothing else."""

    def __enter__(self) -> None:
        pass

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, _: object) -> bool:
        if isinstance(error, OSError) and not isinstance(error, BrokenPipeError):
            raise OutputError(error.strerror) from error
        return isinstance(error, BrokenPipeError)


def flush(stream: TextIO) -> None:
    """Bring out what is still held, as far as anybody takes it."""
    try:
        with quiet_pipe():
            try:
                stream.flush()
            except OSError:
                # the interpreter flushes once more when it ends, and must find a place that takes it
                os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())
                raise
    except ValueError:  # a caller within Python has closed it
        pass


def prepare_streams() -> None:
    """Show a character that the terminal's encoding lacks by its number, instead of failing on it."""
    for name in ("stdout", "stderr"):
        if getattr(sys, name) is None:  # closed by whoever started us
            setattr(sys, name, open(os.devnull, "w"))  # noqa: SIM115 - as long as the process
        stream = getattr(sys, name)
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
