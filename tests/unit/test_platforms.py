"""Nothing that only one system has: calls, names of files, encodings of consoles and files, widths, homes.

These tests run on any system; what they know of others is written beside them.
"""

from __future__ import annotations

import ast
import io
import os
import re
import shutil
import subprocess
import sys
import warnings
from collections.abc import Iterator
from dataclasses import replace
from functools import cache
from pathlib import Path

import pytest
from tests.faults.day import GOOD, write_day

import coulombook
from coulombook import tally
from coulombook.book import TABLES, Book
from coulombook.cli import main
from coulombook.cli.texts import COMMANDS
from coulombook.figures import drawings_of
from coulombook.report.results import result_files, write_results

SOURCE = Path(coulombook.__file__).parent
MODULES = sorted(SOURCE.rglob("*.py"))

# "Availability: Unix" or "not Windows" in the documentation of the standard library (os, signal, time)
ONLY_POSIX = {
    "os": {
        "chown", "chroot", "confstr", "ctermid", "fchdir", "fchmod", "fchown", "fork", "forkpty", "getegid", "geteuid",
        "getgid", "getgroups", "getloadavg", "getpgid", "getpgrp", "getpriority", "getresuid", "getsid", "getuid",
        "initgroups", "killpg", "lchown", "lockf", "major", "minor", "mkfifo", "mknod", "nice", "openpty", "pathconf",
        "posix_spawn", "pread", "pwrite", "register_at_fork", "sched_getaffinity", "sched_yield", "sendfile", "setgid",
        "setuid", "setsid", "statvfs", "sync", "sysconf", "tcgetpgrp", "ttyname", "uname", "wait", "wait3", "wait4",
        "O_CLOEXEC", "O_DIRECTORY", "O_NOFOLLOW", "O_NONBLOCK", "O_SYNC",
    },
    "signal": {"SIGALRM", "SIGHUP", "SIGKILL", "SIGPIPE", "SIGUSR1", "SIGUSR2", "alarm", "pause", "setitimer"},
    "time": {"tzset", "clock_gettime", "CLOCK_MONOTONIC"},
    # depends on how the machine is set up, so that the same day would read otherwise on another one
    "locale": {"setlocale", "getpreferredencoding", "atof", "format_string", "getlocale"},
}  # fmt: skip
MODULES_OF_ONE_SYSTEM = {
    "crypt", "curses", "fcntl", "grp", "msvcrt", "nis", "posix", "pty", "pwd", "readline", "resource", "spwd", "syslog",
    "termios", "tty", "winreg", "winsound", "_winapi",
    # without a table of time zones of its own under Windows; quotes for one shell alone
    "zoneinfo", "shlex",
}  # fmt: skip
# os.name and sys.platform tell systems apart, hasattr asks for what not all have
ASKS = re.compile(r"sys\.platform|os\.name|hasattr\(os")


@cache
def tree_of(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"))


def guarded(tree: ast.AST) -> set[int]:
    """Lines that are only reached after asking which system it is."""
    lines: set[int] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.If | ast.IfExp | ast.BoolOp):
            test = node.values[0] if isinstance(node, ast.BoolOp) else node.test
            if ASKS.search(ast.unparse(node if isinstance(node, ast.BoolOp) else test)):
                lines |= set(range(node.lineno, (node.end_lineno or node.lineno) + 1))
    return lines


def posix_only(tree: ast.AST) -> Iterator[str]:
    allowed = guarded(tree)
    for node in ast.walk(tree):
        if (
            isinstance(node, ast.Attribute)
            and isinstance(node.value, ast.Name)
            and node.lineno not in allowed
        ):
            if node.attr in ONLY_POSIX.get(node.value.id, set()):
                yield f"line {node.lineno}: {node.value.id}.{node.attr}"
        elif isinstance(node, ast.Import | ast.ImportFrom) and node.lineno not in allowed:
            names = (
                [node.module or ""] if isinstance(node, ast.ImportFrom) else [one.name for one in node.names]
            )
            yield from (f"line {node.lineno}: {name}" for name in names if name in MODULES_OF_ONE_SYSTEM)


