from __future__ import annotations

import io

import pytest

from coulombook.report.progress import Progress


class Screen(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


def test_work_of_less_than_a_second_shows_no_bar() -> None:
    screen = Screen()
    with Progress(screen) as progress:
        progress("traces", 1, 2)
        progress("traces", 2, 2)
    assert screen.getvalue() == ""


def test_longer_work_shows_step_and_count(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TERM", "xterm")
    screen = Screen()
    with Progress(screen, wait_second=0.0) as progress:
        progress("traces [bold]", 1, 40)
        progress("traces [bold]", 40, 40)
        progress("scans", 3, 6)
    assert "traces [bold]" in screen.getvalue()
    assert "40/40" in screen.getvalue()
    assert "3/6" in screen.getvalue()


def test_nothing_is_shown_where_no_terminal_is() -> None:
    stream = io.StringIO()
    with Progress(stream, wait_second=0.0) as progress:
        progress("traces", 1, 40)
    assert stream.getvalue() == ""
