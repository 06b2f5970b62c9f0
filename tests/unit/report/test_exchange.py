"""A folder replaced whole: its lock, what stands aside, what is swept. Kills and the like are in tests/system."""

from __future__ import annotations

import os
import threading
import time
from collections.abc import Callable
from pathlib import Path

import pytest

from coulombook.report import exchange, lock
from coulombook.report.exchange import replace_folder, restored
from coulombook.report.lock import BusyError, turn

FILES = {"a.csv": b"1", "manifest.json": b"{}"}
ASIDE, FRESH = ".results.0123abcd.old", ".results.0123abcd.new"


@pytest.fixture
def target(tmp_path: Path) -> Path:
    return tmp_path / "results"


def anything(_: Path) -> None:
    """No folder is too good to be replaced."""


def lay(folder: Path, *, manifest: bool = True, content: bytes = b"0") -> None:
    folder.mkdir()
    (folder / "a.csv").write_bytes(content)
    if manifest:
        (folder / "manifest.json").write_bytes(b"{}")


def names(folder: Path) -> list[str]:
    return sorted(one.name for one in folder.iterdir())


# --- the lock ---


def test_a_second_writer_is_told_who_holds_the_folder_and_since_when(target: Path) -> None:
    with turn(target, 0.0) as alone:
        assert alone
        with pytest.raises(
            BusyError, match=rf"^process {os.getpid()} on .+, since 20\d\d-\d\d-\d\dT"
        ) as busy:
            turn(target, 0.1).__enter__()
        assert busy.value.patience_second == 0.1
    assert names(target.parent) == []
    with turn(target, 0.0) as alone:
        assert alone


def test_a_second_writer_gets_its_turn_when_the_first_is_done(target: Path) -> None:
    order = []

    def second() -> None:
        with turn(target, 20.0):
            order.append("second")

    with turn(target, 0.0):
        thread = threading.Thread(target=second)
        thread.start()
        time.sleep(0.2)
        order.append("first")
    thread.join()
    assert order == ["first", "second"]
    assert names(target.parent) == []


def test_the_file_of_a_process_that_is_gone_is_no_obstacle(target: Path) -> None:
    (target.parent / ".results.lock").write_text("process 1 on another machine\n", encoding="utf-8")
    with turn(target, 0.0) as alone:
        assert alone
    assert names(target.parent) == []


def test_a_lock_on_a_file_that_was_removed_meanwhile_keeps_nobody_out_and_is_none(
    target: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = target.parent / ".results.lock"
    locked, calls = lock._lock, []

    def removed_first(handle: int) -> bool | None:
        calls.append(handle)
        if len(calls) == 1:
            path.unlink()
        return locked(handle)

    monkeypatch.setattr(lock, "_lock", removed_first)
    with turn(target, 5.0) as alone:
        assert alone
        assert path.exists()
    assert len(calls) == 2


def test_where_there_are_no_locks_writers_go_on_and_nobody_sweeps(
    target: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(lock, "_lock", lambda _: False)
    lay(target.parent / FRESH)
    replace_folder(target, FILES, anything)
    assert names(target.parent) == [FRESH, "results"]


# --- what stands aside ---


def test_a_folder_left_aside_gets_its_name_back(target: Path) -> None:
    lay(target.parent / ASIDE)
    assert restored(target) == (target, True)
    assert names(target.parent) == ["results"]
    assert restored(target) == (target, False)


@pytest.mark.parametrize("name", [ASIDE, FRESH])
def test_a_folder_that_is_not_whole_or_was_never_in_place_is_not_brought_back(
    target: Path, name: str
) -> None:
    lay(target.parent / name, manifest=name == FRESH)
    assert restored(target) == (target, False)
    assert names(target.parent) == [name]


def test_what_cannot_be_brought_back_is_read_where_it_stands(
    target: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    lay(target.parent / ASIDE)

    def protected(*_: object) -> None:
        raise OSError(30, "Read-only file system")

    monkeypatch.setattr(exchange.os, "rename", protected)
    assert restored(target) == (target.parent / ASIDE, True)


def test_a_link_to_a_folder_left_aside_leads_there_again(target: Path) -> None:
    lay(target.parent / ASIDE)
    link = target.parent / "link"
    try:
        link.symlink_to(target, target_is_directory=True)
    except OSError:
        pytest.skip("the system makes no links")
    assert restored(link) == (link, True)
    assert (link / "a.csv").read_bytes() == b"0"


def test_leftovers_are_swept_and_nothing_that_looks_like_them(target: Path) -> None:
    strangers = [".results.old", ".results.0123abcd.old.bak", ".other.0123abcd.old", ".results.0123ABCD.new"]
    for name in (ASIDE, FRESH, ".results.ffffffff.new", *strangers):
        lay(target.parent / name)
    lay(target)
    (target.parent / ".results.01234567.new").write_bytes(b"a file, and so not of ours")
    replace_folder(target, FILES, anything)
    assert names(target.parent) == sorted([*strangers, ".results.01234567.new", "results"])
    assert (target / "a.csv").read_bytes() == b"1"


def test_what_somebody_puts_into_the_folder_meanwhile_is_not_lost(target: Path) -> None:
    lay(target)
    looked = []

    def look(folder: Path) -> None:
        looked.append(folder.name)
        if (folder / "my notes.txt").exists():
            raise OSError("notes")
        # after the last look before the exchange
        (target / "my notes.txt").write_bytes(b"three years of work")

    with pytest.raises(OSError, match="notes"):
        replace_folder(target, FILES, look)
    assert looked[0] == "results"
    assert exchange._leftovers(target, "old") == []
    assert names(target) == ["a.csv", "manifest.json", "my notes.txt"]


@pytest.mark.parametrize(("refusals", "comes_through"), [(2, True), (9, False)])
def test_a_name_change_is_tried_again_where_programs_hold_new_files_for_a_moment(
    target: Path, monkeypatch: pytest.MonkeyPatch, refusals: int, comes_through: bool
) -> None:
    monkeypatch.setattr(exchange, "_PAUSES_SECOND", (0.0, 0.0, 0.0))
    rename: Callable[..., None] = os.rename
    left = [PermissionError(13, "in use")] * refusals

    def refusing(old: Path, new: Path) -> None:
        if left:
            raise left.pop()
        rename(old, new)

    monkeypatch.setattr(exchange.os, "rename", refusing)
    if comes_through:
        replace_folder(target, FILES, anything)
        assert names(target) == ["a.csv", "manifest.json"]
    else:
        with pytest.raises(PermissionError, match="in use"):
            replace_folder(target, FILES, anything)
        assert names(target.parent) == []


def test_a_folder_that_is_being_removed_is_whole_no_longer(
    target: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    lay(target)
    left: list[list[str]] = []
    monkeypatch.setattr(exchange.shutil, "rmtree", lambda folder, **_: left.append(names(folder)))
    exchange._remove(target)
    # a process killed from here on leaves nothing that would be brought back
    assert left == [["a.csv"]]


def test_the_manifest_is_the_last_file_that_is_written(target: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    fresh = target.parent / FRESH
    seen: list[list[str]] = []
    monkeypatch.setattr(exchange.os, "fsync", lambda _: seen.append(names(fresh)))
    exchange._fill(fresh, FILES)
    assert seen[:2] == [["a.csv"], ["a.csv", "manifest.json"]]
