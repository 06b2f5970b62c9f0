"""Several tallies of one day at once, and programs that hold its results open."""

from __future__ import annotations

import os
import random
import signal
import time
from collections.abc import Callable
from contextlib import ExitStack

from tests.reliability.bench import NEW, OLD, Bench, Tally, child, whole

from coulombook.report import exchange, lock

_PATIENCE_SECOND = 0.3


def at_once(bench: Bench, number: int, seed: int) -> Tally:
    """Four tallies that start together: each ends well, the results are those of one of them."""
    return _together(bench, number, "four tallies of one day at once", None)


def without_locks(bench: Bench, number: int, seed: int) -> Tally:
    """The same where the file system knows no locks: some may be refused, the results are whole."""
    return _together(bench, number, "four tallies at once where there are no locks", lambda _: False)


def _together(bench: Bench, number: int, what: str, without: Callable[[int], bool | None] | None) -> Tally:
    told = Tally(what)
    bench.clear()
    for _ in range(number):
        children, seeds = [], []
        gate, opened = os.pipe()
        for _ in range(4):
            work = bench.tally("--tables-only")
            seeds.append(bench.newest)
            number = os.fork()
            if number == 0:
                os.close(opened)
                status = 99
                try:
                    if without is not None:
                        lock._lock = without
                    os.read(gate, 1)
                    status = work()
                finally:
                    os._exit(status)
            children.append(number)
        os.close(gate)
        os.close(opened)
        ends = [os.waitstatus_to_exitcode(os.waitpid(one, 0)[1]) for one in children]
        problems = bench.changed_inputs() + whole(bench.results, seeds)
        if without is None:
            problems += [f"{one} is left" for one in bench.leftovers()]
        if any(one not in ((0,) if without is None else (0, 2)) for one in ends) or 0 not in ends:
            problems.append(f"ended with {ends}")
        told.note(f"tallies {', '.join(seeds)}", problems)
    told.note("and then one alone", bench.recovered())
    return told


def held(bench: Bench, number: int, seed: int) -> Tally:
    """A writer that does not end is named, and what it holds is taken over when it is killed."""
    told = Tally("writer that stops while it holds the folder, and is killed")
    writings = bench.writings
    chance = random.Random(seed)
    bench.clear()
    writings.lay(bench.results)
    for _ in range(number):
        holder = os.fork()
        if holder == 0:
            with lock.turn(bench.results, 0.0):
                time.sleep(60)
            os._exit(0)
        name = bench.day / ".results.lock"
        while not (name.exists() and name.read_bytes()):
            time.sleep(0.01)
        if chance.random() < 0.5:
            os.kill(holder, signal.SIGSTOP)

        def second() -> int:
            exchange.PATIENCE_SECOND = _PATIENCE_SECOND
            return writings.write()

        ended = child(second)
        problems = bench.state([OLD])
        if ended.status != 2 or f"is being written by process {holder} on " not in ended.said:
            problems.append(f"ended with {ended.status}: {ended.said}")
        os.kill(holder, signal.SIGKILL)
        os.waitpid(holder, 0)
        begin = time.monotonic()
        problems += writings.recovered()
        if time.monotonic() - begin > 20:
            problems.append("a dead process was waited for")
        told.note(f"process {holder}", problems)
        bench.clear()
        writings.lay(bench.results)
    return told


def open_elsewhere(bench: Bench, number: int, seed: int) -> Tally:
    """Results that are open in other programs: replaced where the system allows it, else left as they are."""
    told = Tally("results open in another program")
    writings = bench.writings
    chance = random.Random(seed)
    for one in range(number):
        bench.clear()
        writings.lay(bench.results)
        with ExitStack() as stack:
            paths = chance.sample(sorted(bench.results.iterdir()), 3)
            before = [path.read_bytes() for path in paths]
            streams = [stack.enter_context(path.open("rb")) for path in paths]
            for stream, content in zip(streams, before, strict=True):
                stream.seek(len(content) // 2)
            # a system that renames no folder with open files; at first only, as for a scan for viruses, or all the time
            refusals = (0, 3, 1000)[one % 3]
            ended = child(lambda refusals=refusals: _refusing(refusals, writings.write))
            read = [stream.seek(0) or stream.read() for stream in streams]
        problems = bench.state([NEW if refusals < 1000 else OLD])
        problems += [f"{one} is left" for one in bench.leftovers()]
        if read != before:
            problems.append("the open files are not what they were")
        if ended.status != (0 if refusals < 1000 else 2) or (
            refusals == 1000 and "close programs" not in ended.said
        ):
            problems.append(f"ended with {ended.status}: {ended.said}")
        told.note(f"{refusals} refusals", problems)
    bench.clear()
    return told


def _refusing(times: int, work: Callable[[], int]) -> int:
    rename, left = os.rename, times

    def refusing(old: str, new: str) -> None:
        nonlocal left
        if left:
            left -= 1
            raise PermissionError(13, "The process cannot access the file because it is being used", str(old))
        rename(old, new)

    os.rename = refusing
    exchange._PAUSES_SECOND = (0.01, 0.01, 0.02, 0.02)  # as under Windows, but shorter
    return work()
