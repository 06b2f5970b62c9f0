"""Disks that are full, that can only be read, that let nobody in: real ones where this process may mount them."""

from __future__ import annotations

import contextlib
import errno
import os
import random
import resource
import shutil
import subprocess
from collections.abc import Callable, Iterator
from pathlib import Path

from tests.reliability.bench import OLD, Bench, Tally, child, command, whole

import coulombook

_PAGE_BYTE = os.sysconf("SC_PAGE_SIZE")
_OTHERS_READ, _OTHERS_PASS = 0o4, 0o1
_NOBODY = 65534


def _mount(*arguments: str) -> bool:
    return subprocess.run(["mount", *arguments], capture_output=True, check=False).returncode == 0


@contextlib.contextmanager
def _small_disk(place: Path) -> Iterator[bool]:
    """A file system in memory, if this process may make one."""
    place.mkdir(exist_ok=True)
    if not shutil.which("mount") or not _mount("-t", "tmpfs", "-o", "size=64m", "tmpfs", str(place)):
        yield False
        return
    try:
        yield True
    finally:
        subprocess.run(["umount", str(place)], capture_output=True, check=True)


def full(bench: Bench, number: int, seed: int) -> Tally:
    """A small disk with old results and some pages more, fewer than new ones need."""
    told = Tally("disk with too few pages left (a file system in memory)")
    chance = random.Random(seed)
    writings = bench.writings
    disk = bench.day.parent / "disk"
    with _small_disk(disk) as mounted:
        if not mounted:
            told.skipped = "no file system can be mounted here"
            return told
        out = disk / "results"
        writings.lay(out)
        used = _used_byte(disk)
        # of new results; every file takes whole pages, and the folder, its lock and its name may take one each
        needed = used // _PAGE_BYTE + 3
        for one in range(number):
            pages = chance.randrange(needed) if one else 0
            size = used + pages * _PAGE_BYTE
            if not _mount("-o", f"remount,size={size}", str(disk)):
                raise RuntimeError("the disk cannot be made small")
            ended = child(lambda: writings.write(out))
            fits = ended.status == 0 and not whole(out, ["new"])
            problems = [] if fits else whole(out, [OLD])
            problems += [f"{one.name} is left" for one in disk.iterdir() if one != out]
            if not fits and (ended.status != 2 or os.strerror(errno.ENOSPC) not in ended.said):
                problems.append(f"ended with {ended.status}: {ended.said}")
            if fits and pages < needed - 6:
                problems.append("all of it fitted where there was no room")
            told.note(f"{pages} of about {needed} pages", [*problems, *bench.changed_inputs()])
            if fits:
                shutil.rmtree(out)
                _mount("-o", "remount,size=64m", str(disk))
                writings.lay(out)
        _mount("-o", "remount,size=64m", str(disk))
        ended = child(lambda: writings.write(out))
        told.note("and then room", whole(out, ["new"]) + ([] if ended.status == 0 else [ended.said]))
    return told


def _used_byte(disk: Path) -> int:
    state = os.statvfs(disk)
    return (state.f_blocks - state.f_bfree) * state.f_frsize


def limited(bench: Bench, number: int, seed: int) -> Tally:
    """No file may grow beyond some size, as under a quota."""
    told = Tally("files that may not grow beyond a limit")
    chance = random.Random(seed)
    writings = bench.writings
    bench.clear()
    writings.lay(bench.results)
    largest = max(one.stat().st_size for one in bench.results.iterdir())
    for _ in range(number):
        limit = int(largest ** chance.random())

        def write(limit: int = limit) -> int:
            resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit))
            return writings.write()

        # what it says must not meet the limit as well: it is short, and the message is all of it
        ended = child(write)
        problems = bench.state([OLD]) + [f"{one} is left" for one in bench.leftovers()]
        if ended.status not in (2, 99) or (limit > 1000 and os.strerror(errno.EFBIG) not in ended.said):
            problems.append(f"ended with {ended.status}: {ended.said}")
        told.note(f"{limit} bytes", problems)
    told.note("and then no limit", writings.recovered())
    return told


