"""Logs, curves, scans and spectra: drawn as they were measured, with what was taken from them."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.patches import Patch
from tests.unit.figures.test_results import marks

import coulombook
from coulombook import figures
from coulombook.book import Book
from coulombook.figures import data_of, drawings_of

ROOT = Path(__file__).parents[3]
MESH_DAY = ROOT / "example_experiments" / "2043-05-18-mesh-foil-foam"
GAS_DAY = ROOT / "example_experiments" / "2043-06-02-gas-diffusion"


@pytest.fixture(scope="module")
def mesh() -> Book:
    return coulombook.tally(MESH_DAY, calibrations=[ROOT / "calibrations"])


@pytest.fixture(scope="module")
def gas() -> Book:
    return coulombook.tally(GAS_DAY, calibrations=[ROOT / "calibrations"])


def collection(axes: Axes, gid: str) -> np.ndarray:
    """All vertices of the collection or patch with an id."""
    (found,) = [one for one in [*axes.collections, *axes.patches] if one.get_gid() == gid]
    if isinstance(found, LineCollection):
        return np.concatenate(found.get_segments())
    if isinstance(found, Patch):
        return np.asarray(found.get_path().transformed(found.get_patch_transform()).vertices)
    return np.concatenate([path.vertices for path in found.get_paths()])


def log(run: str) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Time, potential and current of a log of the first example day, read by nothing of ours. [s], [V], [mA]"""
    lines = (MESH_DAY / "traces" / f"{run}.csv").read_bytes().decode("latin-1").splitlines()
    start = lines.index("t / s;E / V;I / mA") + 1
    rows = [[float(cell.replace(",", ".")) for cell in line.split(";")] for line in lines[start:] if line]
    time, potential, current = np.array(rows).T
    return time, potential, current


def test_every_peak_of_a_log_is_within_what_is_drawn(mesh: Book) -> None:
    axes = figures.trace(mesh, "m1-3")
    time, potential, current = log("m1-3")
    below = axes.figure.axes[1]
    for where, gid, values in ((axes, "trace:m1-3:I", current), (below, "trace:m1-3:E", potential)):
        drawn = collection(where, gid)
        assert drawn[:, 1].min() == pytest.approx(values.min(), rel=1e-9)
        assert drawn[:, 1].max() == pytest.approx(values.max(), rel=1e-9)
        assert drawn[:, 0].min() == time[0]
        assert drawn[:, 0].max() == pytest.approx(time[-1], abs=2.0)  # where the last stretch begins


def test_injections_and_what_they_are_averaged_over_stand_in_a_log(mesh: Book) -> None:
    axes = figures.trace(mesh, "m1-3")
    rows = [row for row in mesh.tables["injections"].records() if row["run"] == "m1-3"]
    moments = {str(row["injection"]): row["time / s"] for row in rows}
    assert len(moments) == 4
    points = marks(axes)
    for name, moment in moments.items():
        assert set(np.atleast_1d(points[f"trace:m1-3:{name}"].get_xdata())) == {moment}
        window = collection(axes, f"trace:m1-3:{name}:window")[:, 0]
        # day.toml: the current is averaged over 120 s, a dead time of 25 s before the injection
        assert (window.min(), window.max()) == (float(str(moment)) - 145.0, float(str(moment)) - 25.0)
    table = data_of("trace", mesh, "m1-3")
    (run,) = [row for row in table.records() if row["what"] == "window"]
    assert set(collection(axes, "trace:m1-3:window")[:, 0]) == {run["time / s"], run["until / s"]}


def test_an_injection_that_a_headspace_remembers_has_no_window(gas: Book) -> None:
    what = set(data_of("trace", gas, "p1-50").column("what"))
    assert "injection" in what
    assert "averaged" not in what


def test_axes_of_the_reader_get_the_current_alone(mesh: Book) -> None:
    from matplotlib.figure import Figure

    mine = Figure().add_subplot()
    assert figures.trace(mesh, "m1-3", mine) is mine
    assert len(mine.figure.axes) == 1


def test_a_curve_shows_each_standard_and_its_residual(mesh: Book) -> None:
    axes = figures.curve_fit(mesh, "ethylene@FID")
    assert mesh.settled is not None
    (used,) = [one for one in mesh.settled.plan.curves.used if one.name == "ethylene@FID"]
    above, below = marks(axes), marks(axes.figure.axes[1])
    assert used.curve is not None
    fitted = np.polynomial.Polynomial(used.curve.coefficients)(used.standards.x)
    for place, (x, y, at) in enumerate(zip(used.standards.x, used.standards.y, fitted, strict=True), start=1):
        gid = f"curve:ethylene%40FID:{place}"
        assert above[gid].get_data()[1][0] == y  # type: ignore[index] # a list of one
        assert above[gid].get_data()[0][0] == pytest.approx(1e6 * x)  # type: ignore[index]
        # over more than a factor of 50 the axes are logarithmic and the residuals relative
        assert below[f"{gid}:residual"].get_data()[1][0] == pytest.approx(100.0 * (y / at - 1.0))  # type: ignore[index]
    assert axes.get_xscale() == axes.get_yscale() == "log"


