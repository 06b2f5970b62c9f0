from __future__ import annotations

import errno
import io
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from types import ModuleType
from typing import Any, NamedTuple

import pytest
from tests.unit.report.sample import sample_book

import coulombook
from coulombook.book import Book
from coulombook.cli import main
from coulombook.findings import DayFaults, Finding, finding

FAULT = finding(
    "missing-file", "traces/a1.csv", "there is no such file", "add the file", found="nothing there"
)
WARNING = finding("balance-open", "run a1", "the total is 82 %", "look for what nothing measures")
NOTE = finding("assumed-default", "runs.csv", "25 degC was taken")


class Checked(NamedTuple):
    findings: tuple[Finding, ...]
    lines: tuple[str, ...]


@pytest.fixture
def day(tmp_path: Path) -> Path:
    folder = tmp_path / "a day"
    folder.mkdir()
    return folder


@pytest.fixture
def work(monkeypatch: pytest.MonkeyPatch) -> Callable[..., list[dict[str, Any]]]:
    """Let `tally` and `check` give what the test says; returns the calls made."""

    def prepare(outcome: Book | BaseException | tuple[Finding, ...]) -> list[dict[str, Any]]:
        calls: list[dict[str, Any]] = []

        def work_done(path: Path, **options: Any) -> Any:
            calls.append({"path": path, **options})
            if isinstance(outcome, BaseException):
                raise outcome
            return Checked(outcome, ("1 run of 1 catalyst",)) if isinstance(outcome, tuple) else outcome

        module = ModuleType("coulombook.tally")
        module.tally = module.check = work_done  # type: ignore[attr-defined]
        monkeypatch.setitem(sys.modules, "coulombook.tally", module)
        return calls

    return prepare


def files(folder: Path) -> set[str]:
    return {one.name for one in folder.iterdir()}


