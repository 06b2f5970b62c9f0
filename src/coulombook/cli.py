"""The command `coulombook`: its options, its exit status, and what goes to which stream.

Exit status: 0 done; 1 the day's data have faults, or --strict was given and something may mislead (nothing is
written in either case); 2 a wrong option, a missing file or a folder that cannot be written; 3 a fault of
ours, shown with its traceback; 130 interrupted.

The help answers at once: everything but argparse is imported by the command that needs it.
"""

from __future__ import annotations

import argparse
import os
import sys

TYPE_CHECKING = False  # importing `typing` for it would slow every start
if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence
    from pathlib import Path
    from typing import Any, NoReturn, TextIO

    from coulombook.book import Book
    from coulombook.findings import DayFaults, Finding

DONE, FAULTS, WRONG_CALL, OUR_FAULT, INTERRUPTED = 0, 1, 2, 3, 130

_OVERVIEW = """\
Faradaic-efficiency ledgers for CO2 electrolysis: from a day's bench files to a
charge balance with honest uncertainty."""

_EXAMPLES = """\
examples:
  coulombook new "2043-05-18 mesh"      lay out an empty, commented day folder
  coulombook check "2043-05-18 mesh"    see what would be computed, and what is missing
  coulombook tally "2043-05-18 mesh"    compute the ledgers into its folder 'results'
  coulombook explain "2043-05-18 mesh"  see why its balance does not close
  coulombook budget "2043-05-18 mesh"   see where its uncertainty comes from
  coulombook curves                     see the calibration curves in ./calibrations

Each command has its own help: coulombook tally --help

exit status: 0 done; 1 the day's data have faults (all are listed, nothing is
written); 2 wrong option or missing file; 3 a fault of coulombook itself"""

_TALLY = """\
Read a day folder and write its Faradaic-efficiency ledgers, as CSV with a
manifest. The results are written whole or not at all; the day's own files are
never touched."""

_TALLY_EXAMPLES = """\
examples:
  coulombook tally "2043-05-18 mesh"
  coulombook tally "2043-05-18 mesh" --out ledgers --calibrations ~/gc --calibrations ~/nmr
  coulombook tally "2043-05-18 mesh" --draws 200000 --seed 7
  coulombook tally "2043-05-18 mesh" --strict --quiet && echo fit to publish"""

_EXPLAIN = """\
Say how each run and the day as a whole close, and what explains it if they do
not: candidate causes with their size, their evidence, and the test at the bench
that would decide. Nothing is written."""

_EXPLAIN_EXAMPLES = """\
example:
  coulombook explain "2043-05-18 mesh" """

_BUDGET = """\
Say which source contributes what to the variance of an output, largest first:
over the day (the mean of its runs) or for one run. Nothing is written."""

_BUDGET_EXAMPLES = """\
examples:
  coulombook budget "2043-05-18 mesh"                     total FE, mean over the runs
  coulombook budget "2043-05-18 mesh" --product C2H4      FE of one product
  coulombook budget "2043-05-18 mesh" --run m1-3 --product "C2+/C1" """

_CHECK = """\
Read a day folder, say what would be computed and what is missing, and list
every fault. Nothing is written."""

_CHECK_EXAMPLES = """\
example:
  coulombook check "2043-05-18 mesh" """

_NEW = """\
Lay out an empty day folder: every table with its heads and units, and a
commented day.toml. A folder that holds something already is left alone."""

_NEW_EXAMPLES = """\
examples:
  coulombook new "2043-05-18 mesh"              tables as CSV files
  coulombook new "2043-05-18 mesh" --workbook   tables as sheets of day.xlsx"""

_CURVES = """\
Show the calibration curves at hand: all of them; one of them, with its
uncertainty, limits, verdicts and a plot; or several against each other, with
their drift.

A NAME is a curve, such as ethylene@FID (the analyte by any of its names or its
formula), gc-2043-04/ethylene@FID for one calibration's, or a calibration."""