def test_residuals_stand_alone_where_they_are_asked_for(mesh: Book) -> None:
    axes = figures.curve_residuals(mesh, "ethylene@FID")
    assert len(axes.figure.axes) == 1
    assert axes.get_ylabel() == "residual / %"


def test_the_line_through_the_charging_currents_has_the_capacitance_of_the_table(mesh: Book) -> None:
    axes = figures.capacitance(mesh, "m1")
    points = marks(axes)
    (x0, x1), (y0, y1) = points["capacitance:m1:line"].get_data()
    (row,) = [one for one in mesh.tables["surface"].records() if one["electrode"] == "m1"]
    assert (y1 - y0) / (x1 - x0) * 1e3 == pytest.approx(row["capacitance / mF"])
    assert mesh.settled is not None
    rates = sorted(
        1e3 * one.scan_rate_volt_per_second for one in mesh.settled.plan.day.scans if one.electrode == "m1"
    )
    drawn = [points[f"capacitance:m1:{place}"].get_xdata()[0] for place in range(1, len(rates) + 1)]  # type: ignore[index]
    assert drawn == pytest.approx(rates)


def test_shares_of_a_budget_are_those_of_the_table_and_add_up_to_all(mesh: Book) -> None:
    table = data_of("budget", mesh, "m1-3")
    drawn = {(row["source"], row["shared"]): row["share / %"] for row in table.records() if row["shared"]}
    whole = {
        (row["source"], row["shared"]): row["share / %"]
        for row in mesh.tables["budget"].records()
        if row["run"] == "m1-3" and row["output"] == "total FE"
    }
    assert len(drawn) > 4
    assert drawn == pytest.approx({key: whole[key] for key in drawn})
    assert all(float(str(share)) < 1.0 for key, share in whole.items() if key not in drawn)
    assert sum(float(str(one)) for one in table.column("share / %")) == pytest.approx(100.0)
    axes = figures.budget(mesh, "m1-3")
    widths = [patch.get_width() for patch in axes.patches]
    assert widths == pytest.approx([float(str(one)) for one in table.column("share / %")])


def test_levels_of_several_runs_have_the_total_that_their_runs_have_in_the_mean(mesh: Book) -> None:
    table = data_of("fe_against_potential", mesh, "silver foam")
    totals = {row["level"]: row for row in table.records() if row["what"] == "total"}
    assert len(totals) == 5
    for level, row in totals.items():
        runs = [
            one
            for one in mesh.tables["summary"].records()
            if one["catalyst"] == "silver foam" and one["level"] == level
        ]
        assert len(runs) == 2
        assert row["FE / %"] == pytest.approx(np.mean([float(str(one["total FE / %"])) for one in runs]))
        # what the runs share does not average out: no less than the shared flow meter's 1 % of the day, and no more
        # than a single run's with half the difference between the two
        u, single = float(str(row["u(FE) / %"])), max(float(str(one["u(total FE) / %"])) for one in runs)
        half = abs(float(str(runs[0]["total FE / %"])) - float(str(runs[1]["total FE / %"]))) / 2.0
        assert 1.0 < u <= np.hypot(single, half)


def test_every_figure_of_the_examples_has_data_a_caption_and_its_marks(mesh: Book, gas: Book) -> None:
    for book in (mesh, gas):
        drawings = drawings_of(book)
        assert {one.kind for one in drawings} == set(figures.KINDS) - {"spectrum"}
        assert all(len(one.data) and one.caption.endswith(".") and one.title for one in drawings)
        one = next(each for each in drawings if each.kind == "trace")
        sheet = one.draw(None, 85.0).figure
        svg = figures.rendered(sheet, "svg").decode("utf-8")  # type: ignore[arg-type] # a whole sheet
        for mark in {str(each) for each in one.data.column("mark")}:
            # the log itself is two envelopes
            ids = [mark] if mark.count(":") > 1 else [f"{mark}:I", f"{mark}:E"]
            assert all(f'id="{each}"' in svg for each in ids)


@pytest.mark.parametrize(
    ("figure", "name"),
    [("trace", "m9"), ("curve_fit", "x@FID"), ("capacitance", "m9"), ("spectrum", "z.csv"), ("budget", "m9")],
)
def test_what_a_day_does_not_have_is_told(mesh: Book, figure: str, name: str) -> None:
    with pytest.raises(ValueError, match=f"there is no .* '{name}'; known: "):
        data_of(figure, mesh, name)