def test_the_search_for_calls_of_one_system_finds_them() -> None:
    code = (
        "import os, fcntl\nos.fork()\nif sys.platform == 'linux':\n    os.nice(1)\nfrom pwd import getpwnam\n"
    )
    assert list(posix_only(ast.parse(code))) == ["line 1: fcntl", "line 5: pwd", "line 2: os.fork"]


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(SOURCE)))
def test_no_call_or_module_is_of_one_system_alone(path: Path) -> None:
    assert list(posix_only(tree_of(path))) == []


def test_no_path_of_one_system_stands_in_the_source() -> None:
    found = []
    for path in MODULES:
        for node in ast.walk(tree_of(path)):
            if isinstance(node, ast.Constant) and isinstance(node.value, str):
                said = re.match(r"/(tmp|dev|proc|etc|usr|var|home|bin)(/|$)|[A-Za-z]:\\|~/", node.value)
                found += [f"{path.name} line {node.lineno}: {node.value[:40]}"] if said else []
    assert found == []


def test_no_stamp_is_asked_for_in_the_way_of_one_system() -> None:
    # %-d and %#d leave out zeros on one system each, %s counts seconds on some; Python documents none of them
    for path in MODULES:
        for node in ast.walk(tree_of(path)):
            if isinstance(node, ast.Call) and getattr(node.func, "attr", "") in ("strftime", "strptime"):
                assert not re.search(r"%[-#s]", ast.unparse(node)), f"{path.name} line {node.lineno}"


def test_no_file_takes_the_place_of_another_by_a_name_change_that_windows_refuses() -> None:
    # os.rename onto a file that is there fails under Windows; os.replace does not. Folders never go onto one.
    uses = [
        path.name
        for path in MODULES
        if re.search(r"\bos\.rename\(|\.rename\(", path.read_text(encoding="utf-8"))
    ]
    assert uses == ["exchange.py"]