def test_tally_writes_into_the_day_and_ends_with_status_0(
    day: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    calls = work(sample_book(findings=(WARNING, NOTE)))
    assert main(["tally", str(day)]) == 0
    assert "ledger.csv" in files(day / "results")
    assert calls[0]["path"] == day
    printed = capsys.readouterr()
    assert "annealed copper mesh" in printed.out
    assert "warning[balance-open]" in printed.out
    assert f"Written to {day / 'results'}" in printed.out
    assert printed.err == ""


def test_out_and_calibrations_are_taken(day: Path, tmp_path: Path, work: Any) -> None:
    calls = work(sample_book())
    for name in ("gc", "nmr"):
        (tmp_path / name).mkdir()
    options = ["--out", str(tmp_path / "ledgers"), "--calibrations", str(tmp_path / "gc")]
    assert main(["tally", str(day), *options, "--calibrations", str(tmp_path / "nmr")]) == 0
    assert calls[0]["calibrations"] == [tmp_path / "gc", tmp_path / "nmr"]
    assert "ledger.csv" in files(tmp_path / "ledgers")
    assert files(day) == set()


def test_quiet_prints_nothing_of_a_day_without_faults(
    day: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    work(sample_book(findings=(WARNING,)))
    assert main(["tally", str(day), "--quiet"]) == 0
    assert capsys.readouterr() == ("", "")
    assert "ledger.csv" in files(day / "results")


def test_faults_end_with_status_1_and_nothing_written(
    day: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    work(DayFaults((NOTE, FAULT, WARNING)))
    assert main(["tally", str(day)]) == 1
    assert files(day) == set()
    printed = capsys.readouterr()
    assert printed.out == ""
    assert "error[missing-file]: traces/a1.csv" in printed.err
    assert "warning[balance-open]" in printed.err
    assert "1 fault; nothing was written" in printed.err
    assert "Traceback" not in printed.err


def test_faults_are_shown_even_when_quiet(day: Path, work: Any, capsys: pytest.CaptureFixture[str]) -> None:
    work(DayFaults((FAULT, WARNING)))
    assert main(["tally", str(day), "--quiet"]) == 1
    printed = capsys.readouterr()
    assert "error[missing-file]" in printed.err
    assert "warning" not in printed.err


def test_strict_writes_nothing_when_a_number_may_mislead(
    day: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    work(sample_book(findings=(WARNING, NOTE)))
    assert main(["tally", str(day), "--strict"]) == 1
    assert files(day) == set()
    printed = capsys.readouterr()
    assert "warning[balance-open]" in printed.err
    assert "nothing was written, for --strict" in printed.err


def test_strict_lets_notes_pass(day: Path, work: Any) -> None:
    work(sample_book(findings=(NOTE,)))
    assert main(["tally", str(day), "--strict"]) == 0
    assert "ledger.csv" in files(day / "results")


def test_a_folder_of_somebody_else_is_refused_before_the_work(
    day: Path, tmp_path: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    calls = work(sample_book())
    (tmp_path / "thesis").mkdir()
    (tmp_path / "thesis" / "chapter.txt").write_text("x", encoding="utf-8")
    assert main(["tally", str(day), "--out", str(tmp_path / "thesis")]) == 2
    assert calls == []
    assert "was not written by coulombook" in capsys.readouterr().err
    assert files(tmp_path / "thesis") == {"chapter.txt"}


@pytest.mark.parametrize("command", ["tally", "check"])
def test_a_missing_day_or_calibrations_folder_is_named_with_status_2(
    command: str, day: Path, tmp_path: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    work(sample_book())
    assert main([command, str(tmp_path / "nowhere")]) == 2
    assert "nowhere', does not exist" in capsys.readouterr().err
    (tmp_path / "file").write_text("", encoding="utf-8")
    assert main([command, str(tmp_path / "file")]) == 2
    assert "is a file, not a folder" in capsys.readouterr().err
    assert main([command, str(day), "--calibrations", str(tmp_path / "gone")]) == 2
    assert "folder of the calibrations" in capsys.readouterr().err


def test_a_folder_that_may_not_be_read_is_named_with_status_2(
    day: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    work(PermissionError(errno.EACCES, "Permission denied", "a day/day.toml"))
    assert main(["tally", str(day)]) == 2
    assert capsys.readouterr().err == "coulombook: 'a day/day.toml': Permission denied\n"


@pytest.mark.parametrize("command", ["tally", "check"])
def test_a_fault_of_ours_shows_its_traceback_and_status_3(
    command: str, day: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    work(ZeroDivisionError("ours"))
    assert main([command, str(day)]) == 3
    printed = capsys.readouterr().err
    assert "ZeroDivisionError: ours" in printed
    assert "Traceback" in printed
    assert "Please report it" in printed
    assert files(day) == set()


def test_an_interrupt_ends_quietly_with_status_130(
    day: Path, work: Any, capsys: pytest.CaptureFixture[str]
) -> None:
    work(KeyboardInterrupt())
    assert main(["tally", str(day)]) == 130
    assert capsys.readouterr().err == "coulombook: interrupted\n"
    assert files(day) == set()


@pytest.mark.parametrize(
    ("findings", "options", "status"),
    [
        ((NOTE,), [], 0),
        ((WARNING,), [], 0),
        ((WARNING,), ["--strict"], 1),
        ((WARNING, FAULT), [], 1),
    ],
)
def test_check_lists_what_it_found_and_writes_nothing(
    day: Path,
    work: Any,
    capsys: pytest.CaptureFixture[str],
    findings: tuple[Finding, ...],
    options: list[str],
    status: int,
) -> None:
    work(findings)
    assert main(["check", str(day), *options]) == status
    printed = capsys.readouterr().out
    assert printed.startswith("1 run of 1 catalyst\n")
    for one in findings:
        assert f"[{one.kind}]: {one.where}" in printed
    assert files(day) == set()


@pytest.mark.parametrize("workbook", [False, True])
def test_new_lays_out_a_day_and_says_what_comes_next(
    tmp_path: Path, workbook: bool, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    made: list[tuple[Path, bool]] = []
    module = ModuleType("coulombook.intake.new_day")
    module.write_new_day = lambda folder, workbook: made.append((folder, workbook))  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "coulombook.intake.new_day", module)
    assert main(["new", "2043-05-18 mesh", *(["--workbook"] if workbook else [])]) == 0
    assert made == [(Path("2043-05-18 mesh"), workbook)]
    printed = capsys.readouterr().out
    assert 'coulombook check "2043-05-18 mesh"' in printed
    assert ("day.xlsx" in printed) is workbook


def test_new_refuses_a_folder_that_is_in_use(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def refuse(folder: Path, workbook: bool) -> None:
        raise FileExistsError(f"the folder '{folder}' is not empty")

    module = ModuleType("coulombook.intake.new_day")
    module.write_new_day = refuse  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "coulombook.intake.new_day", module)
    assert main(["new", "x"]) == 2
    assert capsys.readouterr().err == "coulombook: the folder 'x' is not empty\n"


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["taly", "x"], "unknown command 'taly'; did you mean 'tally'?"),
        (["frobnicate"], "unknown command 'frobnicate'; known: tally, check, explain, budget, compare, new,"),
        (["tally", "x", "--srtict"], "unknown option '--srtict'; did you mean '--strict'?"),
        (["tally", "x", "--otu=y"], "unknown option '--otu=y'; did you mean '--out'?"),
        (["--verion"], "unknown option '--verion'; did you mean '--version'?"),
        # an abbreviation would change its meaning with the next option we add
        (["tally", "x", "--str"], "unknown option '--str'; did you mean '--strict'?"),
        (["tally", "x", "y"], "unknown argument 'y'"),
        (["tally"], "the following arguments are required: DAY"),
        (["tally", "x", "--out"], "--out: expected one argument"),
    ],
)
def test_a_wrong_call_names_the_nearest_word_and_ends_with_status_2(
    arguments: list[str], message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(arguments) == 2
    printed = capsys.readouterr()
    assert message in printed.err
    assert printed.out == ""


def test_no_command_shows_the_help_with_status_2(capsys: pytest.CaptureFixture[str]) -> None:
    assert main([]) == 2
    assert "coulombook tally" in capsys.readouterr().err


@pytest.mark.parametrize("command", [[], ["tally"], ["check"], ["new"], ["curves"]])
@pytest.mark.parametrize("columns", ["80", "40"])
def test_every_help_has_an_example(
    command: list[str], columns: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    assert main([*command, "--help"]) == 0
    printed = capsys.readouterr().out
    assert "example" in printed
    assert "coulombook check" in printed or "coulombook" in printed.partition("example")[2]


def test_the_version_is_printed(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--version"]) == 0
    assert capsys.readouterr().out == f"coulombook {coulombook.__version__}\n"


# --- as a process of its own


def process(*arguments: str, **settings: Any) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path), **settings}
    return subprocess.run(
        [sys.executable, "-m", "coulombook", *arguments],
        capture_output=True,
        text=True,
        env=environment,
        timeout=60,
    )


def test_the_help_loads_nothing_slow() -> None:
    code = (
        "import sys; from coulombook.cli import main; main(['--help']); "
        "print(*sorted(sys.modules), file=sys.stderr)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60
    )
    loaded = set(done.stderr.split())
    assert {one for one in loaded if one.startswith("coulombook")} == {
        "coulombook",
        *(f"coulombook.cli{one}" for one in ("", ".parser", ".status", ".streams", ".texts")),
    }
    slow = {
        "numpy",
        "scipy",
        "pandas",
        "rich",
        "pint",
        "openpyxl",
        "typing",
        "dataclasses",
        "pathlib",
        "shutil",
    }
    # what an editable install loads by itself before we begin does not count
    bare = subprocess.run(
        [sys.executable, "-c", "import sys; print(*sys.modules)"], capture_output=True, text=True, timeout=60
    )
    assert loaded & slow <= set(bare.stdout.split())


def test_python_m_and_the_exit_status_reach_the_shell(tmp_path: Path) -> None:
    done = process("tally", str(tmp_path / "nowhere"))
    assert done.returncode == 2
    assert "does not exist" in done.stderr


@pytest.mark.parametrize("encoding", ["ascii", "cp1252", "cp437"])
def test_a_name_the_terminal_cannot_show_does_not_stop_the_message(tmp_path: Path, encoding: str) -> None:
    done = process("tally", str(tmp_path / "電極 \u202e"), PYTHONIOENCODING=encoding)
    assert done.returncode == 2
    assert "\\u96fb\\u6975 \\u202e" in done.stderr
    assert "Traceback" not in done.stderr


def test_a_full_disk_behind_the_output_is_named_and_is_no_fault_of_ours(
    day: Path, work: Any, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    class Full(io.StringIO):
        def write(self, text: str) -> int:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    work(sample_book())
    monkeypatch.setattr(sys, "stdout", Full())
    assert main(["tally", str(day)]) == 2
    assert (
        capsys.readouterr().err == f"coulombook: the output cannot be written: {os.strerror(errno.ENOSPC)}\n"
    )
    # the ledgers had been written before their report was
    assert "ledger.csv" in files(day / "results")


def test_a_report_that_nobody_reads_to_its_end_changes_no_status(
    day: Path, work: Any, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    class Left(io.StringIO):
        def write(self, text: str) -> int:
            raise BrokenPipeError(errno.EPIPE, os.strerror(errno.EPIPE))

    work(sample_book())
    monkeypatch.setattr(sys, "stdout", Left())
    assert main(["tally", str(day)]) == 0
    work((FAULT,))
    assert main(["check", str(day)]) == 1
    assert capsys.readouterr().err == ""


def test_a_process_without_output_still_does_its_work(
    day: Path, work: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    work(sample_book())
    for name in ("stdout", "stderr"):
        monkeypatch.setattr(sys, name, None)
    status = main(["tally", str(day)])
    sys.stdout.close()
    sys.stderr.close()
    assert status == 0
    assert "ledger.csv" in files(day / "results")


def test_a_reader_that_stops_early_is_no_fault() -> None:
    read, write = os.pipe()
    os.close(read)
    try:
        done = subprocess.run(
            [sys.executable, "-m", "coulombook", "--help"],
            stdout=write,
            stderr=subprocess.PIPE,
            text=True,
            timeout=60,
        )
    finally:
        os.close(write)
    assert done.stderr == ""
    assert done.returncode == 0
