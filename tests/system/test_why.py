"""`coulombook why`: each example is a real day, its mistake is told of, and mended it is told of no longer."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Mapping
from pathlib import Path

import pytest
from tests.faults.answer import Command
from tests.system.why_day import GOOD, files_of, write_day

import coulombook
from coulombook.cli.parser import Parser
from coulombook.findings import KINDS, Finding, Severity
from coulombook.why import page_of


def findings_of(folder: Path, shown: Mapping[str, str], command: str = "tally DAY") -> tuple[Finding, ...]:
    """What a command tells of the good day with the files of an example."""
    parser = Parser(prog=command)
    parser.add_argument("command", choices=["tally", "compare"])
    parser.add_argument("day", choices=["DAY"])
    parser.add_argument("--draws", type=int, default=0)
    parser.add_argument("--reconcile", action="store_true")
    options = parser.parse_args(command.split())
    day = write_day(folder, shown)
    if options.command == "compare":
        from coulombook.comparison.order import compare_days

        return compare_days([day]).findings
    try:
        return coulombook.tally(day, draws=options.draws, reconcile=options.reconcile).findings
    except coulombook.DayFaults as faults:
        return faults.findings


@pytest.fixture(autouse=True)
def workplace(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    # ./calibrations of the place the tests are started from must not be looked at
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.fixture
def command(capsys: pytest.CaptureFixture[str]) -> Command:
    return Command(capsys)


def test_the_day_of_the_examples_has_nothing_to_tell(workplace: Path) -> None:
    assert findings_of(workplace / "day", {}) == ()


@pytest.mark.parametrize("kind", KINDS)
def test_bad_example_of_a_kind_brings_it_and_the_mended_one_brings_nothing(
    kind: str, workplace: Path
) -> None:
    page = page_of(kind)
    bad = findings_of(workplace / "bad" / "day", page.bad, page.command)
    if page.severity is Severity.STOP:
        # what is milder had not all been seen when the tally stopped
        bad = tuple(one for one in bad if one.severity is Severity.STOP)
    assert {one.kind for one in bad} == {kind, *page.beside}
    assert findings_of(workplace / "mended" / "day", page.mended, page.command) == ()


def test_sections_of_settings_take_the_places_of_those_of_the_same_heading() -> None:
    shown = {"day.toml": '[gas]\ndead_time = "5 s"\n\n[[uncertainty]]\nquantity = "I"\n'}
    text = files_of(shown)["day.toml"]
    assert text.count("[gas]") == text.count("[[uncertainty]]") == 1
    assert "current_window" in GOOD["day.toml"]
    assert "current_window" not in text
    assert "[reference]" in text
    top = files_of({"calibrations/gc-2043-04/calibration.toml": 'kind = "gas"\n'})
    assert "measured_on" not in top["calibrations/gc-2043-04/calibration.toml"]
    assert "[curve]" in top["calibrations/gc-2043-04/calibration.toml"]


# --- the command ---


@pytest.mark.parametrize("kind", KINDS)
def test_page_says_everything_within_80_columns(
    kind: str, command: Command, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    answer = command("why", kind)
    assert (answer.status, answer.err) == (0, "")
    assert all(len(line) <= 80 for line in answer.out.splitlines())
    page = page_of(kind)
    word = {"stop": "error", "warn": "warning", "note": "note"}[page.severity]
    assert answer.out.startswith(f"{word}[{kind}]: ")
    for head in ("What it means. ", "Why it matters. ", "What to do. ", "\nBad", "\nMended:"):
        assert head in answer.out
    for shown in (page.bad, page.mended):
        for text in shown.values():
            assert all(line.expandtabs(4) in answer.out for line in text.splitlines())
    assert "](" not in answer.out


def test_lines_that_differ_are_marked(command: Command) -> None:
    lines = command("why", "anodic-run").out.splitlines()
    assert [line for line in lines if line.startswith("  >")] == [
        *(f"  > {t},-1.5,10" for t in (0, 1800, 3600)),
        *(f"  > {t},-1.5,-10" for t in (0, 1800, 3600)),
    ]
    assert lines.count("    t / s,E / V,I / mA") == 2


def test_a_command_that_is_not_that_of_every_day_is_shown(command: Command) -> None:
    assert "coulombook tally DAY --reconcile" in command("why", "not-reconciled").out


def test_without_a_kind_all_are_listed_by_severity(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    answer = command("why")
    assert answer.status == 0
    lines = answer.out.splitlines()
    assert all(len(line) <= 80 for line in lines)
    listed = [line.split()[0] for line in lines if line.startswith("  ") and line.split()[0] in KINDS]
    ranked = sorted(KINDS, key=lambda kind: ["stop", "warn", "note"].index(KINDS[kind][0]))
    assert listed == ranked
    for kind in KINDS:
        (line,) = (one for one in lines if one.split()[:1] == [kind])
        assert line.split(None, 1)[1] == KINDS[kind][1]


def test_an_unknown_kind_is_a_wrong_call_that_suggests_near_ones(command: Command) -> None:
    answer = command("why", "unknwn-unit")
    assert (answer.status, answer.out) == (2, "")
    assert (
        answer.err == "coulombook: there is no kind of finding 'unknwn-unit'; did you mean 'unknown-unit'?\n"
    )
    assert "coulombook why lists those there are" in command("why", "zzz").err


def test_a_kind_may_be_given_in_words_or_as_shown(command: Command) -> None:
    shown = command("why", "balance-open").out
    assert command("why", "balance", "open").out == shown
    assert command("why", "warning[balance-open]:").out == shown


def test_findings_on_the_terminal_end_with_the_command_and_it_takes_every_kind_they_show(
    command: Command, workplace: Path
) -> None:
    day = write_day(workplace / "day", page_of("unknown-unit").bad)
    for answer in (command("tally", day), command("check", day)):
        text = answer.out + answer.err
        assert "\n\ncoulombook why KIND explains one\n" in text
        assert answer.errors
        assert all(command("why", one.kind).status == 0 for one in answer.errors)


def test_page_loads_nothing_slow() -> None:
    code = (
        "import sys; from coulombook.cli import main; main(['why', 'leakage']); main(['why']); "
        "print(sorted({'numpy', 'scipy', 'pandas', 'pint', 'openpyxl', 'matplotlib'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[-1] == "[]"
