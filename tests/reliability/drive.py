"""A drive that goes away while it is read or written, and a disk that has no room left, at any touch of it.

Within a child every way to a file under the day folder is counted: looking at it, opening, reading, writing, renaming.
From one of these touches on (or at that one alone) the system's answer is an error, as of a network drive whose cable
was pulled; or each write fails once some bytes were written, as on a full disk.
"""

from __future__ import annotations

import builtins
import errno
import io
import os
import random
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

from tests.reliability.bench import OLD, Bench, Ended, Tally, child, command, whole

GONE = (errno.EIO, errno.ESTALE, errno.ENOTCONN, errno.EHOSTDOWN, errno.ETIMEDOUT)
_BY_PATH = ("stat", "lstat", "scandir", "listdir", "readlink", "mkdir", "rename", "unlink", "rmdir", "access")


class _Drive:
    """Counts touches of a folder, and fails at some of them."""

    def __init__(
        self, root: Path, fails: Callable[[int], bool], error: int, room_byte: int | None = None
    ) -> None:
        self.touches = 0
        self.failed = False
        self._root = os.path.realpath(root)
        self._fails = fails
        self._error = error
        self._room_byte = room_byte

    def holds(self, path: Any) -> bool:
        if not isinstance(path, str | os.PathLike):
            return False
        full = os.path.normpath(os.path.join(os.getcwd(), os.fspath(path)))
        return full == self._root or full.startswith(self._root + os.sep)

    def name_of(self, path: Any) -> str:
        """A touch in words: the nearest function of ours, and the file."""
        frame = sys._getframe(2)
        while frame is not None and "coulombook" not in frame.f_code.co_filename:
            frame = frame.f_back
        place = "?" if frame is None else f"{Path(frame.f_code.co_filename).name}:{frame.f_lineno}"
        return f"{place} {'an open file' if path is None else os.fspath(path)}"

    def touch(self, path: Any = None) -> None:
        self.touches += 1
        if self._fails(self.touches):
            if not self.failed:
                self.failed = True
                # where, for whoever looks at a failure
                print(f"[first error at {self.name_of(path)}]", flush=True)
            named = () if path is None else (os.fspath(path),)
            raise OSError(self._error, os.strerror(self._error), *named)

    def write(self, size: int) -> None:
        if self._room_byte is not None:
            self._room_byte -= size
            if self._room_byte < 0:
                raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    def mount(self) -> None:
        """Put it between this process and its system; for good."""
        for name in _BY_PATH:
            setattr(os, name, self._watched(getattr(os, name)))
        os.fsync = self._flushing(os.fsync)
        low, high = os.open, io.open

        def open_low(path: Any, *more: Any, **named: Any) -> int:
            if self.holds(path):
                self.touch(path)
            return low(path, *more, **named)

        def open_high(file: Any, mode: str = "r", buffering: int = -1, *more: Any, **named: Any) -> Any:
            if not self.holds(file):
                return high(file, mode, buffering, *more, **named)
            self.touch(file)
            raw = _File(file, mode.replace("b", "").replace("t", ""))
            raw.drive = self
            stream = (io.BufferedReader if "r" in mode else io.BufferedWriter)(raw)
            return stream if "b" in mode else io.TextIOWrapper(stream, *more, **named)

        os.open, io.open, builtins.open = open_low, open_high, open_high  # type: ignore[assignment]

    def _watched(self, function: Callable[..., Any]) -> Callable[..., Any]:
        def watched(path: Any = ".", *more: Any, **named: Any) -> Any:
            if self.holds(path):
                self.touch(path)
            return function(path, *more, **named)

        return watched

    def _flushing(self, function: Callable[[int], None]) -> Callable[[int], None]:
        def flushing(handle: int) -> None:
            self.touch()
            function(handle)

        return flushing


class _File(io.FileIO):
    """A file of the drive: errors while reading and writing name no file, as those of the system."""

    drive: _Drive

    def readinto(self, buffer: Any) -> Any:
        self.drive.touch()
        return super().readinto(buffer)

    def readall(self) -> bytes:
        self.drive.touch()
        return super().readall()

    def write(self, data: Any) -> Any:
        self.drive.touch()
        self.drive.write(memoryview(data).nbytes)
        return super().write(data)


def _with(drive: _Drive, work: Callable[[], int], count: list[int] | None = None) -> Callable[[], int]:
    def run() -> int:
        drive.mount()
        status = work()
        if count is not None:
            print(f"touches {drive.touches}")
        return status

    return run


