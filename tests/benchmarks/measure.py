"""Measure processes and functions in turns, and compare medians."""

from __future__ import annotations

import os
import subprocess
import tempfile
import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from statistics import median


@dataclass(frozen=True, slots=True)
class Cost:
    """Wall time, processor time and peak memory."""

    second: float
    processor_second: float = 0.0
    peak_byte: int = 0


@dataclass(frozen=True, slots=True)
class Costs:
    """Medians of several turns."""

    second: float
    processor_second: float
    peak_byte: float

    @classmethod
    def of(cls, turns: Sequence[Cost]) -> Costs:
        return cls(
            median(one.second for one in turns),
            median(one.processor_second for one in turns),
            median(one.peak_byte for one in turns),
        )


def in_turns(
    sides: Mapping[str, Callable[[], Cost]],
    repeats: int,
    warm_up: Mapping[str, Callable[[], Cost]] | None = None,
) -> dict[str, Costs]:
    """Run every side ``repeats`` times, one after the other, after a first time that does not count."""
    for first in (sides if warm_up is None else warm_up).values():
        first()
    turns: dict[str, list[Cost]] = {name: [] for name in sides}
    for _ in range(repeats):
        for name, side in sides.items():
            turns[name].append(side())
    return {name: Costs.of(costs) for name, costs in turns.items()}


def timed(function: Callable[[], object]) -> Callable[[], Cost]:
    """A function of this process as a side of a comparison."""

    def run() -> Cost:
        start = time.perf_counter()
        function()
        return Cost(time.perf_counter() - start)

    return run


def process(command: Sequence[str | Path], bytecode: Path) -> Callable[[], Cost]:
    """A command as a side of a comparison; RuntimeError with what it said when it fails.

    Compiled modules are kept in the folder ``bytecode``, so that both sides find theirs whatever the environment says,
    and nothing is written beside the sources. The peak is that of the process alone; this one must stay smaller, for
    the system counts the parent's size from before the start of a child.
    """
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
    environment["PYTHONPYCACHEPREFIX"] = str(bytecode)

    def run() -> Cost:
        with tempfile.TemporaryFile() as said:
            start = time.perf_counter()
            child = subprocess.Popen(
                list(map(str, command)), stdout=subprocess.DEVNULL, stderr=said, env=environment
            )
            _, status, usage = os.wait4(child.pid, 0)
            second = time.perf_counter() - start
            child.returncode = os.waitstatus_to_exitcode(status)
            if child.returncode != 0:
                said.seek(0)
                raise RuntimeError(f"{command[0]} failed:\n{said.read().decode(errors='replace')}")
        # Linux counts memory in units of 1024 byte
        return Cost(second, usage.ru_utime + usage.ru_stime, usage.ru_maxrss * 1024)

    return run
