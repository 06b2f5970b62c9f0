"""A figure of one curve as a file; what `coulombook figures` writes is tested in tests/system."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pytest
from tests.unit.library.shelves import gas_rows, write_calibration

from coulombook.library.shelf import Entry, open_library
from coulombook.report.figure_files import write_curve, write_file


@pytest.fixture
def entry(tmp_path: Path) -> Entry:
    write_calibration(tmp_path / "shelf", "gc & <b>", gas_rows())
    (found,) = open_library([tmp_path / "shelf"]).entries
    return found


@pytest.fixture
def out(tmp_path: Path) -> Path:
    folder = tmp_path / "out"
    folder.mkdir()
    return folder


@pytest.mark.parametrize(("ending", "begins"), [(".svg", b"<?xml"), (".png", b"\x89PNG"), (".PDF", b"%PDF")])
def test_a_figure_is_written_whole_in_the_format_of_its_name(
    entry: Entry, out: Path, ending: str, begins: bytes
) -> None:
    path = out / f"curve{ending}"
    write_curve(entry, path)
    assert path.read_bytes().startswith(begins)
    assert [one.name for one in out.iterdir()] == [path.name]


def test_letters_of_a_figure_stay_letters_and_are_taken_for_no_markup(entry: Entry, out: Path) -> None:
    write_curve(entry, out / "curve.svg")
    text = (out / "curve.svg").read_text(encoding="utf-8")
    assert "ethylene@FID, gc &amp; &lt;b&gt;</text>" in text
    for word in (
        "mole fraction / ppm",
        "peak area",
        "residual / %",
        "standard",
        "curve",
        "95 % band of a reading",
    ):
        assert f">{word}</text>" in text
    assert not re.search(r"href=\"(?!#)", text)


@pytest.mark.parametrize("ending", ["svg", "png", "pdf"])
def test_the_same_curve_gives_the_same_figure(entry: Entry, out: Path, ending: str) -> None:
    one, other = out / f"one.{ending}", out / f"other.{ending}"
    for path in (one, other):
        write_curve(entry, path)
    assert one.read_bytes() == other.read_bytes()


def test_letters_of_a_pdf_are_embedded(entry: Entry, out: Path) -> None:
    write_curve(entry, out / "c.pdf")
    content = (out / "c.pdf").read_bytes()
    assert b"/FontFile2" in content  # TrueType
    assert b"/Type3" not in content


def test_a_figure_that_cannot_be_written_leaves_nothing(entry: Entry, out: Path) -> None:
    with pytest.raises(ValueError, match=r"written as \.svg, \.png, \.pdf"):
        write_curve(entry, out / "c.bmp")
    (out / "c.svg").mkdir()
    with pytest.raises(OSError, match="directory"):
        write_curve(entry, out / "c.svg")
    assert [one.name for one in out.iterdir()] == ["c.svg"]


def test_a_file_that_is_there_is_replaced_in_one_step_and_keeps_the_usual_rights(out: Path) -> None:
    (out / "c.svg").write_text("old")
    write_file(b"new", out / "c.svg")
    (out / "usual").write_text("")
    assert (out / "c.svg").read_bytes() == b"new"
    assert (out / "c.svg").stat().st_mode == (out / "usual").stat().st_mode


def test_settings_of_the_reader_change_no_figure(entry: Entry, out: Path) -> None:
    import matplotlib as mpl

    write_curve(entry, out / "one.svg")
    with mpl.rc_context({"text.usetex": True, "axes.facecolor": "red", "svg.fonttype": "path"}):
        write_curve(entry, out / "other.svg")
        assert mpl.rcParams["axes.facecolor"] == "red"
    assert (out / "one.svg").read_bytes() == (out / "other.svg").read_bytes()


def test_the_files_of_the_command_that_lists_curves_load_no_matplotlib() -> None:
    code = (
        "import sys, coulombook.report.curves_view, coulombook.report.figure_files\n"
        "assert not [one for one in sys.modules if one.startswith('matplotlib')]"
    )
    subprocess.run([sys.executable, "-c", code], check=True, timeout=60)
