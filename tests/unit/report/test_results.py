from __future__ import annotations

import errno
import hashlib
import json
import os
from collections.abc import Callable
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest
from tests.unit.report.sample import sample_book, sample_findings

import coulombook
from coulombook.book import TABLES, Book
from coulombook.report import results
from coulombook.report.results import ResultsError, check_destination, write_results

WHEN = datetime(2043, 5, 18, 19, 5, tzinfo=UTC)


@pytest.fixture
def book() -> Book:
    return sample_book(findings=sample_findings())


def contents(folder: Path) -> dict[str, bytes]:
    return {str(one.relative_to(folder)): one.read_bytes() for one in folder.rglob("*") if one.is_file()}


def test_every_table_of_the_contract_and_the_manifest_are_written(book: Book, tmp_path: Path) -> None:
    out = write_results(book, tmp_path / "results")
    assert {one.name for one in out.iterdir()} >= {*(f"{name}.csv" for name in TABLES), "manifest.json"}
    heads = (out / "ledger.csv").read_text(encoding="utf-8").splitlines()[0].split(",")
    assert tuple(heads) == TABLES["ledger"]
    # 3 catalysts x 5 levels x 2 runs x 12 products, and the heads
    assert len((out / "ledger.csv").read_text(encoding="utf-8").splitlines()) == 361
    assert len((out / "surface.csv").read_text(encoding="utf-8").splitlines()) == 1
    assert len((out / "findings.csv").read_text(encoding="utf-8").splitlines()) == 1 + len(book.findings)


def test_the_manifest_names_inputs_versions_options_and_outputs(book: Book, tmp_path: Path) -> None:
    out = write_results(book, tmp_path / "results", created=WHEN)
    manifest = json.loads((out / "manifest.json").read_text(encoding="utf-8"))
    assert manifest["inputs"] == {"runs.csv": {"sha256": "ab" * 32, "bytes": 1234}}
    assert manifest["version"] == coulombook.__version__
    assert manifest["options"] == {"outlet_flow": "inlet"}
    assert manifest["created"] == "2043-05-18T19:05:00+00:00"
    assert "numpy" in manifest["libraries"] or manifest["libraries"] == {}
    ledger = (out / "ledger.csv").read_bytes()
    expected = {"sha256": hashlib.sha256(ledger).hexdigest(), "bytes": len(ledger)}
    assert manifest["outputs"]["ledger.csv"] == expected
    assert list(manifest) == sorted(manifest)


def test_writing_again_gives_the_same_bytes(book: Book, tmp_path: Path) -> None:
    first = contents(write_results(book, tmp_path / "a", created=WHEN))
    assert contents(write_results(book, tmp_path / "b", created=WHEN)) == first


def test_older_results_are_replaced_and_nothing_else_is_left(book: Book, tmp_path: Path) -> None:
    out = write_results(sample_book(catalysts=("old",)), tmp_path / "results")
    (out / ".DS_Store").write_bytes(b"litter of a file manager")
    write_results(book, out)
    assert b"annealed" in (out / "ledger.csv").read_bytes()
    assert b"old," not in (out / "ledger.csv").read_bytes()
    assert [one.name for one in tmp_path.iterdir()] == ["results"]


def test_an_empty_folder_is_filled_and_missing_parents_are_made(book: Book, tmp_path: Path) -> None:
    (tmp_path / "empty").mkdir()
    for folder in (tmp_path / "empty", tmp_path / "a" / "b" / "results"):
        assert contents(write_results(book, folder)).keys() >= {f"{name}.csv" for name in TABLES}


@pytest.mark.parametrize(
    "manifest", [None, "", "{}", "[]", '{"program": "another"}', "[" * 100_000, "\udcff"]
)
def test_a_folder_that_is_not_ours_is_refused_and_left_alone(
    book: Book, tmp_path: Path, manifest: str | None
) -> None:
    out = tmp_path / "thesis"
    out.mkdir()
    (out / "chapter.txt").write_text("three years of work", encoding="utf-8")
    if manifest is not None:
        (out / "manifest.json").write_bytes(manifest.encode("utf-8", "surrogateescape"))
    before = contents(tmp_path)
    with pytest.raises(ResultsError, match="not written by coulombook"):
        write_results(book, out)
    assert contents(tmp_path) == before


