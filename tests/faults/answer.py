"""What the command answers, taken apart: status, faults with their lines, and what lies on the disk afterwards."""

from __future__ import annotations

import hashlib
import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import pytest
from tests.faults.day import TABLES

from coulombook.cli import main

_HEAD = re.compile(r"(error|warning|note)\[([a-z-]+)\]: (.*)")
_PART = re.compile(r"  (found|expected|mend): +(.*)")


@dataclass(slots=True)
class Said:
    """One finding as the command shows it."""

    word: str
    kind: str
    where: str
    text: str = ""
    found: str = ""
    expected: str = ""
    mend: str = ""


@dataclass(frozen=True, slots=True)
class Fault:
    """What must be said: kind and place as a whole; found, expected and mend as patterns to be found in the line."""

    kind: str
    where: str
    found: str
    expected: str
    mend: str

    def is_said_by(self, said: Said) -> bool:
        """Whether a finding says this."""
        return (
            said.word == "error"
            and said.kind == self.kind
            and said.where == self.where
            and bool(re.search(self.found, said.found))
            and bool(re.search(self.expected, said.expected))
            and bool(re.search(self.mend, said.mend))
        )


@dataclass(frozen=True, slots=True)
class Answer:
    """The outcome of one command."""

    status: int
    out: str
    err: str

    @property
    def errors(self) -> list[Said]:
        """Faults shown on either stream; equal ones at several places stand together, with all their places."""
        return [one for one in said(self.err) + said(self.out) if one.word == "error"]


def said(text: str) -> list[Said]:
    """The findings in a text of the command, which must be wide enough to need no second line for a part."""
    found: list[Said] = []
    for line in text.splitlines():
        if head := _HEAD.fullmatch(line.rstrip()):
            found.append(Said(*head.groups()))
        elif found and (part := _PART.fullmatch(line.rstrip())):
            setattr(found[-1], part[1], part[2])
        elif found and line.startswith("  ") and not found[-1].text:
            found[-1].text = line.strip()
    return found


def snapshot(folder: Path) -> dict[str, str]:
    """Every path under a folder with the digest of its bytes, or where it points to."""
    marks = {}
    for path in sorted(folder.rglob("*")):
        name = path.relative_to(folder).as_posix()
        if path.is_symlink():
            marks[name] = f"-> {path.readlink()}"
        elif path.is_file():
            marks[name] = hashlib.sha256(path.read_bytes()).hexdigest()
        else:
            marks[name] = "folder"
    return marks


class Command:
    """Runs the command within this process, in a folder of its own."""

    def __init__(self, capsys: pytest.CaptureFixture[str]) -> None:
        self._capsys = capsys

    def __call__(self, *arguments: Any) -> Answer:
        self._capsys.readouterr()
        status = main([str(one) for one in arguments])
        out, err = self._capsys.readouterr()
        return Answer(status, out, err)

    def refuses(self, day: Path, faults: Sequence[Fault], *options: Any, check: bool = True) -> Answer:
        """Hold that `tally` (and `check`) refuse a day for exactly these faults, and that nothing is written."""
        before = snapshot(Path.cwd())
        answer = self("tally", day, *options)
        assert answer.status == 1, answer.err
        assert "Traceback" not in answer.err
        assert answer.out == ""
        hold(answer.errors, faults, answer.err)
        count = sum(len(one.where.split("; ")) for one in answer.errors)
        assert f"the day's data have {count} fault{'s' * (count > 1)}; nothing was written" in answer.err
        assert snapshot(Path.cwd()) == before
        if not check:
            return answer
        checked = self("check", day, *options)
        assert checked.status == 1, checked.out
        assert checked.errors == answer.errors
        assert snapshot(Path.cwd()) == before
        return answer


def hold(errors: Sequence[Said], faults: Sequence[Fault], text: str) -> None:
    """Hold that the errors are these faults and no others, and that each says everything."""
    left = list(errors)
    for fault in faults:
        match = next((one for one in left if fault.is_said_by(one)), None)
        assert match is not None, f"nothing says {fault} in\n{text}"
        left.remove(match)
    assert not left, f"more is said than is wrong: {left}"
    for one in errors:
        for part in ("where", "text", "found", "expected", "mend"):
            assert getattr(one, part), f"error[{one.kind}] at {one.where} has no line '{part}'"


def in_workbook(fault: Fault) -> Fault:
    """The same fault of a table that is a sheet of day.xlsx."""
    return replace(fault, where=re.sub(rf"\b({'|'.join(TABLES)})\.csv", r"day.xlsx, sheet '\1'", fault.where))