# --- commands, run as on consoles of another kind ---


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a good day, tallied."""
    folder = tmp_path_factory.mktemp("platforms")
    day = write_day(folder / "day", {})
    shutil.copytree(day, folder / "day 2")
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        patch.setenv("COULOMBOOK_CACHE", "off")
        assert main(["tally", "day", "--quiet"]) == 0
    return folder


CALLS = [
    ["tally", "day", "--tables-only"],
    ["check", "day"],
    ["explain", "day"],
    ["budget", "day"],
    ["compare", "day"],
    ["figures", "day", "--only", "closure", "--format", "svg"],
    ["curves", "--calibrations", "day/calibrations"],
    ["curves", "CO@FID", "--calibrations", "day/calibrations"],
    ["show", "day"],
    ["show", "day", "--run", "a1"],
    ["show", "day", "--table", "ledger"],
    ["again", "day"],
    ["why"],
    ["why", "balance-open"],
    ["new", "another"],
    ["completion", "bash"],
    ["--help"],
    ["tally", "--help"],
]


def test_every_command_is_among_the_calls() -> None:
    assert {call[0] for call in CALLS} >= set(COMMANDS)


def said(call: list[str], encoding: str, monkeypatch: pytest.MonkeyPatch) -> tuple[int, str]:
    """Status of a call and what it wrote to a console of some encoding."""
    raw = io.BytesIO()
    # strict, as a console is before the command has prepared it
    stream = io.TextIOWrapper(raw, encoding=encoding, errors="strict", newline="\n", write_through=True)
    with monkeypatch.context() as patch:
        patch.setattr(sys, "stdout", stream)
        patch.setattr(sys, "stderr", stream)
        status = main(call)
    shutil.rmtree("another", ignore_errors=True)
    return status, raw.getvalue().decode(encoding)


def words(text: str) -> set[str]:
    """Words, without letters that stand for shades in a bar and for points in a plot."""
    return set(re.findall(r"[^\W\d_]{4,}", text))


def numbers(text: str) -> list[str]:
    """Numbers with their uncertainties, in their order."""
    return re.findall(r"[+-]?\d[\d.()e+-]*", text)


@pytest.mark.parametrize("call", CALLS, ids=" ".join)
def test_a_console_of_windows_shows_the_same_words(
    call: list[str], place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(place)
    monkeypatch.setenv("COLUMNS", "100")
    status, right = said(call, "utf-8", monkeypatch)
    assert status == 0, right
    # Windows-1252 where output goes to a file or pipe, code page 437 in the console itself
    for encoding in ("cp1252", "cp437"):
        status, text = said(call, encoding, monkeypatch)
        assert status == 0
        assert words(text) >= words(right)
        assert numbers(text) == numbers(right)
        # no sign of ours is shown by its number
        assert not re.search(r"\\(u[0-9a-f]{4}|x[0-9a-f]{2}|N\{)", text)


def test_a_name_that_a_console_lacks_is_shown_by_its_number(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    write_day(tmp_path / "day", {"runs.csv": lambda text: text.replace("mesh", "網 Ω-mesh")})
    for encoding in ("cp1252", "cp437", "ascii"):
        status, text = said(["tally", "day", "--tables-only"], encoding, monkeypatch)
        assert status == 0
        assert re.search(r"\\u7db2 (\\u03a9|Ω)-mesh", text)


def fuller(call: list[str]) -> bool:
    return call[0] in (
        "tally",
        "check",
        "explain",
        "budget",
        "compare",
        "curves",
        "show",
        "again",
        "why",
        "figures",
    )


@pytest.mark.parametrize("call", [call for call in CALLS if fuller(call)], ids=" ".join)
@pytest.mark.parametrize("columns", ["40", None, "0"])
def test_a_narrow_console_or_none_breaks_lines_but_cuts_nothing(
    call: list[str], columns: str | None, place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(place)
    monkeypatch.delenv("COLUMNS", raising=False)
    if columns is not None:
        monkeypatch.setenv("COLUMNS", columns)
    status, text = said(call, "utf-8", monkeypatch)
    assert status == 0
    assert "…" not in text
    if call == ["show", "day"]:
        # the total of each run, which is why somebody looks
        totals = [
            row.split(",") for row in (place / "day/results/summary.csv").read_text("utf-8").splitlines()
        ]
        column = totals[0].index("total FE / %")
        for row in totals[1:]:
            assert re.search(rf"{row[0]}\b.*\b{float(row[column]):.2f}\(", text)


def test_a_day_is_tallied_without_a_home_and_in_a_plain_locale(place: Path) -> None:
    keep = {
        name: value for name, value in os.environ.items() if name in ("PATH", "SYSTEMROOT", "TMPDIR", "TEMP")
    }
    # the C locale without the coercion to UTF-8 (PEP 538, 540), and complaints about every file opened in the
    # encoding of the locale (PEP 597)
    environment = {
        **keep,
        "LC_ALL": "C",
        "PYTHONCOERCECLOCALE": "0",
        "PYTHONUTF8": "0",
        "PYTHONWARNDEFAULTENCODING": "1",
    }
    code = (
        "import warnings, sys; warnings.filterwarnings('error', category=EncodingWarning, module=r'coulombook\\b');"
        "from coulombook.cli import main; sys.exit(main(sys.argv[1:]))"
    )
    for call in (
        ["tally", "day 2"],
        ["new", "another"],
        ["figures", "day 2", "--only", "fe", "--format", "png"],
    ):
        done = subprocess.run(
            [sys.executable, "-c", code, *call], cwd=place, env=environment, capture_output=True, check=False
        )
        assert done.returncode == 0, done.stderr.decode()
    shutil.rmtree(place / "another")
    left = {one.name for one in (place / "day 2").iterdir()}
    assert left == {*(name.partition("/")[0] for name in GOOD), "results", "figures"}


def test_a_file_opened_in_the_encoding_of_the_machine_would_be_seen(tmp_path: Path) -> None:
    code = (
        "import warnings; warnings.filterwarnings('error', category=EncodingWarning, module=r'__main__');"
        "open(__import__('sys').argv[1], 'w')"
    )
    done = subprocess.run(
        [sys.executable, "-X", "warn_default_encoding", "-c", code, str(tmp_path / "x")],
        capture_output=True,
        check=False,
    )
    assert b"EncodingWarning" in done.stderr


# --- names of files ---

# Naming Files, Paths, and Namespaces (learn.microsoft.com): these names with any ending, these characters, and a dot
# or blank at the end
RESERVED = {
    "con",
    "prn",
    "aux",
    "nul",
    *(f"{port}{digit}" for port in ("com", "lpt") for digit in "0123456789¹²³"),
}
FORBIDDEN = re.compile(r'[<>:"/\\|?*\x00-\x1f]|[. ]$')
LONGEST_NAME = 100  # of 260 for a whole path under Windows; the rest is the bench's
CATALYSTS = (
    "CON", "nul", "aux.", "Lpt1", "A1", "a1", "Å1", "../../up", "C:\\up", 'a<b>c:"d"/e\\f|g?h*i', "dots...", "blank ",
    "x" * 5000, "x" * 5001, "網", "", "\u202eevil", "Straße", "STRASSE", "-", "com1.csv", "a\nb",
)  # fmt: skip


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A book whose catalysts have names that no file may have."""
    folder = tmp_path_factory.mktemp("hostile")
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        book = tally(write_day(folder / "day", {}))
    rows = {}
    for name in ("series", "ledger", "summary"):
        table = book.tables[name]
        at = table.heads.index("catalyst")
        named = [(*row[:at], one, *row[at + 1 :]) for one in CATALYSTS for row in table.rows]
        rows[name] = replace(table, rows=tuple(named))
    return replace(book, tables={**book.tables, **rows}, settled=None, pictures=())