def read_only(bench: Bench, number: int, seed: int) -> Tally:
    """A day on a medium that can only be read, with results that stand aside."""
    told = Tally("medium that can only be read")
    writings = bench.writings
    bench.clear()
    disk = bench.day.parent / "disk"
    out = bench.day.parent / "elsewhere"
    with _small_disk(disk) as mounted:
        if not mounted:
            told.skipped = "no file system can be mounted here"
            return told
        day = disk / "day"
        shutil.copytree(bench.day, day)
        writings.lay(day / ".results.00c0ffee.old")
        if not _mount("-o", "remount,ro", str(disk)):
            raise RuntimeError("the disk cannot be protected")
        refused = os.strerror(errno.EROFS)
        cases: dict[str, tuple[Callable[[], int], int, str]] = {
            "tally": (command("tally", day), 2, refused),
            "tally to another place": (command("tally", day, "--out", out, "--seed", "7", "--quiet"), 0, ""),
            "figures": (command("figures", day, "--only", "closure"), 2, refused),
            "check": (command("check", day), 0, "This day can be tallied"),
            "explain": (command("explain", day), 0, ""),
            "show, of results that stand aside": (command("show", day), 0, "a tally was interrupted"),
            "compare": (command("compare", day, "--out", day / "comparison"), 2, refused),
            "new": (command("new", disk / "another"), 2, refused),
        }
        for name, (work, status, words) in cases.items():
            ended = child(work)
            right = ended.status == status and words in ended.said and "Traceback" not in ended.said
            told.note(name, [] if right else [f"ended with {ended.status}: {ended.said}"])
        if not _mount("-o", "remount,rw", str(disk)):
            raise RuntimeError("the disk cannot be released")
        told.note("elsewhere", whole(out, ["7"]))
        shutil.rmtree(out, ignore_errors=True)
    return told


def _as_nobody(work: Callable[[], int]) -> Callable[[], int]:
    def run() -> int:
        os.setgroups([])
        os.setgid(_NOBODY)
        os.setuid(_NOBODY)
        return work()

    return run


def _within_reach(folder: Path) -> bool:
    """Whether every user may read a folder and pass all that lie above it."""
    modes = [one.stat().st_mode for one in folder.resolve().parents]
    return bool(folder.stat().st_mode & _OTHERS_READ) and all(mode & _OTHERS_PASS for mode in modes)


def forbidden(bench: Bench, number: int, seed: int) -> Tally:
    """Files and folders that the user has no right to."""
    told = Tally("no right to read a file, or to write a folder")
    if os.geteuid() != 0:
        told.skipped = "only root can become another user"
        return told
    if not _within_reach(Path(coulombook.__file__).parent):
        told.skipped = "another user cannot reach the package where it is installed"
        return told
    writings = bench.writings
    bench.clear()
    files = sorted(one for one in bench.day.rglob("*") if one.is_file())
    out = bench.day.parent / "out of nobody"
    out.mkdir()
    os.chown(out, _NOBODY, _NOBODY)
    for path in (*files, *sorted({one.parent for one in files if one.parent != bench.day})):
        mode = path.stat().st_mode
        path.chmod(0)
        ended = child(_as_nobody(command("tally", bench.day, "--out", out / "results")))
        path.chmod(mode)
        problems = bench.state([None])
        if ended.status not in (1, 2) or "Traceback" in ended.said or path.name not in ended.said:
            problems.append(f"ended with {ended.status}: {ended.said}")
        told.note(f"{path.name} cannot be read", problems + [f"{one} is written" for one in out.iterdir()])
    ended = child(_as_nobody(command("tally", bench.day)))
    told.note("the day folder cannot be written", bench.state([None]) + _denied(ended.status, ended.said))
    writings.lay(bench.results)
    ended = child(_as_nobody(command("tally", bench.day)))
    told.note(
        "nor can results that lie there", bench.state([OLD]) + _denied(ended.status, ended.said, "protected")
    )
    shutil.copytree(bench.results, out / "results")
    (out / "results").chmod(0o555)
    ended = child(_as_nobody(lambda: writings.write(out / "results")))
    problems = whole(out / "results", [OLD]) + [
        f"{one} is left" for one in out.iterdir() if one.name != "results"
    ]
    if ended.status != 2 or "protected" not in ended.said:
        problems.append(f"ended with {ended.status}: {ended.said}")
    told.note("results that are protected", problems)
    shutil.rmtree(out)
    return told


def _denied(status: int, said: str, word: str = os.strerror(errno.EACCES)) -> list[str]:
    return [] if status == 2 and word in said else [f"ended with {status}: {said}"]
