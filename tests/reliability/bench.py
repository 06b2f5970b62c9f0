"""A small day on a disk, commands in processes of their own, and what must be true after whatever befell them.

Commands run in forks of this process, which has loaded everything before: that is quick, so that many faults can be
made, and a fork can be killed, starved or lied to without harm to the next one. Where a system has no fork (Windows)
none of this runs.
"""

from __future__ import annotations

import functools
import hashlib
import json
import os
import re
import shutil
import signal
import sys
import tempfile
import time
import traceback
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path

from tests.faults.day import write_day

from coulombook.cli import main
from coulombook.cli.common import refuse
from coulombook.report.results import ResultsError, result_files, write_folder
from coulombook.tally import tally

OLD, NEW = "old", "new"  # in the place of seeds
_OURS = re.compile(r"\.results\.(?:[0-9a-f]{8}\.(?:new|old)|lock)")


@dataclass(slots=True)
class Tally:
    """How many faults of a kind were made, and what went wrong at those that were not survived."""

    what: str
    tried: int = 0
    failures: list[str] = field(default_factory=list)
    skipped: str = ""  # why it cannot be tried here

    def note(self, where: str, problems: Sequence[str]) -> None:
        """One more fault, and what was wrong after it."""
        self.tried += 1
        if problems:
            self.failures.append(f"{where}: {'; '.join(problems)}")


@dataclass(frozen=True, slots=True)
class Ended:
    """How a process ended, and all that it said."""

    status: int  # below zero: the signal that ended it
    said: str


def child(work: Callable[[], int], kill_after_second: float | None = None) -> Ended:
    """Run a piece of work in a fork, and kill it after a time if it is not done by then."""
    with tempfile.TemporaryFile() as said:
        sys.stdout.flush()
        number = os.fork()
        if number == 0:
            _be_child(work, said.fileno())
        if kill_after_second is not None:
            time.sleep(kill_after_second)
            os.kill(number, signal.SIGKILL)
        _, ended = os.waitpid(number, 0)
        said.seek(0)
        return Ended(os.waitstatus_to_exitcode(ended), said.read().decode("utf-8", "replace"))


def _be_child(work: Callable[[], int], said: int) -> None:
    status = 99
    try:
        os.dup2(said, 1)
        os.dup2(said, 2)
        status = work()
    except BaseException:
        traceback.print_exc()
    finally:
        sys.stdout.flush()
        sys.stderr.flush()
        os._exit(status)


def command(*arguments: str | Path) -> Callable[[], int]:
    """A command as work of a child."""
    return lambda: main([str(one) for one in arguments])