_CURVES_EXAMPLES = """\
examples:
  coulombook curves                            all curves in ./calibrations
  coulombook curves --calibrations ~/gc --on 2043-06-30
  coulombook curves C2H4@FID                   one curve, and its drift if there are several
  coulombook curves C2H4@FID --figure ethylene.svg
  coulombook curves gc-2042-09 gc-2043-04      every curve of two calibrations compared
  coulombook curves C2H4@FID gc-2042-09 gc-2043-04
  coulombook curves C2H4@FID --checks "2043-05-18 mesh"    its check injections charted"""


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command and return its exit status; ``arguments`` default to those of the process."""
    _prepare_streams()
    try:
        try:
            return _run(sys.argv[1:] if arguments is None else list(arguments))
        finally:
            _flush(sys.stdout)
    except SystemExit as stop:  # argparse: the help, or a wrong call
        return stop.code if isinstance(stop.code, int) else WRONG_CALL
    except _OutputError as error:
        _say(f"coulombook: the output cannot be written: {error}")
        return WRONG_CALL
    except KeyboardInterrupt:
        _say("coulombook: interrupted")
        return INTERRUPTED
    except Exception:
        import traceback

        import coulombook

        _say(traceback.format_exc().rstrip())
        _say(
            f"coulombook {coulombook.__version__}: this is a fault of coulombook, not of your data. "
            "Please report it with the lines above."
        )
        return OUR_FAULT


def _run(arguments: Sequence[str]) -> int:
    parser = _parser(arguments)
    options, unknown = parser.parse_known_args(arguments)
    if unknown:
        parser.refuse(unknown, arguments)
    if options.command is None:
        parser.print_help(sys.stderr)
        return WRONG_CALL
    commands = {
        "tally": _tally,
        "check": _check,
        "explain": _explain,
        "budget": _budget,
        "new": _new,
        "curves": _curves,
    }
    return commands[options.command](options)


def _tally(options: argparse.Namespace) -> int:
    from pathlib import Path

    from coulombook.findings import DayFaults, Severity
    from coulombook.report.progress import Progress
    from coulombook.report.results import ResultsError, check_destination, write_results
    from coulombook.tally import tally

    day = Path(options.day)
    out = Path(options.out) if options.out else day / "results"
    calibrations = [Path(one) for one in options.calibrations]
    if (problem := _missing(day, calibrations)) is not None:
        return _refuse(problem)
    try:
        check_destination(out)  # before the work, not after it
        with Progress(sys.stderr) as progress:
            book = tally(
                day,
                calibrations=calibrations,
                draws=options.draws,
                seed=options.seed,
                reconcile=options.reconcile,
                progress=progress,
            )
        if options.strict and any(one.severity is Severity.WARN for one in book.findings):
            _show_findings(book.findings, warnings_too=True)
            _say("coulombook: nothing was written, for --strict was given and the findings above may mislead")
            return FAULTS
        written = write_results(book, out)
    except DayFaults as faults:
        _show_findings(faults.findings, warnings_too=not options.quiet)
        _say(f"coulombook: {_faults_in_words(faults)}; nothing was written")
        return FAULTS
    except ResultsError as error:
        return _refuse(str(error))
    except (FileNotFoundError, NotADirectoryError, PermissionError) as error:
        return _refuse(_plain_words(error))
    if not options.quiet:
        from coulombook.report.terminal import console_for, show_book

        with _quiet_pipe():
            show_book(book, console_for(sys.stdout), written=written)
    return DONE


def _explain(options: argparse.Namespace) -> int:
    from coulombook.report.explain_view import show_explanation
    from coulombook.report.terminal import console_for

    book = _book_of(options)
    if isinstance(book, int):
        return book
    with _quiet_pipe():
        show_explanation(book, console_for(sys.stdout))
    return DONE


def _budget(options: argparse.Namespace) -> int:
    from coulombook.book.shares import TOTAL, outputs_of, runs_of, source_shares
    from coulombook.report.budget_view import show_budget
    from coulombook.report.terminal import console_for
    from coulombook.species import load_species

    book = _book_of(options)
    if isinstance(book, int):
        return book
    table = book.tables["budget"]
    if options.run is not None and options.run not in runs_of(table):
        return _refuse(f"the day has no run '{options.run}'{_did_you_mean(options.run, runs_of(table))}")
    outputs = outputs_of(table, options.run)
    asked = TOTAL if options.product is None else options.product
    species = load_species().find(asked)
    output = next(
        (one for one in outputs if one.casefold() in (asked.casefold(), species.name if species else "")),
        None,
    )
    if output is None:
        of_run = f" of run '{options.run}'" if options.run is not None else ""
        near = _did_you_mean(asked, outputs) or f"; known: {', '.join(outputs) or 'none'}"
        return _refuse(f"there is no budget of '{asked}'{of_run}{near}")
    runs, shares = source_shares(table, output, options.run)
    of = (
        f"run {options.run}"
        if options.run is not None
        else f"mean of {runs} {'run' if runs == 1 else 'runs'}"
    )
    unit = " mA/cm^2" if output.startswith("j real ") else "" if output == "C2+/C1" else " %"
    with _quiet_pipe():
        show_budget(
            f"{book.day}: variance of {output}, {of}",
            shares,
            unit,
            [one for one in outputs if one != output and not one.startswith("j real ")],
            console_for(sys.stdout),
        )
    return DONE


def _book_of(options: argparse.Namespace) -> Book | int:
    """The book of a day that is only to be looked at, or the exit status where there is none."""
    from pathlib import Path

    from coulombook.findings import DayFaults
    from coulombook.report.progress import Progress
    from coulombook.tally import tally

    day = Path(options.day)
    calibrations = [Path(one) for one in options.calibrations]
    if (problem := _missing(day, calibrations)) is not None:
        return _refuse(problem)
    try:
        with Progress(sys.stderr) as progress:
            return tally(day, calibrations=calibrations, progress=progress)
    except DayFaults as faults:
        _show_findings(faults.findings)
        _say(f"coulombook: {_faults_in_words(faults)}")
        return FAULTS
    except (FileNotFoundError, NotADirectoryError, PermissionError) as error:
        return _refuse(_plain_words(error))


def _faults_in_words(faults: DayFaults) -> str:
    count = len(faults.stops)
    return f"the day's data have {count} {'fault' if count == 1 else 'faults'}"


def _check(options: argparse.Namespace) -> int:
    from pathlib import Path

    from coulombook.findings import Severity
    from coulombook.report.terminal import console_for, show_check
    from coulombook.tally import check

    day = Path(options.day)
    calibrations = [Path(one) for one in options.calibrations]
    if (problem := _missing(day, calibrations)) is not None:
        return _refuse(problem)
    try:
        checked = check(day, calibrations=calibrations)
    except (FileNotFoundError, NotADirectoryError, PermissionError) as error:
        return _refuse(_plain_words(error))
    with _quiet_pipe():
        show_check(checked.lines, checked.findings, console_for(sys.stdout))
    wrong = {Severity.STOP, Severity.WARN} if options.strict else {Severity.STOP}
    return FAULTS if any(one.severity in wrong for one in checked.findings) else DONE


def _new(options: argparse.Namespace) -> int:
    from pathlib import Path

    from coulombook.intake.new_day import write_new_day
    from coulombook.report.text import visible

    folder = Path(options.folder)
    try:
        write_new_day(folder, options.workbook)
    except OSError as error:
        return _refuse(_plain_words(error))
    tables = "day.xlsx" if options.workbook else "the tables"
    with _quiet_pipe():
        print(
            f"A new day lies in '{visible(options.folder)}'. Fill in day.toml and {tables}, put traces into 'traces',"
        )
        print(f"then see what is missing: coulombook check {_as_typed(visible(options.folder))}")
    return DONE


def _curves(options: argparse.Namespace) -> int:
    from datetime import date
    from pathlib import Path

    from coulombook.findings import Severity
    from coulombook.library.answer import answer, answer_checks
    from coulombook.library.names import UnknownCurve
    from coulombook.library.shelf import open_library
    from coulombook.report.curves_view import show_answer, write_entry
    from coulombook.report.terminal import console_for
    from coulombook.report.text import visible
    from coulombook.species import load_species

    places = [Path(one) for one in options.calibrations] or [Path("calibrations")]
    day = Path(options.checks) if options.checks else None
    if (problem := _missing(day, places)) is not None:
        return _refuse(problem)
    try:
        on = date.fromisoformat(options.on) if options.on else date.today()
    except ValueError:
        return _refuse(f"--on takes a date such as 2043-05-18, not '{options.on}'")
    figure = Path(options.figure) if options.figure else None
    if figure is not None and (problem := _no_figure(figure)) is not None:
        return _refuse(problem)
    try:
        library = open_library(places)
        if day is None:
            found = answer(library, options.names, load_species(), on)
        else:
            found = answer_checks(library, options.names, load_species(), on, day, places)
        if figure is not None and found.entry is None:
            raise UnknownCurve("--figure draws one curve; name one, such as gc-2043-04/ethylene@FID")
    except UnknownCurve as error:
        if library.broken:
            _show_findings(library.findings)
        return _refuse(str(error))
    except OSError as error:
        return _refuse(_plain_words(error))
    if not library.calibrations and not library.broken:
        where = ", ".join(f"'{one}'" for one in places)
        return _refuse(
            f"there are no calibrations in {where}; each is a folder with calibration.toml and standards.csv"
        )
    with _quiet_pipe():
        show_answer(found, library, console_for(sys.stdout), on)
    if figure is not None and found.entry is not None and found.entry.curve is not None:
        try:
            write_entry(found.entry, figure)
        except OSError as error:
            return _refuse(f"the figure cannot be written: {_plain_words(error)}")
        with _quiet_pipe():
            print(f"Drawn into {visible(options.figure, 1000)}")
    if found.findings:
        _show_findings(found.findings)
    return FAULTS if any(one.severity is Severity.STOP for one in found.findings) else DONE


def _no_figure(path: Path) -> str | None:
    """Why a figure cannot be written there, before any work is done."""
    from coulombook.report.curve_plot import FORMATS

    if path.suffix.lower() not in FORMATS:
        return f"a figure is written as {', '.join(FORMATS)}; '{path.name}' has another ending"
    if not path.parent.is_dir():
        return f"the folder of the figure, '{path.parent}', does not exist"
    return f"'{path}' is a folder" if path.is_dir() else None


def _missing(day: Path | None, calibrations: Iterable[Path]) -> str | None:
    folders = [("day", day)] if day is not None else []
    for what, folder in (*folders, *(("calibrations", one) for one in calibrations)):
        if not folder.is_dir():
            state = "is a file, not a folder" if folder.exists() else "does not exist"
            return f"the folder of the {what}, '{folder}', {state}"
    return None


def _show_findings(findings: Iterable[Finding], *, warnings_too: bool = False) -> None:
    from coulombook.findings import Severity
    from coulombook.report.terminal import console_for, show_findings

    with _quiet_pipe():
        show_findings(
            findings, console_for(sys.stderr), least=Severity.WARN if warnings_too else Severity.STOP
        )


def _refuse(problem: str) -> int:
    from coulombook.report.text import visible

    _say(f"coulombook: {visible(problem, 1000)}")
    return WRONG_CALL


def _plain_words(error: OSError) -> str:
    return f"'{error.filename}': {error.strerror}" if error.filename and error.strerror else str(error)


def _as_typed(text: str) -> str:
    return text if text.replace("-", "").replace("_", "").isalnum() else f'"{text}"'


def _say(text: str) -> None:
    from contextlib import suppress

    with suppress(OSError):  # nobody is left to be told
        print(text, file=sys.stderr)


class _OutputError(Exception):
    """What we print cannot be written where it was sent, such as a full disk."""


class _quiet_pipe:
    """Let a reader that stops early (`| head`) stop us from printing, and from nothing else."""

    def __enter__(self) -> None:
        pass

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, _: object) -> bool:
        if isinstance(error, OSError) and not isinstance(error, BrokenPipeError):
            raise _OutputError(error.strerror) from error
        return isinstance(error, BrokenPipeError)


def _flush(stream: TextIO) -> None:
    try:
        with _quiet_pipe():
            try:
                stream.flush()
            except OSError:
                # the interpreter flushes once more when it ends, and must find a place that takes it
                os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())
                raise
    except ValueError:  # a caller within Python has closed it
        pass


def _prepare_streams() -> None:
    """Show a character that the terminal's encoding lacks by its number, instead of failing on it."""
    for name in ("stdout", "stderr"):
        if getattr(sys, name) is None:  # closed by whoever started us
            setattr(sys, name, open(os.devnull, "w"))  # noqa: SIM115 - as long as the process
        stream = getattr(sys, name)
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")


