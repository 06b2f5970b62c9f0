"""The documents: what they show is what happens, links lead somewhere, and no head, key or kind is forgotten."""

from __future__ import annotations

import doctest
import importlib
import re
import shutil
import tomllib
from collections.abc import Iterator
from pathlib import Path
from urllib.parse import unquote

import pytest
from docs import refresh

import coulombook
from coulombook.balance.readings import DaySettings
from coulombook.balance.verdicts import ABOVE, BELOW, CLOSED, OVER, QUANTIFIED, SHORT
from coulombook.book import TABLES
from coulombook.cell.potential import reference_names
from coulombook.curves.fit import FORMS
from coulombook.curves.weights import WEIGHTS
from coulombook.findings import KINDS, Findings
from coulombook.intake import schema
from coulombook.intake.calibration import read_calibration
from coulombook.intake.files import Folder
from coulombook.intake.schema import Schema
from coulombook.intake.settings import _UNCERTAIN_KEYS, read_day_settings
from coulombook.intake.toml_text import Section, fold, read_settings
from coulombook.species import load_species

ROOT = refresh.ROOT
DOCUMENTS = refresh.documents()
NAMES = [str(path.relative_to(ROOT)) for path in DOCUMENTS]
LINE = 120


def text_of(name: str) -> str:
    return (ROOT / name).read_text(encoding="utf-8")


def prose(document: str) -> str:
    """A document without its fenced blocks."""
    return re.sub(r"^```.*?^```$", "", document, flags=re.DOTALL | re.MULTILINE)


def section(document: str, heading: str) -> str:
    """What stands below a heading, down to the next heading of its rank or a higher one."""
    found = re.search(rf"^(#+) {re.escape(heading)}$", document, re.MULTILINE)
    assert found, f"there is no heading '{heading}'"
    rest = document[found.end() :]
    end = re.search(rf"^#{{1,{len(found[1])}}} ", rest, re.MULTILINE)
    return rest[: end.start()] if end else rest


def table(text: str) -> list[dict[str, str]]:
    """The first table of a text, row by row."""
    lines = [line.strip() for line in text.splitlines()]
    rows: list[list[str]] = []
    for line in lines:
        if line.startswith("|"):
            rows.append(
                [cell.strip().replace("\\|", "|") for cell in re.split(r"(?<!\\)\|", line.strip("|"))]
            )
        elif rows:
            break
    assert len(rows) > 2, "there is no table"
    return [dict(zip(rows[0], row, strict=True)) for row in rows[2:]]


def quoted(cell: str) -> list[str]:
    return re.findall(r"`([^`]+)`", cell)


# --- what is shown is what happens ---


@pytest.mark.parametrize("name", [name for name in NAMES if refresh.runnable(text_of(name))])
def test_a_document_shows_what_its_commands_and_blocks_print(name: str, tmp_path: Path) -> None:
    refresh.prepare(tmp_path)
    for one in refresh.run(text_of(name), tmp_path):
        assert one.shown == one.printed, f"{one.what}: `python -m docs.refresh` writes what came out"


def test_the_picture_shows_what_the_command_prints(tmp_path: Path) -> None:
    refresh.prepare(tmp_path)
    assert refresh.PICTURE.read_text(encoding="utf-8") == refresh.picture(tmp_path)


def readme_commands() -> list[str]:
    return [one.body.strip() for one in refresh.blocks(text_of("README.md")) if one.language == "bash"]


def test_readme_gives_two_commands_each_from_nothing_to_the_result() -> None:
    assert [
        one.startswith("python3 -m venv .venv && .venv/bin/pip install -q ") for one in readme_commands()
    ] == [
        True,
        True,
    ]


def test_command_of_the_readme_writes_the_results_of_the_example_day(tmp_path: Path) -> None:
    refresh.prepare(tmp_path)
    # what is left once the package is installed
    last = readme_commands()[0].rpartition(" && ")[2]
    assert last.startswith(".venv/bin/")
    refresh.run_command(last.removeprefix(".venv/bin/"), tmp_path)
    assert (tmp_path / last.split()[-1] / "results" / "ledger.csv").exists()


def test_checks_end_with_the_test_command_of_the_readme() -> None:
    last = readme_commands()[1].rpartition(" && ")[2].removeprefix(".venv/bin/")
    commands = [
        line for line in text_of(".ci/run").splitlines() if line and not line.startswith(("#", "say"))
    ]
    assert commands[-1] == last


def modules() -> Iterator[str]:
    source = Path(coulombook.__file__).parent
    for path in sorted(source.rglob("*.py")):
        parts = path.relative_to(source).with_suffix("").parts
        if parts[-1] not in ("__main__", "__init__"):
            yield ".".join(("coulombook", *parts))


@pytest.mark.parametrize("module", list(modules()))
def test_examples_in_docstrings_show_what_comes_out(module: str) -> None:
    options = doctest.NORMALIZE_WHITESPACE
    assert doctest.testmod(importlib.import_module(module), optionflags=options).failed == 0


