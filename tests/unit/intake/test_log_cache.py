"""What untidy logs gave, kept outside the day: faithful, and never trusted over the file."""

from __future__ import annotations

import io
import json
import os
import pickle
import stat
import sys
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from datetime import datetime
from pathlib import Path

import numpy as np
import pytest

from coulombook.balance.readings import Trace
from coulombook.findings import Finding, Findings
from coulombook.intake import log_cache, patient_body, traces
from coulombook.intake.files import Folder
from coulombook.intake.settings import TraceOptions
from coulombook.intake.traces import read_trace

TEXT = "t / s;E / V;I / mA\n# invented\n" + "".join(
    f"2043-05-18 09:{n // 60:02}:{n % 60:02};-1,5;-10,{n:03}\n" for n in range(100)
)
Reading = tuple[Trace | None, list[Finding], bool]
needs_owners = pytest.mark.skipif(not hasattr(os, "geteuid"), reason="files have no owners here")


@pytest.fixture
def place(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A cache of its own, that keeps small logs too."""
    monkeypatch.setenv(log_cache.VARIABLE, str(tmp_path / "cache"))
    monkeypatch.setattr(log_cache, "FROM_BYTE", 1)
    return tmp_path / "cache" / "logs"


@pytest.fixture
def read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., Reading]:
    """Read a log; whether the patient reader had to."""
    (tmp_path / "day").mkdir()
    called: list[Path] = []
    whole = patient_body.read_patiently

    def noted(path: Path, *rest: object) -> object:
        called.append(path)
        return whole(path, *rest)  # type: ignore[arg-type]  # passed on as it came

    monkeypatch.setattr(traces, "read_patiently", noted)

    def reading(text: str = TEXT, options: TraceOptions | None = None, name: str = "a.csv") -> Reading:
        path = tmp_path / "day" / name
        path.write_text(text, encoding="utf-8")
        findings = Findings()
        called.clear()
        trace = read_trace(Folder(tmp_path / "day"), path, 1e-4, options or TraceOptions({}), findings)
        return trace, list(findings), bool(called)

    return reading


def entries(place: Path) -> list[Path]:
    return sorted(place.iterdir()) if place.exists() else []


def _same(one: Trace | None, other: Trace | None) -> None:
    assert one is not None
    assert other is not None
    np.testing.assert_array_equal(one.time_second, other.time_second)
    np.testing.assert_array_equal(one.potential_volt, other.potential_volt)
    np.testing.assert_array_equal(one.current_ampere, other.current_ampere)


def test_second_reading_is_the_first_without_its_labour(place: Path, read: Callable[..., Reading]) -> None:
    first, told, patient = read()
    assert patient
    assert [one.kind for one in told] == ["lines-passed-over", "clock-read"]
    (entry,) = entries(place)
    again, told_again, patient = read()
    assert not patient
    _same(first, again)
    assert told_again == told
    assert entries(place) == [entry]
    assert again is not None
    assert not again.time_second.flags.writeable


def test_tidy_logs_are_never_kept(place: Path, read: Callable[..., Reading]) -> None:
    read("t / s;E / V;I / mA\n0;-1;-1\n1;-1;-1\n")
    assert entries(place) == []


def test_faulty_logs_are_never_kept(place: Path, read: Callable[..., Reading]) -> None:
    trace, _, _ = read(TEXT + "2043-05-18 10:00:00;x1;1y\n")
    assert trace is None
    assert entries(place) == []


def test_changed_log_or_options_never_meet_an_old_entry(place: Path, read: Callable[..., Reading]) -> None:
    read()
    changed, _, patient = read(TEXT.replace("-10,000", "-20,000"))
    assert patient
    assert changed is not None
    assert changed.current_ampere[0] == -0.02
    assert read(options=TraceOptions({}, decimal=","))[2]
    assert read(name="b.csv")[2]  # its findings name the file
    assert len(entries(place)) == 4


def _header(entry: Path) -> dict[str, object]:
    header: dict[str, object] = json.loads(entry.read_bytes().split(b"\n", 2)[1])
    return header


def _forged(entry: Path, payload: bytes, **changes: object) -> bytes:
    """An entry with another payload, its checksum right."""
    import hashlib

    header = _header(entry) | {"sha256": hashlib.sha256(payload).hexdigest()} | changes
    return log_cache._MARK + json.dumps(header).encode() + b"\n" + payload


class _Harm:
    def __reduce__(self) -> tuple[object, tuple[str]]:
        return os.system, ("touch harm-was-done",)


def _npy(array: np.ndarray[tuple[int, ...], np.dtype[np.generic]], *, allow_pickle: bool = False) -> bytes:
    stream = io.BytesIO()
    np.save(stream, array, allow_pickle=allow_pickle)
    return stream.getvalue()


HUGE = (
    b"\x93NUMPY\x01\x00v\x00"
    + b"{'descr': '<f8', 'fortran_order': False, 'shape': (4, 99999999999), }".ljust(117)
    + b"\n"
)
SPOILT: dict[str, Callable[[Path], bytes]] = {
    "nothing": lambda entry: b"",
    "cut short": lambda entry: entry.read_bytes()[:-100],
    "one byte wrong": lambda entry: entry.read_bytes()[:-9] + b"\xaa" + entry.read_bytes()[-8:],
    "another program's": lambda entry: b"\x89PNG\r\n\x1a\n" + bytes(1000),
    "another entry's": lambda entry: entry.read_bytes().replace(str(_header(entry)["key"]).encode(), b"0" * 64),
    "an older mark": lambda entry: entry.read_bytes().replace(b"log 1\n", b"log 0\n", 1),
    "no end of its header": lambda entry: log_cache._MARK + b" " * 2_000_000,
    "header nested without end": lambda entry: log_cache._MARK + b"[" * 200_000 + b"\n",
    "header of another kind": lambda entry: log_cache._MARK + b"[1, 2]\n",
    "pickled": lambda entry: _forged(entry, pickle.dumps(_Harm())),
    "array of objects": lambda entry: _forged(entry, _npy(np.array([[_Harm()]], dtype=object), allow_pickle=True)),
    "array of another shape": lambda entry: _forged(entry, _npy(np.zeros((2, 3)))),
    "array of whole numbers": lambda entry: _forged(entry, _npy(np.zeros((4, 3), dtype=np.int64))),
    "array of no numbers": lambda entry: _forged(entry, _npy(np.full((4, 3), np.nan))),
    "array that claims to be huge": lambda entry: _forged(entry, HUGE),
    "fault among its findings": lambda entry: _forged(
        entry, entry.read_bytes().split(b"\n", 2)[2], findings=[["broken-trace", "a", "b", ""]]
    ),
    "unknown finding": lambda entry: _forged(
        entry, entry.read_bytes().split(b"\n", 2)[2], findings=[["<script>", "a", "b", ""]]
    ),
    "other columns": lambda entry: _forged(entry, _npy(np.ones((4, 3))), quantities=["t", "e", "u"]),
}  # fmt: skip


@pytest.mark.parametrize("how", SPOILT)
def test_spoilt_entry_is_passed_over_and_replaced(
    how: str, place: Path, read: Callable[..., Reading], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    first, told, _ = read()
    (entry,) = entries(place)
    good = entry.read_bytes()
    entry.write_bytes(SPOILT[how](entry))
    again, told_again, patient = read()
    assert patient, "the entry was believed"
    _same(first, again)
    assert told_again == told
    assert not (tmp_path / "harm-was-done").exists()
    assert entries(place) == [entry]
    assert entry.read_bytes() == good


@needs_owners
def test_entry_that_others_may_write_is_passed_over(place: Path, read: Callable[..., Reading]) -> None:
    read()
    (entry,) = entries(place)
    assert stat.S_IMODE(entry.stat().st_mode) == 0o600
    assert stat.S_IMODE(place.stat().st_mode) == 0o700
    entry.chmod(0o666)
    assert read()[2]
    assert stat.S_IMODE(entry.stat().st_mode) == 0o600


@needs_owners
def test_entry_of_another_user_is_passed_over(
    place: Path, read: Callable[..., Reading], monkeypatch: pytest.MonkeyPatch
) -> None:
    read()
    monkeypatch.setattr(os, "geteuid", lambda: 12345)
    assert read()[2]


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="there are no named pipes here")
def test_entry_that_is_a_link_or_a_pipe_is_passed_over_and_replaced(
    place: Path, read: Callable[..., Reading], tmp_path: Path
) -> None:
    read()
    (entry,) = entries(place)
    entry.rename(tmp_path / "elsewhere")
    entry.symlink_to(tmp_path / "elsewhere")
    assert read()[2]
    assert not entry.is_symlink()
    entry.unlink()
    os.mkfifo(entry)  # reading it would wait for ever
    assert read()[2]
    assert entry.is_file()


def test_cache_that_is_switched_off_keeps_nothing(
    place: Path, read: Callable[..., Reading], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv(log_cache.VARIABLE, "Off")
    monkeypatch.setenv("XDG_CACHE_HOME", str(place))
    assert read()[2]
    assert read()[2]
    assert entries(place) == []


@pytest.mark.parametrize("place_is", ["a file", "below a file", "missing a drive"])
def test_place_that_cannot_be_written_is_no_matter(
    place_is: str, place: Path, read: Callable[..., Reading], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "file").write_text("not a folder")
    told = {
        "a file": tmp_path / "file",
        "below a file": tmp_path / "file" / "x",
        "missing a drive": Path("/proc/no"),
    }
    monkeypatch.setenv(log_cache.VARIABLE, str(told[place_is]))
    for _ in range(2):
        trace, findings, patient = read()
        assert patient
        assert trace is not None
        assert [one.kind for one in findings] == ["lines-passed-over", "clock-read"]
    assert (tmp_path / "file").read_text() == "not a folder"


def test_disk_that_fills_leaves_no_half_entry(
    place: Path, read: Callable[..., Reading], monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", full)
    assert read()[0] is not None
    assert entries(place) == []


def test_oldest_entries_go_when_room_is_short(
    place: Path, read: Callable[..., Reading], monkeypatch: pytest.MonkeyPatch
) -> None:
    read(name="a.csv")
    (oldest,) = entries(place)
    os.utime(oldest, (1, 1))
    (place / "left.part").write_bytes(bytes(5000))  # of a writer that was interrupted
    os.utime(place / "left.part", (2, 2))
    monkeypatch.setattr(log_cache, "LARGEST_BYTE", 2 * oldest.stat().st_size + 100)
    read(name="b.csv")
    read(name="c.csv")
    assert len(entries(place)) == 2
    assert oldest not in entries(place)
    assert not read(name="b.csv")[2]
    assert not read(name="c.csv")[2]


def test_log_that_grows_while_it_is_read_is_not_kept(
    place: Path, read: Callable[..., Reading], monkeypatch: pytest.MonkeyPatch
) -> None:
    whole = traces.read_patiently

    def appending(path: Path, *rest: object) -> object:
        result = whole(path, *rest)  # type: ignore[arg-type]  # passed on as it came
        with path.open("a") as stream:
            stream.write("2043-05-18 10:00:00;-1,5;-10,0\n")
        return result

    monkeypatch.setattr(traces, "read_patiently", appending)
    assert read()[0] is not None
    assert entries(place) == []


def test_threads_that_keep_one_log_leave_one_entry(place: Path) -> None:
    stamp = datetime(2043, 5, 18, 9, 30)
    kept = log_cache.Kept({"t": np.arange(3.0), "e": np.ones(3)}, np.arange(2, 5), stamp, ())
    with ThreadPoolExecutor(8) as pool:
        list(pool.map(lambda _: log_cache.keep("0" * 64, kept), range(40)))
    assert [entry.name for entry in entries(place)] == ["0" * 64]
    found = log_cache.load("0" * 64)
    assert found is not None
    np.testing.assert_array_equal(found.values["t"], [0.0, 1.0, 2.0])
    np.testing.assert_array_equal(found.rows, [2, 3, 4])
    assert found.first_stamp == stamp


def test_places_are_those_of_the_platform(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.delenv(log_cache.VARIABLE, raising=False)
    monkeypatch.setattr(Path, "home", lambda: tmp_path)
    monkeypatch.setattr(sys, "platform", "linux")
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "xdg"))
    assert log_cache.folder() == tmp_path / "xdg" / "coulombook" / "logs"
    monkeypatch.setenv("XDG_CACHE_HOME", "relative")
    assert log_cache.folder() == tmp_path / ".cache" / "coulombook" / "logs"
    monkeypatch.setattr(sys, "platform", "darwin")
    assert log_cache.folder() == tmp_path / "Library" / "Caches" / "coulombook" / "logs"
    monkeypatch.setattr(sys, "platform", "win32")
    monkeypatch.setenv("LOCALAPPDATA", str(tmp_path / "local"))
    assert log_cache.folder() == tmp_path / "local" / "coulombook" / "cache" / "logs"


def test_user_without_a_home_has_no_cache(monkeypatch: pytest.MonkeyPatch) -> None:
    def homeless() -> Path:
        raise RuntimeError("Could not determine home directory.")

    monkeypatch.delenv(log_cache.VARIABLE, raising=False)
    monkeypatch.setattr(Path, "home", homeless)
    assert log_cache.folder() is None