class _Help(argparse.RawDescriptionHelpFormatter):
    """Texts as written; the width asked of the terminal itself, for importing shutil takes long."""

    def __init__(self, prog: str, **settings: Any) -> None:
        settings.setdefault("width", _width() - 2)
        super().__init__(prog, **settings)


def _width() -> int:
    try:
        return int(os.environ["COLUMNS"])
    except (KeyError, ValueError):
        pass
    try:
        return os.get_terminal_size(sys.stdout.fileno()).columns or 80
    except (OSError, ValueError, AttributeError):
        return 80


class _Parser(argparse.ArgumentParser):
    """A parser that names the nearest word for one it does not know."""

    def refuse(self, unknown: Sequence[str], arguments: Sequence[str]) -> NoReturn:
        """Refuse arguments that no command takes."""
        named = next((one for one in arguments if one in _commands(self)), None)
        parser = _commands(self)[named] if named else self
        options = [option for action in parser._actions for option in action.option_strings]
        parser.error(
            f"unknown {'option' if unknown[0].startswith('-') else 'argument'} '{unknown[0]}'"
            + _did_you_mean(unknown[0].partition("=")[0], options)
        )

    def _check_value(self, action: argparse.Action, value: Any) -> None:
        if action.choices is not None and value not in action.choices:
            known = [str(one) for one in action.choices]
            raise argparse.ArgumentError(
                None,
                f"unknown command '{value}'"
                + (_did_you_mean(str(value), known) or f"; known: {', '.join(known)}"),
            )


