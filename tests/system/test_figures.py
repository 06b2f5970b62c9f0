"""`coulombook figures`: what it writes, what it refuses, and that it never harms what is there."""

from __future__ import annotations

import csv
import hashlib
import json
import re
import shutil
import xml.etree.ElementTree as ET
from collections.abc import Iterator
from pathlib import Path

import pytest
from tests.system.test_surface import RATES, scan, spectrum, write_day

import coulombook
from coulombook.cli import main
from coulombook.figures import FORMATS, KINDS, data_of, drawings_of, rendered
from coulombook.report.tables import original_text

ROOT = Path(__file__).parents[2]
EXAMPLE = ROOT / "example_experiments" / "2043-06-02-gas-diffusion"
QUICK = ["--only", "closure", "--only", "selectivity", "--format", "svg"]


@pytest.fixture(scope="module")
def day(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Path]:
    folder = tmp_path_factory.mktemp("figures") / "day"
    shutil.copytree(EXAMPLE, folder)
    shutil.copytree(ROOT / "calibrations", folder / "calibrations")
    before = hashes(folder)
    yield folder
    # none of the day's own files was touched by any test
    assert {path: one for path, one in hashes(folder).items() if not path.startswith("figures/")} == before


@pytest.fixture
def out(tmp_path: Path) -> Path:
    return tmp_path / "figures"


def hashes(folder: Path) -> dict[str, str]:
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


def without_time(folder: Path) -> dict[str, str]:
    """Hashes of the figures; of the manifest everything but the time."""
    found = hashes(folder)
    manifest = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    del manifest["created"]
    return found | {"manifest.json": json.dumps(manifest)}


def test_every_figure_is_written_with_its_table_and_its_caption(
    day: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["figures", str(day), "--format", "svg,pdf"]) == 0
    folder = day / "figures"
    drawings = drawings_of(coulombook.tally(day))
    names = {path.name for path in folder.iterdir()}
    assert names == {
        *(f"{one.name}.{ending}" for one in drawings for ending in ("svg", "pdf", "csv")),
        "captions.txt",
        "manifest.json",
    }
    assert f"{len(drawings)} figures as svg, pdf, each with its table" in capsys.readouterr().out
    captions = (folder / "captions.txt").read_text(encoding="utf-8")
    assert all(f"{one.name}\n    {one.title}. {one.caption}" in captions for one in drawings)


def test_a_table_beside_a_figure_is_what_the_figure_draws(day: Path, out: Path) -> None:
    assert main(["figures", str(day), "--out", str(out), "--only", "fe", "--format", "svg"]) == 0
    table = data_of("fe_against_potential", coulombook.tally(day), "copper on carbon paper")
    with open(out / "fe-copper-on-carbon-paper.csv", newline="", encoding="utf-8") as stream:
        head, *rows = list(csv.reader(stream))
    assert tuple(head) == table.heads
    for cells, row in zip(rows, table.rows, strict=True):
        for text, cell in zip(cells, row, strict=True):
            if isinstance(cell, float):
                assert float(text) == cell
            else:
                assert original_text(text) == ("" if cell is None else str(cell))
    svg = ET.parse(out / "fe-copper-on-carbon-paper.svg")
    ids = {one.get("id") for one in svg.iter()}
    assert {cells[head.index("mark")] for cells in rows} <= ids


def test_figures_of_the_same_day_are_the_same_to_the_byte(day: Path, tmp_path: Path) -> None:
    options = ["--only", "fe", "--only", "closure", "--format", "svg,pdf,png"]
    for name in ("one", "other"):
        assert main(["figures", str(day), "--out", str(tmp_path / name), *options]) == 0
    assert without_time(tmp_path / "one") == without_time(tmp_path / "other")


