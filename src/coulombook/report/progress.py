"""A progress bar that appears only when there is something to wait for."""

from __future__ import annotations

import time
from types import TracebackType
from typing import TYPE_CHECKING, TextIO

if TYPE_CHECKING:
    from rich.progress import Progress as Bar
    from rich.progress import TaskID

WAIT_SECOND = 1.0  # work shorter than this needs no bar


class Progress:
    """Called as ``progress(step, done, total)`` while the work goes on; a context manager around it.

    Parameters
    ----------
    stream : text stream
        Where the bar goes; nothing is shown unless it is a terminal.
    wait_second : float
        Nothing is shown before that much time has passed. [s]
    """

    def __init__(self, stream: TextIO, wait_second: float = WAIT_SECOND) -> None:
        """See the class."""
        self._stream = stream
        self._shown = stream.isatty()
        self._begin = time.monotonic() + wait_second
        self._bar: Bar | None = None
        self._tasks: dict[str, TaskID] = {}

    def __call__(self, step: str, done: int, total: int) -> None:
        """Note that ``done`` of ``total`` pieces of a step are finished."""
        if not self._shown or time.monotonic() < self._begin:
            return
        if self._bar is None:
            self._bar = _bar(self._stream)
            self._bar.start()
        if step not in self._tasks:
            self._tasks[step] = self._bar.add_task(step, total=total)
        self._bar.update(self._tasks[step], completed=done, total=total)

    def __enter__(self) -> Progress:
        """Itself; the bar begins when it is due."""
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Take the bar away."""
        if self._bar is not None:
            self._bar.stop()


def _bar(stream: TextIO) -> Bar:
    from rich.progress import BarColumn, MofNCompleteColumn, TextColumn, TimeRemainingColumn
    from rich.progress import Progress as Bar

    from coulombook.report.terminal import console_for

    return Bar(
        TextColumn("{task.description}", markup=False),
        BarColumn(),
        MofNCompleteColumn(),
        TimeRemainingColumn(),
        console=console_for(stream),
        transient=True,
    )