def _commands(parser: argparse.ArgumentParser) -> dict[str, argparse.ArgumentParser]:
    for action in parser._actions:
        if isinstance(action, argparse._SubParsersAction):
            return dict(action.choices)
    return {}


def _did_you_mean(word: str, known: Sequence[str]) -> str:
    import difflib

    near = difflib.get_close_matches(word, known, 1, 0.6)
    return f"; did you mean '{near[0]}'?" if near else ""


class _Version(argparse.Action):
    """Print the version and leave."""

    def __call__(self, parser: argparse.ArgumentParser, *_: object) -> NoReturn:
        import coulombook

        with _quiet_pipe():
            print(f"coulombook {coulombook.__version__}")
        parser.exit()


def _parser(arguments: Sequence[str]) -> _Parser:
    """The parser; of the commands only those named in the arguments get their options, for each option costs time."""
    parser = _Parser(
        prog="coulombook",
        description=_OVERVIEW,
        epilog=_EXAMPLES,
        formatter_class=_Help,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action=_Version, nargs=0, help="print the version and leave")
    commands = parser.add_subparsers(dest="command", title="commands", metavar="COMMAND", prog=parser.prog)
    for name, short, text, examples, give_options in (
        ("tally", "compute the ledgers of a day", _TALLY, _TALLY_EXAMPLES, _tally_options),
        ("check", "say what would be computed and what is missing", _CHECK, _CHECK_EXAMPLES, _check_options),
        ("explain", "say why a balance does not close", _EXPLAIN, _EXPLAIN_EXAMPLES, _explain_options),
        ("budget", "say where an uncertainty comes from", _BUDGET, _BUDGET_EXAMPLES, _budget_options),
        ("new", "lay out an empty day folder", _NEW, _NEW_EXAMPLES, _new_options),
        ("curves", "show and compare calibration curves", _CURVES, _CURVES_EXAMPLES, _curves_options),
    ):
        command = commands.add_parser(
            name, help=short, description=text, epilog=examples, formatter_class=_Help, allow_abbrev=False
        )
        if name in arguments:
            give_options(command)
    return parser