@pytest.mark.parametrize(("asked", "points"), [("85mm", 240.94), ("17.8 cm", 504.57), ("3.5in", 252.0)])
def test_the_width_asked_for_is_that_of_the_sheet(day: Path, out: Path, asked: str, points: float) -> None:
    assert main(["figures", str(day), "--out", str(out), "--width", asked, *QUICK]) == 0
    width = ET.parse(out / "closure.svg").getroot().get("width")
    assert width is not None
    # 72 points to the inch of 25.4 mm
    assert float(width.removesuffix("pt")) == pytest.approx(points, abs=0.01)


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (["--width", "85"], "takes a width with its unit, such as 85mm, 8.5cm or 3.35in, not '85'"),
        (["--width", "wide"], "takes a width with its unit"),
        (["--width", "-85mm"], "takes a width from 40 mm to 400 mm, not '-85mm'"),
        (["--width=nanmm"], "takes a width from 40 mm to 400 mm"),
        (["--width", "1e9in"], "takes a width from 40 mm to 400 mm"),
        (["--width", "3 furlongs"], "takes a width with its unit"),
        (["--format", "svg,bmp"], "takes svg, pdf, png, parted by commas, not 'bmp'"),
        (["--format", ""], "takes svg, pdf, png"),
        (["--only", "closre"], "there is no figure 'closre'; did you mean 'closure'?"),
        (["--only", "everything"], "there is no figure 'everything'; known: fe, partial-currents, "),
        (["--only", "spectrum"], "the day has nothing to draw for spectrum; nothing was written"),
        (["--onyl", "fe"], "unknown option '--onyl'; did you mean '--only'?"),
    ],
)
def test_a_wrong_call_is_refused_before_anything_is_written(
    day: Path, out: Path, capsys: pytest.CaptureFixture[str], options: list[str], said: str
) -> None:
    if options[0] == "--width" and options[1].startswith("-"):
        options = [f"--width={options[1]}"]
    assert main(["figures", str(day), "--out", str(out), *options]) == 2
    assert said in " ".join(capsys.readouterr().err.split())
    assert not out.exists()


def test_a_folder_of_figures_is_replaced_as_a_whole(day: Path, out: Path) -> None:
    assert main(["figures", str(day), "--out", str(out), *QUICK]) == 0
    assert main(["figures", str(day), "--out", str(out), "--only", "budget", "--format", "png"]) == 0
    assert {path.name for path in out.iterdir()} == {
        "budget.png",
        "budget.csv",
        "captions.txt",
        "manifest.json",
    }


def test_a_folder_with_strangers_is_left_alone(
    day: Path, out: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["figures", str(day), "--out", str(out), *QUICK]) == 0
    (out / "my drawing.ai").write_text("hours of work")
    before = hashes(out)
    assert main(["figures", str(day), "--out", str(out), *QUICK]) == 2
    assert "'my drawing.ai', which coulombook did not write" in capsys.readouterr().err
    assert hashes(out) == before