def names_of(book: Book) -> list[str]:
    return [drawing.name for drawing in drawings_of(book)]


def test_names_of_figures_are_fit_for_every_file_system(hostile: Book) -> None:
    names = names_of(hostile)
    assert len(names) > len(CATALYSTS)
    for name in names:
        assert not FORBIDDEN.search(name), name
        assert name.partition(".")[0].casefold() not in RESERVED
        assert 0 < len(name) <= LONGEST_NAME
        assert name.isascii()


def test_no_two_figures_have_one_name_where_case_does_not_count(hostile: Book) -> None:
    names = names_of(hostile)
    assert len({name.casefold() for name in names}) == len(names)


def test_names_of_results_are_fit_for_every_file_system(hostile: Book) -> None:
    names = [*result_files(hostile), *TABLES]
    assert len({name.casefold() for name in names}) == len(names)
    for name in names:
        assert not FORBIDDEN.search(name)
        assert name.partition(".")[0].casefold() not in RESERVED
        assert len(name) <= LONGEST_NAME


def test_inputs_are_named_with_forward_slashes_on_every_system(place: Path) -> None:
    # a manifest written under Windows is read elsewhere
    book = tally(place / "day")
    assert {"traces/a1.csv", "scans/m1-20.csv"} <= {one.path for one in book.inputs}
    for path in MODULES:
        for node in ast.walk(tree_of(path)):
            if isinstance(node, ast.Call) and ast.unparse(node.func) == "str" and node.args:
                assert "relative_to" not in ast.unparse(node), (
                    f"{path.name} line {node.lineno}: as_posix, not str"
                )


def test_results_go_to_a_long_path(place: Path, tmp_path: Path) -> None:
    # longer than the 260 characters of old Windows; beside the name of the folder stand names of ours
    deep = tmp_path.joinpath(*["a folder with a long name " * 3] * 5, "results")
    try:
        deep.parent.mkdir(parents=True)
    except OSError:
        pytest.skip("the system takes no path that long")
    assert len(str(deep)) > 400
    book = tally(place / "day")
    write_results(book, deep, tables_only=True)
    write_results(book, deep, tables_only=True)
    assert [one.name for one in deep.parent.iterdir()] == ["results"]


def test_a_folder_whose_name_is_as_long_as_a_name_can_be_is_refused_in_words(
    place: Path, tmp_path: Path
) -> None:
    # 255 is the most that common file systems take: our names beside it are longer
    out = tmp_path / ("r" * 255)
    with warnings.catch_warnings():
        status = main(["tally", str(place / "day"), "--tables-only", "--quiet", "--out", str(out)])
    assert status in (0, 2)
    assert out.exists() == (status == 0)
    assert status == 0 or list(tmp_path.iterdir()) == []