def _tally_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("day", metavar="DAY", help="the day folder")
    parser.add_argument("--out", metavar="DIR", help="where the results go (default: DAY/results)")
    _reading_options(parser)
    parser.add_argument(
        "--strict",
        action="store_true",
        help="write nothing and end with status 1 if a number may mislead (a warning)",
    )
    parser.add_argument("--quiet", action="store_true", help="print nothing but what stopped the tally")
    parser.add_argument(
        "--draws",
        metavar="N",
        type=_count_of_draws,
        default=0,
        help="also find coverage intervals by N random draws, 200000 or more for the 95 %% level (default: none)",
    )
    parser.add_argument(
        "--seed", metavar="S", type=_seed, default=1, help="the same seed gives the same draws (default: 1)"
    )
    parser.add_argument(
        "--reconcile",
        action="store_true",
        help="also adjust the readings to totals of 100 %%, in a table beside the measured ones",
    )


FEWEST_DRAWS = 100  # with fewer no interval has ends worth showing


def _count_of_draws(text: str) -> int:
    if not text.isdecimal() or 0 < int(text) < FEWEST_DRAWS:
        raise argparse.ArgumentTypeError(f"takes 0 or a number of draws from {FEWEST_DRAWS}, not '{text}'")
    return int(text)


def _seed(text: str) -> int:
    if not text.isdecimal():
        raise argparse.ArgumentTypeError(f"takes a whole number from 0, not '{text}'")
    return int(text)