def test_results_and_figures_never_take_each_others_place(
    day: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    results, out = tmp_path / "results", tmp_path / "figures"
    assert main(["tally", str(day), "--out", str(results), "--tables-only", "--quiet"]) == 0
    assert main(["figures", str(day), "--out", str(out), *QUICK]) == 0
    before = hashes(tmp_path)
    assert main(["figures", str(day), "--out", str(results), *QUICK]) == 2
    assert f"'{results}' holds results, not figures" in capsys.readouterr().err
    assert main(["tally", str(day), "--out", str(out), "--tables-only", "--quiet"]) == 2
    assert f"'{out}' holds figures, not results" in capsys.readouterr().err
    assert hashes(tmp_path) == before


def test_an_error_while_writing_leaves_the_old_figures_whole(
    day: Path, out: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    import os

    assert main(["figures", str(day), "--out", str(out), *QUICK]) == 0
    before = hashes(out)
    calls = []

    def full(handle: int) -> None:
        calls.append(handle)
        if len(calls) > 2:
            raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    assert main(["figures", str(day), "--out", str(out), "--only", "fe", "--format", "svg"]) == 2
    assert "the figures cannot be written" in capsys.readouterr().err
    assert hashes(out) == before
    assert [path.name for path in out.parent.iterdir()] == ["figures"]


def test_figures_in_a_day_folder_are_no_part_of_the_day(day: Path) -> None:
    before = coulombook.tally(day)
    assert main(["figures", str(day), *QUICK]) == 0
    after = coulombook.tally(day)
    assert [one.path for one in after.inputs] == [one.path for one in before.inputs]
    assert after.findings == before.findings


def test_names_from_files_are_shown_as_they_are(tmp_path: Path) -> None:
    folder = tmp_path / "day"
    shutil.copytree(ROOT / "example_experiments" / "2043-05-18-mesh-foil-foam", folder)
    name = r"$\frac{1}{0}$ <script>alert(1)</script>"
    table = folder / "runs.csv"
    text = table.read_text(encoding="utf-8")
    assert "silver foam" in text
    table.write_text(text.replace("silver foam", name), encoding="utf-8")
    calibrations = ["--calibrations", str(ROOT / "calibrations")]
    assert main(["figures", str(folder), *calibrations, "--only", "fe", "--only", "selectivity"]) == 0
    files = sorted(path.name for path in (folder / "figures").glob("fe-*.svg"))
    assert files == [
        "fe-annealed-copper-mesh.svg",
        "fe-frac-1-0-script-alert-1-script.svg",
        "fe-polished-copper-foil.svg",
    ]
    svg = (folder / "figures" / "selectivity.svg").read_text(encoding="utf-8")
    assert r"$\frac{1}{0}$ &lt;script&gt;ale..." in svg
    assert "<script" not in svg


def test_spectra_are_drawn_with_their_circuit(tmp_path: Path) -> None:
    tables = {"spectra.csv": "electrode,file\nm1,spectra/a.csv\n", "spectra/a.csv": spectrum(8.0)}
    scans = {("m1", ""): [scan(1e-3, rate) for rate in RATES]}
    book = coulombook.tally(write_day(tmp_path / "day", scans, tables=tables))
    table = data_of("spectrum", book, "spectra/a.csv")
    with open(tmp_path / "day" / "spectra" / "a.csv", newline="", encoding="utf-8") as stream:
        rows = list(csv.DictReader(stream))
    measured = [row for row in table.records() if row["what"] == "measured"]
    for row, written in zip(measured, rows, strict=True):
        assert row["Zre / ohm"] == float(written["Zre / ohm"])
        assert row["-Zim / ohm"] == -float(written["Zim / ohm"])
    # without noise the circuit goes through every point: it starts at 8 ohm and ends near 208 ohm
    fitted = [row for row in table.records() if row["what"] == "fitted"]
    assert fitted[0]["Zre / ohm"] == pytest.approx(measured[0]["Zre / ohm"], rel=1e-6)
    assert fitted[-1]["-Zim / ohm"] == pytest.approx(measured[-1]["-Zim / ohm"], rel=1e-6)
    (drawing,) = [one for one in drawings_of(book) if one.kind == "spectrum"]
    axes = drawing.draw(None, 85.0)
    assert axes.get_aspect() == 1.0


def test_the_help_names_every_kind_of_figure(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["figures", "--help"]) == 0
    told = capsys.readouterr().out
    assert all(re.search(rf"^  {kind}  +\S", told, re.MULTILINE) for kind in KINDS)


def test_the_command_offers_every_format_there_is() -> None:
    from coulombook.cli.commands.figures import FORMATS as OFFERED

    assert OFFERED == FORMATS


def test_the_picture_of_the_document_says_what_the_example_day_gives() -> None:
    book = coulombook.tally(
        ROOT / "example_experiments" / "2043-05-18-mesh-foil-foam", calibrations=[ROOT / "calibrations"]
    )
    (one,) = [each for each in drawings_of(book, frozenset({"fe"})) if each.name == "fe-annealed-copper-mesh"]
    sheet = one.draw(None, 85.0).get_figure(root=True)
    assert sheet is not None
    shown = ET.parse(ROOT / "docs" / "images" / f"{one.name}.svg").getroot()
    drawn = ET.fromstring(rendered(sheet, "svg", title=one.title, description=one.caption))
    # texts and ids, not coordinates, which another version of a library may round otherwise
    for told in (
        lambda each: each.text if each.tag.endswith("text") else None,
        lambda each: mark_of(each.get("id")),
    ):
        assert [told(each) for each in shown.iter()] == [told(each) for each in drawn.iter()]


def mark_of(name: str | None) -> str | None:
    return name if name and name.startswith("fe") and ":" in name else None