# --- links and form ---


def anchor(heading: str) -> str:
    """The name of a heading in a link, as the usual viewers of such documents make it."""
    plain = re.sub(r"[`*]|\[([^\]]*)\]\([^)]*\)", r"\1", heading).strip().casefold()
    return re.sub(r"[^\w\- ]", "", plain).replace(" ", "-")


def links(name: str) -> list[str]:
    return re.findall(r"\]\(([^)\s]+)\)", prose(text_of(name)))


@pytest.mark.parametrize("name", NAMES)
def test_every_link_within_the_project_leads_somewhere(name: str) -> None:
    broken = []
    for link in links(name):
        if re.match(r"[a-z]+:", link):
            continue
        file, _, part = unquote(link).partition("#")
        target = (ROOT / name).parent / file if file else ROOT / name
        headings = re.findall(r"^#+ (.*)$", prose(target.read_text("utf-8")), re.MULTILINE) if part else []
        if not target.exists() or (part and part not in map(anchor, headings)):
            broken.append(link)
    assert broken == []


def test_every_document_can_be_reached_from_the_readme() -> None:
    reached, ahead = set(), {ROOT / "README.md"}
    while ahead:
        path = ahead.pop()
        reached.add(path)
        for link in links(str(path.relative_to(ROOT))):
            target = (path.parent / link.partition("#")[0]).resolve()
            if target.suffix == ".md" and target.exists() and target not in reached:
                ahead.add(target)
    assert {str(path.relative_to(ROOT)) for path in set(DOCUMENTS) - reached} == set()


@pytest.mark.parametrize("name", NAMES)
def test_prose_keeps_to_the_width_of_the_house(name: str) -> None:
    # tables and links cannot be broken
    long = [line for line in prose(text_of(name)).splitlines() if len(line) > LINE and line[:1] not in "|!"]
    assert long == []


def test_changelog_begins_with_the_version_at_hand() -> None:
    assert re.findall(r"^## (\S+)", text_of("docs/CHANGELOG.md"), re.MULTILINE)[0] == coulombook.__version__


def test_decisions_are_numbered_and_say_all_four_things() -> None:
    found = sorted(path for path in (ROOT / "docs" / "decisions").glob("*.md") if path.name != "README.md")
    assert [path.name[:4] for path in found] == [f"{number:04}" for number in range(1, len(found) + 1)]
    for path in found:
        document = path.read_text(encoding="utf-8")
        parts = re.findall(r"^## (.*)$", document, re.MULTILINE)
        assert parts == ["Situation", "Choice", "What else was weighed", "Consequences"], path.name


# --- nothing is forgotten: the day folder ---

SECTIONS_OF_TABLES: dict[str, Schema] = {
    **schema.DAY_TABLES,
    "traces": schema.TRACE,
    "voltammograms": schema.VOLTAMMOGRAM,
    "spectrum files": schema.SPECTRUM,
    "standards.csv of a gas calibration": schema.GAS_STANDARDS,
    "standards.csv of a liquid calibration": schema.LIQUID_STANDARDS,
}


@pytest.mark.parametrize("heading", SECTIONS_OF_TABLES)
def test_day_folder_lists_every_head_of_a_table_with_its_synonyms(heading: str) -> None:
    known = SECTIONS_OF_TABLES[heading]
    rows = table(section(text_of("docs/day_folder.md"), heading))
    assert [quoted(row["head"])[0] for row in rows] == list(known.heads)
    assert [quoted(row["head"])[0] for row in rows if row["needed"] == "yes"] == [
        column.head for column in known.needed()
    ]
    assert [tuple(quoted(row["also called"])) for row in rows] == [
        column.synonyms for column in known.columns
    ]


@pytest.fixture
def asked(monkeypatch: pytest.MonkeyPatch) -> dict[str, list[str]]:
    """The keys that are asked for, by section, while settings are read."""
    keys: dict[str, list[str]] = {}
    original = Section.report_unknown

    def note(self: Section) -> None:
        keys[self.name] = list(dict.fromkeys(self._asked))
        original(self)

    monkeypatch.setattr(Section, "report_unknown", note)
    return keys


EVERY_SECTION = """
[reference]
potential = "0.2 V"
[[uncertainty]]
quantity = "peak area"
standard = "1 %"
shared = "reading"
[species.butanol]
formula = "C4H10O"
phase = "liquid"
"""
SECTIONS_OF_SETTINGS = {
    "[day]": "day",
    "[reference]": "reference",
    "[gas]": "gas",
    "[liquid]": "liquid",
    "[surface]": "surface",
    "[balance]": "balance",
    "[kinetics]": "kinetics",
    "[read.traces]": "read.traces",
    "[[uncertainty]]": "uncertainty#1",
    "[species.NAME]": "species.butanol",
}