def _explain_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("day", metavar="DAY", help="the day folder")
    _reading_options(parser)


def _budget_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("day", metavar="DAY", help="the day folder")
    parser.add_argument("--run", metavar="R", help="one run (default: the mean of all runs)")
    parser.add_argument(
        "--product",
        metavar="P",
        help="a product by any of its names, C2+/C1, C2+ FE, or 'j real ethylene' (default: the total FE)",
    )
    _reading_options(parser)


def _check_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("day", metavar="DAY", help="the day folder")
    _reading_options(parser)
    parser.add_argument("--strict", action="store_true", help="end with status 1 for a warning as well")


def _new_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("folder", metavar="FOLDER", help="the folder to make")
    parser.add_argument("--workbook", action="store_true", help="one workbook instead of CSV files")


def _curves_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("names", metavar="NAME", nargs="*", help="curves or calibrations; none: all")
    parser.add_argument(
        "--calibrations",
        metavar="DIR",
        action="append",
        default=[],
        help="a folder that holds calibrations (default: ./calibrations); may be given several times",
    )
    parser.add_argument("--on", metavar="DATE", help="judge validity on this date (default: today)")
    parser.add_argument(
        "--checks", metavar="DAY", help="show a day's check injections on the control chart of the one curve"
    )
    parser.add_argument(
        "--figure", metavar="FILE", help="write a figure of the one curve: .svg, .png or .pdf"
    )


def _reading_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--calibrations",
        metavar="DIR",
        action="append",
        default=[],
        help="a folder that holds calibrations, searched after DAY/calibrations and before ./calibrations; "
        "may be given several times",
    )