def _touches(bench: Bench, work: Callable[[], int]) -> int:
    ended = child(_with(_Drive(bench.day, lambda _: False, 0), work, []))
    if ended.status != 0:
        raise RuntimeError(f"the watched drive changes what is done: {ended.said}")
    return int(ended.said.rpartition("touches ")[2])


def goes_away(bench: Bench, number: int, seed: int) -> Tally:
    """The drive goes away at some touch, for good, while a day is tallied that has results."""
    what = "network drive that goes away"
    return _failing(bench, number, seed, what, lambda at: lambda now: now >= at, (*GONE, errno.ENOENT))


def flickers(bench: Bench, number: int, seed: int) -> Tally:
    """One single touch fails: nothing may be taken for absent that is there, so the numbers are the same or none."""
    return _failing(bench, number, seed, "single error of a drive", lambda at: lambda now: now == at, GONE)


def _failing(
    bench: Bench,
    number: int,
    seed: int,
    what: str,
    fails: Callable[[int], Callable[[int], bool]],
    errors: Sequence[int],
) -> Tally:
    told = Tally(what)
    chance = random.Random(seed)
    bench.clear()
    child(bench.tally("--tables-only"))
    right = _tables(bench.results)
    touches = _touches(bench, bench.tally("--tables-only"))
    old = bench.newest
    places = range(1, touches + 1)
    for place in sorted(chance.sample(places, min(number, touches))):
        error = chance.choice(errors)
        ended = child(_with(_Drive(bench.day, fails(place), error), bench.tally("--tables-only")))
        problems = bench.state([old, bench.newest]) + _answer(ended, bench)
        if ended.status == 0 and (not bench.results.exists() or _tables(bench.results) != right):
            problems.append(f"other numbers than with the whole drive, and nothing said: {ended.said}")
        again = child(bench.tally("--tables-only"))
        old = bench.newest
        if again.status != 0 or whole(bench.results, [old]) or bench.leftovers():
            problems.append(f"the next tally: {again.status} {again.said} {bench.leftovers()}")
        told.note(f"{os.strerror(error)} at touch {place} of {touches}", problems)
    return told


def fills_up(bench: Bench, number: int, seed: int) -> Tally:
    """The disk has room for some bytes more, and none after them."""
    told = Tally("disk that is full after some bytes")
    chance = random.Random(seed)
    writings = bench.writings
    bench.clear()
    writings.lay(bench.results)
    for _ in range(number):
        room = chance.randrange(writings.size_byte)
        drive = _Drive(bench.day, lambda _: False, 0, room)
        ended = child(_with(drive, writings.write))
        problems = (
            bench.state([OLD]) + _answer(ended, bench) + [f"{one} is left" for one in bench.leftovers()]
        )
        if ended.status != 2 or os.strerror(errno.ENOSPC) not in ended.said:
            problems.append(f"ended with {ended.status}: {ended.said}")
        told.note(f"room for {room} of {writings.size_byte} bytes", problems)
    told.note("and then room", writings.recovered())
    return told


def looked_at(bench: Bench, number: int, seed: int) -> Tally:
    """The drive goes away under commands that only look."""
    told = Tally("drive that goes away under check, explain, budget, show and again")
    chance = random.Random(seed)
    bench.clear()
    child(bench.tally("--tables-only"))
    for name in ("check", "explain", "budget", "show", "again"):
        work = command(name, bench.day)
        touches = _touches(bench, work)
        for _ in range(max(number // 5, 1)):
            place = chance.randrange(1, touches + 1)
            error = chance.choice(GONE)
            ended = child(_with(_Drive(bench.day, lambda now, place=place: now >= place, error), work))
            told.note(
                f"{name}, {os.strerror(error)} at touch {place} of {touches}",
                bench.state([bench.newest]) + _answer(ended, bench),
            )
    return told


def _answer(ended: Ended, bench: Bench) -> list[str]:
    """What is wrong with the answer to a fault: it is none of ours, and names a place."""
    if ended.status == 0:
        return []
    names = {bench.day.name, *(one.name for one in bench.day.rglob("*"))}
    if ended.status not in (1, 2) or "Traceback" in ended.said:
        return [f"ended with {ended.status}: {ended.said}"]
    if not any(name in ended.said for name in names):
        return [f"no file is named: {ended.said}"]
    return []


def _tables(folder: Path) -> dict[str, list[bytes]]:
    # intervals are drawn by the seed, by which tallies are told from each other, and a note tells of them
    return {
        one.name: [
            line for line in one.read_bytes().splitlines() if b",propagation-not-validated," not in line
        ]
        for one in folder.glob("*.csv")
        if one.name != "intervals.csv"
    }
