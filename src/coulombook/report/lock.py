"""One writer at a time for a folder: a file beside it that the system locks for as long as its holder lives.

The lock is the system's (flock, or locking of a byte under Windows) and ends with the process that holds it, however
that ends; so the file of a killed process is no obstacle, and no process has to be asked for its life. The words in
the file only tell others who holds it. Where the file system knows no locks, writers go on without one: each still
writes whole folders, and the last one wins.
"""

from __future__ import annotations

import contextlib
import os
import sys
import time
from collections.abc import Iterator
from datetime import datetime
from pathlib import Path

_PAUSE_SECOND = 0.05
_LONGEST_WORDS = 200
_LOCKED_BYTE = 1 << 30  # under Windows nobody can read a locked byte: one far behind the words


class BusyError(Exception):
    """Another process holds the lock, and held it all the time that was waited; ``holder`` says which."""

    def __init__(self, holder: str, patience_second: float) -> None:
        self.holder = holder
        self.patience_second = patience_second
        super().__init__(holder)


@contextlib.contextmanager
def turn(target: Path, patience_second: float) -> Iterator[bool]:
    """Wait for the turn to write the folder ``target``, and hold it; gives whether no other writer can be at work.

    Parameters
    ----------
    target : Path
        Need not exist, but the folder that holds it does.
    patience_second : float
        How long to wait for another holder. [s]

    Raises
    ------
    BusyError
        Another process holds it all that time.
    OSError
        The file of the lock cannot be made there.
    """
    path = target.with_name(f".{target.name}.lock")
    end = time.monotonic() + patience_second
    while (held := _held(path)) is None:
        if time.monotonic() >= end:
            raise BusyError(_holder(path), patience_second)
        time.sleep(_PAUSE_SECOND)
    handle, sure = held
    try:
        _leave_words(handle)
        yield sure
    finally:
        # an open file cannot be removed under Windows, one that is closed might be another's elsewhere
        if sys.platform == "win32":
            os.close(handle)
            _remove(path)
        else:
            _remove(path)
            os.close(handle)


def _held(path: Path) -> tuple[int, bool] | None:
    """An open file that is locked, and whether the lock is one; None while another has it."""
    handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
    try:
        sure = _lock(handle)
        # its last holder may have removed the file after it was opened here: then this lock keeps nobody out
        if sure is not None and (not sure or _still_there(handle, path)):
            return handle, sure
    except BaseException:
        os.close(handle)
        raise
    os.close(handle)
    return None


def _still_there(handle: int, path: Path) -> bool:
    try:
        return os.path.samestat(os.fstat(handle), path.stat())
    except FileNotFoundError:
        return False


def _lock(handle: int) -> bool | None:
    """Lock an open file if nobody has; None if somebody has, False where there are no locks."""
    try:
        if sys.platform == "win32":
            import msvcrt

            os.lseek(handle, _LOCKED_BYTE, os.SEEK_SET)
            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        else:
            import fcntl

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except (BlockingIOError, PermissionError):
        return None
    except (OSError, ImportError):
        return False
    return True


def _leave_words(handle: int) -> None:
    import platform

    since = datetime.now().astimezone().isoformat(timespec="seconds")
    words = f"process {os.getpid()} on {platform.node() or 'this machine'}, since {since}\n"
    with contextlib.suppress(OSError):  # a full disk: the lock holds without words
        os.ftruncate(handle, 0)
        os.lseek(handle, 0, os.SEEK_SET)
        os.write(handle, words.encode())


def _holder(path: Path) -> str:
    try:
        with path.open(encoding="utf-8", errors="replace") as stream:
            return stream.read(_LONGEST_WORDS).strip() or "another process"
    except OSError:
        return "another process"


def _remove(path: Path) -> None:
    with contextlib.suppress(OSError):  # another opened it in the meantime, and removes it in turn
        os.unlink(path)
