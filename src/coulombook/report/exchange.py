"""A folder replaced by a new one, whole or not at all, even if the process is killed on the way.

Everything is written into a folder beside the final one and flushed to the disk; only then does it take the final
name. A folder that is there already steps aside first and comes back if the exchange fails. No system has a step
that does both for folders everywhere, so a process killed between the two leaves the old folder aside, under a name
of ours; `restored` and `sweep` find it (decision 7).

In a folder that is being written the manifest comes last, from one that is being removed it goes first: a folder with
a manifest is whole.
"""

from __future__ import annotations

import os
import re
import shutil
import sys
import time
from collections.abc import Callable, Mapping
from contextlib import suppress
from pathlib import Path

from coulombook.report.lock import BusyError, turn
from coulombook.report.manifest import NAME as MANIFEST

PATIENCE_SECOND = 30.0
"""How long a writer waits for another one, which writes for a second or two."""

_NEW, _OLD = "new", "old"
# programs that look through new files (against viruses, for a search) hold them open for a moment, and under Windows
# a folder with an open file cannot change its name
_PAUSES_SECOND = (0.05, 0.1, 0.2, 0.4, 0.8) if sys.platform == "win32" else ()


def replace_folder(target: Path, files: Mapping[str, bytes], check: Callable[[Path], None]) -> None:
    """Make the folder ``target`` of some files, or put them in the place of the one that is there.

    Parameters
    ----------
    target : Path
        Its parents are made.
    files : mapping of file name to bytes
        The manifest last.
    check : callable
        Raises for a folder that must not be replaced; called once more when no other writer can be at work, and with
        the folder set aside, for what somebody put there meanwhile.

    Raises
    ------
    BusyError
        Another process is writing there.
    OSError
        It cannot be written; what was there is untouched.
    """
    target.parent.mkdir(parents=True, exist_ok=True)
    with turn(target, PATIENCE_SECOND) as alone:
        _bring_back(target)
        if alone:
            sweep(target)
        check(target)
        fresh = _sibling(target, _NEW)
        try:
            _fill(fresh, files)
            _exchange(target, fresh, check)
        finally:
            # after the exchange there is nothing of that name left to remove
            shutil.rmtree(fresh, ignore_errors=True)


def restored(target: Path) -> tuple[Path, bool]:
    """The folder that counts, and whether an exchange was interrupted: ``target``, or what was left aside.

    What stands aside is brought back where that can be done, else it is the folder given.
    """
    real = Path(os.path.realpath(target))  # that of a link whose end stands aside
    if os.path.lexists(real) or not _set_aside(real):
        return target, False
    try:
        with turn(real, PATIENCE_SECOND):
            return target, _bring_back(real)
    except (OSError, BusyError):
        # a medium that can only be read, or a writer that takes its time
        aside = _set_aside(real)
        return (aside[0], True) if aside and not os.path.lexists(real) else (target, False)


def sweep(target: Path) -> None:
    """Remove what killed writers left of a folder; only for the holder of its `turn`, when no other is at work."""
    for one in (*_leftovers(target, _NEW), *_leftovers(target, _OLD)):
        _remove(one)


def _bring_back(target: Path) -> bool:
    """Give a folder that was set aside its name again, if nothing has it; whether it was done."""
    if os.path.lexists(target):
        return False
    for aside in _set_aside(target):
        _rename(aside, target)
        _flush_folder(target.parent)
        return True
    return False


def _set_aside(target: Path) -> list[Path]:
    """Whole folders that stepped aside for a new one."""
    return [one for one in _leftovers(target, _OLD) if (one / MANIFEST).is_file()]


def _leftovers(target: Path, word: str) -> list[Path]:
    ours = re.compile(rf"\.{re.escape(target.name)}\.[0-9a-f]{{8}}\.{word}")
    try:
        with os.scandir(target.parent) as found:
            return sorted(
                Path(one.path)
                for one in found
                if ours.fullmatch(one.name) and one.is_dir(follow_symlinks=False)
            )
    except OSError:
        return []


def _fill(folder: Path, files: Mapping[str, bytes]) -> None:
    folder.mkdir()
    for name, content in files.items():
        with open(folder / name, "xb") as stream:
            stream.write(content)
            stream.flush()
            os.fsync(stream.fileno())
    _flush_folder(folder)


def _exchange(target: Path, fresh: Path, check: Callable[[Path], None]) -> None:
    if not os.path.lexists(target):
        _rename(fresh, target)
    else:
        aside = _sibling(target, _OLD)
        try:
            _rename(target, aside)
            check(aside)
            _rename(fresh, target)
        except BaseException:
            if os.path.lexists(aside) and not os.path.lexists(target):
                _rename(aside, target)
            raise
        # the new folder is in place: what cannot be removed of the old one harms nothing
        _remove(aside)
    _flush_folder(target.parent)


def _remove(folder: Path) -> None:
    with suppress(OSError):
        os.unlink(folder / MANIFEST)
    shutil.rmtree(folder, ignore_errors=True)


def _rename(old: Path, new: Path) -> None:
    for pause_second in _PAUSES_SECOND:
        try:
            os.rename(old, new)
            return
        except PermissionError:
            time.sleep(pause_second)
    os.rename(old, new)


def _flush_folder(folder: Path) -> None:
    """Bring the names in a folder to the disk, where a folder can be opened for that (not on Windows)."""
    with suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _sibling(target: Path, word: str) -> Path:
    # a random name, so that no two writers ever share it; mkdir with the usual rights, unlike tempfile's
    return target.with_name(f".{target.name}.{os.urandom(4).hex()}.{word}")