def day_settings(folder: Path, text: str) -> tuple[DaySettings, Findings]:
    (folder / "day.toml").write_text(text, encoding="utf-8")
    findings = Findings()
    source = read_settings(Folder(folder), folder / "day.toml", findings)
    assert source is not None
    return read_day_settings(source, load_species(), findings).settings, findings


@pytest.mark.parametrize("heading", SECTIONS_OF_SETTINGS)
def test_day_folder_lists_every_key_of_a_section(
    heading: str, tmp_path: Path, asked: dict[str, list[str]]
) -> None:
    day_settings(tmp_path, EVERY_SECTION)
    rows = table(section(text_of("docs/day_folder.md"), heading))
    listed = [fold(quoted(row["key"])[0].strip('"')) for row in rows]
    assert sorted(listed) == sorted(map(fold, asked[SECTIONS_OF_SETTINGS[heading]]))


@pytest.mark.parametrize("heading", ["[gas]", "[liquid]", "[surface]", "[balance]", "[kinetics]"])
def test_defaults_of_the_day_folder_are_those_of_the_code(heading: str, tmp_path: Path) -> None:
    rows = table(section(text_of("docs/day_folder.md"), heading))
    given = [
        f"{quoted(row['key'])[0]} = {quoted(row['default'])[0]}" for row in rows if quoted(row["default"])
    ]
    plain, _ = day_settings(tmp_path, '[reference]\npotential = "0.2 V"\n')
    written, findings = day_settings(
        tmp_path, '[reference]\npotential = "0.2 V"\n' + "\n".join([heading, *given, ""])
    )
    assert not findings.stops
    assert written == plain
    assert tomllib.loads("\n".join(given)) or heading == "[surface]"


def test_day_folder_lists_every_key_an_uncertainty_may_name() -> None:
    rows = table(section(text_of("docs/day_folder.md"), "Keys that an uncertainty may name"))
    assert sorted(fold(quoted(row["name"])[0]) for row in rows) == sorted(_UNCERTAIN_KEYS)


def test_day_folder_lists_every_reference_electrode() -> None:
    rows = table(section(text_of("docs/day_folder.md"), "Reference electrodes of the shipped table"))
    assert [quoted(row["name"])[0] for row in rows] == list(reference_names())


def test_day_folder_lists_every_species() -> None:
    shipped = load_species()
    known = {one.name for name in shipped.names() if (one := shipped.find(name)) is not None}
    listed = quoted(section(text_of("docs/day_folder.md"), "Species of the shipped table"))
    assert sorted(listed) == sorted(known)


def test_day_folder_lists_every_key_of_a_calibration(tmp_path: Path, asked: dict[str, list[str]]) -> None:
    shutil.copytree(ROOT / "calibrations" / "gc-2043-04", tmp_path / "one")
    read_calibration(Folder(tmp_path / "one", "calibrations/one"), "one", load_species(), Findings())
    rows = table(section(text_of("docs/day_folder.md"), "calibration.toml"))
    listed = {quoted(row["key"])[0] for row in rows}
    top = set(asked.pop("")) - {"curve"}
    curve = {key for keys in asked.values() for key in keys}
    assert listed == top | {f"curve: {key}" for key in curve}


def test_calibrations_tell_of_every_form_and_weighting() -> None:
    told = set(quoted(prose(text_of("docs/how_to_calibrations.md"))))
    assert told >= {*FORMS, *WEIGHTS}


# --- nothing is forgotten: the results and the findings ---


@pytest.mark.parametrize("name", TABLES)
def test_results_list_every_column_of_a_table(name: str) -> None:
    rows = table(section(text_of("docs/results.md"), f"{name}.csv"))
    assert [head for row in rows for head in quoted(row["column"])] == list(TABLES[name])


def test_results_describe_the_columns_in_the_words_of_the_program() -> None:
    document = text_of("docs/results.md")
    assert refresh.with_columns(document) == document


def test_results_explain_every_status_and_verdict() -> None:
    told = set(quoted(prose(text_of("docs/results.md"))))
    assert told >= {QUANTIFIED, ABOVE, BELOW, CLOSED, SHORT, OVER}


def test_findings_explain_the_kinds_in_the_words_of_their_pages() -> None:
    document = text_of("docs/findings.md")
    assert refresh.with_kinds(document) == document


@pytest.mark.parametrize("severity", ["stop", "warn", "note"])
def test_findings_explain_every_kind_under_its_severity(severity: str) -> None:
    document = text_of("docs/findings.md")
    titles = {"stop": "Faults", "warn": "Warnings", "note": "Notes"}
    told = re.findall(r"^### (\S+)$", section(document, titles[severity]), re.MULTILINE)
    assert sorted(told) == sorted(kind for kind, (rank, _) in KINDS.items() if rank == severity)


def test_findings_say_what_each_kind_means_and_what_to_do() -> None:
    document = text_of("docs/findings.md")
    for kind in KINDS:
        told = section(document, kind)
        assert "**What to do.**" in told, kind
        assert len(told.partition("**What to do.**")[0].split()) > 5, kind
