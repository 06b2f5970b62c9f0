"""Tallies killed: at any moment, and before and after each call of the system while the results are written."""

from __future__ import annotations

import os
import random
import signal
import sys
import time
from collections.abc import Callable
from types import FrameType
from typing import Any

from tests.reliability.bench import NEW, OLD, Bench, Tally, Writings, child, command, seed_of

# modules whose functions ask something of the system
_SYSTEM = {"posix", "io", "_io", "fcntl"}


def at_any_moment(bench: Bench, number: int, seed: int) -> Tally:
    """Kill whole tallies at random moments, one after the other; every tenth is followed by one left in peace."""
    chance = random.Random(seed)
    bench.clear()
    begin = time.monotonic()
    child(bench.tally())
    all_second = time.monotonic() - begin
    told = Tally("tally killed at any moment of reading, computing and writing")
    for one in range(number):
        if one % 5 == 4:
            bench.clear()
        before = bench.results.exists() or bool(bench.aside())
        old = seed_of(bench.results if bench.results.exists() else bench.aside()[0]) if before else None
        # the page and the workbook are left out by half of them, for their making takes most of the time
        work = bench.tally(*(["--tables-only"] if chance.random() < 0.5 else []))
        moment = chance.uniform(0, 1.05 * all_second)
        ended = child(work, moment)
        problems = bench.state([old, bench.newest] if before else [None, bench.newest])
        if ended.status not in (0, -signal.SIGKILL):
            problems.append(f"ended with {ended.status}: {ended.said}")
        if before and (shown := child(command("show", bench.day))).status != 0:
            problems.append(f"show ended with {shown.status}: {shown.said}")
        if one % 10 == 9:
            problems += bench.recovered()
        told.note(f"killed after {1000 * moment:.0f} of {1000 * all_second:.0f} ms", problems)
    return told


class _Calls:
    """Counts calls of the system, and kills this process at one of them."""

    def __init__(self, fatal: int | None) -> None:
        self.names: list[str] = []
        self._fatal = fatal

    def __call__(self, frame: FrameType, event: str, function: Any) -> None:
        if event not in ("c_call", "c_return", "c_exception"):
            return
        module = getattr(function, "__module__", None) or type(getattr(function, "__self__", None)).__module__
        if module not in _SYSTEM:
            return
        if len(self.names) == self._fatal:
            os.kill(os.getpid(), signal.SIGKILL)
        self.names.append(f"{'before' if event == 'c_call' else 'after'} {function.__name__}")


def _traced(work: Callable[[], object], fatal: int | None) -> list[str]:
    calls = _Calls(fatal)
    sys.setprofile(calls)
    try:
        work()
    finally:
        sys.setprofile(None)
    return calls.names


def between_calls(bench: Bench, number: int, seed: int) -> Tally:
    """Kill a writing before and after each call of the system, or at some of them: from old results, from none, and
    from what an earlier kill between the two steps of the exchange left."""
    told = Tally("writing killed between two calls of the system")
    writings = bench.writings
    starts: dict[str, tuple[Callable[[], None], list[str | None]]] = {
        "from old results": (lambda: writings.lay(bench.results), [OLD, NEW]),
        "from no results": (lambda: None, [None, NEW]),
        "from results left aside": (lambda: _lay_aside(writings, bench), [OLD, NEW]),
    }
    chance = random.Random(seed)
    for start, (lay, allowed) in starts.items():
        bench.clear()
        lay()
        names = _traced(writings.write, None)
        places = list(range(len(names)))
        if number < len(places):
            # all steps of lock and exchange, and some of the many that write files
            telling = ("rename", "flock", "mkdir", "unlink", "rmdir")
            aimed = [one for one in places if names[one].split()[1] in telling]
            aimed = chance.sample(aimed, min(len(aimed), number // 2))
            places = sorted({*aimed, *chance.sample(places, number - len(aimed))})
        for place in places:
            bench.clear()
            lay()
            ended = child(lambda place=place: len(_traced(writings.write, place)) and 0)
            problems = bench.state(allowed)
            if ended.status != -signal.SIGKILL:
                problems.append(f"ended with {ended.status}: {ended.said}")
            if None not in allowed and (shown := child(command("show", bench.day))).status != 0:
                problems.append(f"show ended with {shown.status}: {shown.said}")
            problems += writings.recovered()
            told.note(f"{start}, call {place} of {len(names)}, {names[place]}", problems)
    bench.clear()
    return told


def _lay_aside(writings: Writings, bench: Bench) -> None:
    """What a kill between the two steps of an exchange leaves, and a writing that was killed before it."""
    writings.lay(bench.day / ".results.00c0ffee.old")
    writings.lay(bench.day / ".results.00c0ffee.new")
    (bench.day / ".results.00c0ffee.new" / "manifest.json").unlink()
    (bench.day / ".results.lock").write_text(
        "process 1 on a machine that was switched off\n", encoding="utf-8"
    )