def test_a_file_added_by_hand_to_older_results_is_not_deleted(book: Book, tmp_path: Path) -> None:
    out = write_results(book, tmp_path / "results")
    (out / "my notes.txt").write_text("look at run m3a", encoding="utf-8")
    before = contents(tmp_path)
    with pytest.raises(ResultsError, match=r"'my notes\.txt', which coulombook did not write"):
        write_results(book, out)
    assert contents(tmp_path) == before


def test_a_file_in_the_place_of_the_folder_is_refused(book: Book, tmp_path: Path) -> None:
    (tmp_path / "results").write_text("a file", encoding="utf-8")
    with pytest.raises(ResultsError, match="is a file"):
        check_destination(tmp_path / "results")


def test_a_link_to_older_results_stays_a_link(book: Book, tmp_path: Path) -> None:
    real = write_results(sample_book(catalysts=("old",)), tmp_path / "real")
    link = tmp_path / "link"
    link.symlink_to(real, target_is_directory=True)
    write_results(book, link)
    assert link.is_symlink()
    assert b"annealed" in (real / "ledger.csv").read_bytes()


def full_disk(*_: object, **__: object) -> Any:
    raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))


def fail_on_call(number: int, function: Callable[..., Any], error: BaseException) -> Callable[..., Any]:
    calls = 0

    def failing(*arguments: Any) -> Any:
        nonlocal calls
        calls += 1
        if calls == number:
            raise error
        return function(*arguments)

    return failing


@pytest.mark.parametrize("call", range(1, 9))
def test_a_full_disk_at_any_file_leaves_the_old_results_whole(
    book: Book, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, call: int
) -> None:
    out = write_results(sample_book(catalysts=("old",)), tmp_path / "results")
    before = contents(tmp_path)
    error = OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
    monkeypatch.setattr(results.os, "fsync", fail_on_call(call, os.fsync, error))
    with pytest.raises(ResultsError, match=os.strerror(errno.ENOSPC)):
        write_results(book, out)
    assert contents(tmp_path) == before


# renames of one writing: 1 the old results step aside, 2 the new ones come in
@pytest.mark.parametrize("call", [1, 2])
@pytest.mark.parametrize("error", [PermissionError(errno.EACCES, "Permission denied"), KeyboardInterrupt()])
def test_a_failing_exchange_brings_the_old_results_back(
    book: Book, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, call: int, error: BaseException
) -> None:
    out = write_results(sample_book(catalysts=("old",)), tmp_path / "results")
    before = contents(tmp_path)
    monkeypatch.setattr(results.os, "rename", fail_on_call(call, os.rename, error))
    with pytest.raises(ResultsError if isinstance(error, OSError) else KeyboardInterrupt):
        write_results(book, out)
    assert contents(tmp_path) == before
    assert [one.name for one in tmp_path.iterdir()] == ["results"]


def test_a_first_writing_that_fails_leaves_nothing(
    book: Book, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(results.os, "fsync", full_disk)
    with pytest.raises(ResultsError, match="cannot be written"):
        write_results(book, tmp_path / "results")
    assert list(tmp_path.iterdir()) == []


def test_hostile_names_are_harmless_in_every_file(tmp_path: Path) -> None:
    names = ("=cmd|' /C calc'!A0", "\u202eevil\x1b[2J\udcff", "x" * 5000)
    out = write_results(sample_book(catalysts=names, levels=(-0.6,)), tmp_path / "results")
    text = (out / "summary.csv").read_bytes().decode("utf-8")
    assert ",'=cmd|' /C calc'!A0," in text
    assert "\\udcff" in text
    assert ",=" not in text