class Bench:
    """A folder with a good small day, whose files must never change."""

    def __init__(self, place: Path) -> None:
        os.environ.update(COLUMNS="400", COULOMBOOK_CACHE="off", NO_COLOR="1")
        self.day = write_day(place / "day", {})
        self.results = self.day / "results"
        self._inputs = self._snapshot()
        self._seed = 0
        os.chdir(place)
        # everything is loaded by this, so that forks need not
        if (
            child(self.tally()).status != 0
            or main(["tally", str(self.day), "--draws", "100", "--quiet"]) != 0
        ):
            raise RuntimeError("the good day cannot be tallied")
        shutil.rmtree(self.results)

    @functools.cached_property
    def writings(self) -> Writings:
        """Results of the day that are made once and written often."""
        return Writings(self)

    def tally(self, *options: str | Path) -> Callable[[], int]:
        """A tally that can be told from every other one by its seed."""
        self._seed += 1
        return command("tally", self.day, "--draws", "100", "--seed", str(self._seed), "--quiet", *options)

    @property
    def newest(self) -> str:
        """Seed of the tally that was made up last."""
        return str(self._seed)

    def leftovers(self) -> list[str]:
        """What lies in the day folder that is neither of the bench nor the results."""
        return sorted(one.name for one in self.day.iterdir() if _OURS.fullmatch(one.name))

    def aside(self) -> list[Path]:
        """Whole results that stepped aside."""
        found = [one for one in self.day.iterdir() if re.fullmatch(r"\.results\.[0-9a-f]{8}\.old", one.name)]
        return [one for one in found if (one / "manifest.json").exists()]

    def clear(self) -> None:
        """No results, and nothing left of any."""
        for name in ("results", *self.leftovers()):
            path = self.day / name
            shutil.rmtree(path) if path.is_dir() else path.unlink(missing_ok=True)

    def changed_inputs(self) -> list[str]:
        """What is wrong with the files of the bench."""
        now = self._snapshot()
        names = sorted(
            one for one in now.keys() | self._inputs.keys() if now.get(one) != self._inputs.get(one)
        )
        return [f"input {name} changed" for name in names]

    def state(self, allowed: Sequence[str | None]) -> list[str]:
        """What is wrong with the results; ``allowed`` are the seeds they may be of, None if they may be absent."""
        problems = self.changed_inputs()
        if self.results.exists():
            return problems + whole(self.results, [one for one in allowed if one is not None])
        kept = [one for one in self.aside() if not whole(one, [seed for seed in allowed if seed])]
        if None not in allowed and not kept:
            problems.append("the results are gone")
        return problems

    def recovered(self) -> list[str]:
        """What is wrong after one more tally that nothing disturbs."""
        ended = child(self.tally())
        if ended.status != 0:
            return [f"the next tally ended with {ended.status}: {ended.said}"]
        left = [f"{name} is left" for name in self.leftovers()]
        return self.changed_inputs() + left + whole(self.results, [self.newest])

    def _snapshot(self) -> dict[str, str]:
        found = hashes(self.day)
        first = {name: Path(name).parts[0] for name in found}
        return {
            name: found[name]
            for name in found
            if first[name] != "results" and not _OURS.fullmatch(first[name])
        }


def hashes(folder: Path) -> dict[str, str]:
    """SHA-256 of every file under a folder."""
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in folder.rglob("*")
        if path.is_file()
    }


class Writings:
    """Results of the day that are made once and written often: old ones that lie there, and new ones."""

    def __init__(self, bench: Bench) -> None:
        book = tally(bench.day)
        self._bench = bench
        self._old, self._new = (replace(book, options={**book.options, "seed": one}) for one in (OLD, NEW))
        self._files = result_files(book)
        self.size_byte = sum(map(len, self._files.values()))
        self._kept = write_folder(self._old, self._files, bench.day.parent / "kept")

    def lay(self, place: Path) -> None:
        """Put the old results somewhere."""
        shutil.copytree(self._kept, place)

    def write(self, out: Path | None = None) -> int:
        """Write the new results, as the command does; its status."""
        try:
            write_folder(self._new, self._files, out or self._bench.results)
        except ResultsError as error:
            return refuse(str(error))
        return 0

    def recovered(self) -> list[str]:
        """What is wrong after one more writing that nothing disturbs."""
        ended = child(self.write)
        said = [] if ended.status == 0 else [f"the next writing ended with {ended.status}: {ended.said}"]
        return said + self._bench.state([NEW]) + [f"{name} is left" for name in self._bench.leftovers()]


def seed_of(folder: Path) -> str:
    """The seed of the tally that wrote some results."""
    manifest = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    return str(manifest["options"]["seed"])


def whole(folder: Path, seeds: Sequence[str]) -> list[str]:
    """What is wrong with a results folder: files that lack, differ from the manifest, or are too many; its seed."""
    try:
        manifest = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    except (OSError, ValueError) as error:
        return [f"no manifest: {error}"]
    present = {one.name for one in folder.iterdir()}
    problems = [f"{name} is too many" for name in present - {*manifest["outputs"], "manifest.json"}]
    for name, told in manifest["outputs"].items():
        if name not in present:
            problems.append(f"{name} lacks")
        elif hashlib.sha256((folder / name).read_bytes()).hexdigest() != told["sha256"]:
            problems.append(f"{name} is not as it was written")
    if manifest["options"]["seed"] not in seeds:
        problems.append(f"of tally {manifest['options']['seed']}, not one of {', '.join(seeds)}")
    return problems
