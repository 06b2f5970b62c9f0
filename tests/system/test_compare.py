"""`coulombook compare` and `coulombook.compare_days`: whole days compared, what they share, and what is written."""

from __future__ import annotations

import csv
import re
import shutil
import subprocess
import sys
from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pytest
from tests.faults.day import swap, write_day
from tests.published.test_hori_1994 import _hold, _printed, _tally
from tests.system.test_docs import quoted, section, table, text_of

import coulombook
from coulombook.cli import DONE, FAULTS, WRONG_CALL, main
from coulombook.comparison.order import Comparison, ComparisonError
from coulombook.comparison.quantities import Quantity
from coulombook.comparison.runs import ComparedRuns, compared_runs
from coulombook.comparison.tables import TABLES
from coulombook.report.results import write_results
from coulombook.uncertainty.linearised import Linearised, covariance, sparse_map

ROOT = Path(__file__).parents[2]
DAYS = ROOT / "example_experiments"
MESH, DIFFUSION = "2043-05-18-mesh-foil-foam", "2043-06-02-gas-diffusion"
CALIBRATIONS = ROOT / "calibrations"


@pytest.fixture(autouse=True)
def _terminal_of_80_columns(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "80")


@pytest.fixture(scope="module")
def mesh() -> coulombook.Book:
    return coulombook.tally(DAYS / MESH, calibrations=[CALIBRATIONS])


@pytest.fixture(scope="module")
def diffusion() -> coulombook.Book:
    return coulombook.tally(DAYS / DIFFUSION, calibrations=[CALIBRATIONS])


@pytest.fixture(scope="module")
def compared(mesh: coulombook.Book) -> Comparison:
    return coulombook.compare_days([mesh])


def rows(found: Comparison, name: str, **wanted: str) -> list[dict[str, object]]:
    return [
        row
        for row in found.tables[name].records()
        if all(row[head] == value for head, value in wanted.items())
    ]


def words(text: str) -> str:
    return " ".join(text.split())


def another_day(folder: Path, name: str, *, edit: Sequence[tuple[str, str]] = ()) -> Path:
    """A copy of the example day with logs that are other files: each ends with one more empty line."""
    day = folder / name
    shutil.copytree(DAYS / MESH, day)
    for trace in (day / "traces").iterdir():
        trace.write_bytes(trace.read_bytes() + b"\n")
    text = (day / "day.toml").read_text(encoding="utf-8")
    for old, new in edit:
        assert old in text
        text = text.replace(old, new)
    (day / "day.toml").write_text(text, encoding="utf-8")
    return day


# --- one day ---


def test_values_at_a_level_are_the_means_of_the_summary(mesh: coulombook.Book, compared: Comparison) -> None:
    mean = mesh.summary.groupby(["catalyst", "level"])["C2+ FE / %"].mean()
    found = rows(compared, "series", quantity="C2+ FE / %", at="level")
    assert len(found) == 15
    for row in found:
        assert row["value"] == pytest.approx(mean[row["catalyst"], row["point"]], rel=1e-12)


def test_values_at_a_common_potential_lie_between_the_levels_beside_it(compared: Comparison) -> None:
    for catalyst in ("annealed copper mesh", "polished copper foil"):
        levels = rows(compared, "series", quantity="C2+ FE / %", at="level", catalyst=catalyst)
        points = sorted((float(str(row["E vs RHE / V"])), float(str(row["value"]))) for row in levels)
        for row in rows(compared, "series", quantity="C2+ FE / %", at="potential", catalyst=catalyst):
            volt = float(str(row["E vs RHE / V"]))
            right = next(place for place, point in enumerate(points) if point[0] >= volt)
            beside = sorted(value for _, value in points[right - 1 : right + 1])
            assert beside[0] <= float(str(row["value"])) <= beside[1]


def test_the_rough_mesh_leads_per_geometric_area_and_follows_per_real_area(compared: Comparison) -> None:
    # the invented mesh is 57 times rougher than flat, the foil 1.1 times
    for row in rows(compared, "rankings", quantity="C2+ j / mA cm^-2", basis="geometric", at="potential"):
        assert str(row["ranking"]).startswith("annealed copper mesh > polished copper foil")
        assert "annealed copper mesh > polished copper foil" in str(row["turned round on the other area"])
    for row in rows(compared, "rankings", quantity="C2+ j / mA cm^-2", basis="real", at="potential"):
        assert str(row["ranking"]).startswith("polished copper foil > annealed copper mesh")
    assert "ahead of polished copper foil per geometric area and behind it per real area" in compared.verdict


def test_the_run_that_lost_gas_makes_its_level_scatter_apart(compared: Comparison) -> None:
    found = [one for one in compared.findings if one.kind == "scatter-apart" and "C2+ FE" in one.text]
    assert [one.where for one in found] == ["annealed copper mesh at -1.72"]
    counted = next(one for one in compared.findings if one.kind == "open-runs-compared")
    assert "run m2-4" in counted.where
    assert "This counts 2 runs whose balances do not close." in compared.verdict


def test_runs_that_do_not_close_are_left_out_on_request(mesh: coulombook.Book) -> None:
    found = coulombook.compare_days([mesh], closed_only=True)
    level = rows(
        found, "series", quantity="C2+ FE / %", at="level", point="-1.72", catalyst="annealed copper mesh"
    )
    closed = mesh.summary.set_index("run").loc["m1-4", "C2+ FE / %"]
    assert (level[0]["runs"], level[0]["value"]) == (1, pytest.approx(closed))
    assert "not close" not in found.verdict
    assert any(one.kind == "left-out" and "m2-4" in one.where for one in found.findings)


def test_hydrogen_is_ranked_lowest_first(compared: Comparison) -> None:
    for row in rows(compared, "rankings", quantity="H2 FE / %", at="level"):
        assert str(row["ranking"]).startswith("silver foam")


def test_welch_and_effect_of_a_level_are_those_of_its_replicates(
    mesh: coulombook.Book, compared: Comparison
) -> None:
    from scipy import stats

    runs = mesh.summary[mesh.summary["level"] == "-1.6"].groupby("catalyst")["C2+ FE / %"]
    a, b = (runs.get_group(name).to_numpy() for name in ("annealed copper mesh", "polished copper foil"))
    reference = stats.ttest_ind(a, b, equal_var=False)
    row = rows(
        compared, "pairs", quantity="C2+ FE / %", at="level", point="-1.6", catalyst="annealed copper mesh"
    )[0]
    assert row["other"] == "polished copper foil"
    assert row["Welch t"] == pytest.approx(reference.statistic)
    assert row["Welch p"] == pytest.approx(reference.pvalue)
    # Hedges: difference over the pooled deviation, times 1 - 3/(4 x 2 - 1)
    pooled = np.sqrt((a.var(ddof=1) + b.var(ddof=1)) / 2)
    assert row["Hedges g"] == pytest.approx((a.mean() - b.mean()) / pooled * (1 - 3 / 7))
    groups = [group.to_numpy() for _, group in runs]
    ranking = rows(compared, "rankings", quantity="C2+ FE / %", at="level", point="-1.6")[0]
    assert ranking["analysis of variance p"] == pytest.approx(stats.f_oneway(*groups).pvalue, rel=1e-6)


def test_a_ratio_does_not_grow_with_the_uncertainty_of_the_flow_meter(
    mesh: coulombook.Book, tmp_path: Path
) -> None:
    loose = another_day(
        tmp_path,
        "loose",
        edit=[
            ('quantity = "outlet flow"\nstandard = "1.5 %"', 'quantity = "outlet flow"\nstandard = "15 %"')
        ],
    )
    found = [
        rows(
            coulombook.compare_days([day], calibrations=[CALIBRATIONS], products=["ethylene"]),
            "pairs",
            quantity="ethylene FE / %",
            at="level",
        )
        for day in (mesh, loose)
    ]
    assert len(found[0]) == 5
    for narrow, wide in zip(*found, strict=True):
        assert wide["ratio"] == pytest.approx(narrow["ratio"])
        for end in ("ratio low", "ratio high"):
            # ten times the flow's error moves an end by no more than 0.1 %: the scatter of the injections of a run,
            # which is held against what the flow explains of it, is all that feels it
            assert wide[end] == pytest.approx(narrow[end], rel=1e-3)
        assert float(str(wide["u(difference)"])) > float(str(narrow["u(difference)"]))


def test_common_potentials_may_be_given_and_are_never_reached_by_extrapolation(mesh: coulombook.Book) -> None:
    found = coulombook.compare_days([mesh], potentials=[-1.1, -3.0])
    there = rows(found, "series", quantity="C2+ FE / %", at="potential")
    assert [row["catalyst"] for row in there] == ["annealed copper mesh", "polished copper foil"]
    outside = [one for one in found.findings if one.kind == "not-compared" and "-3.00 V" in one.text]
    assert outside[0].where == "annealed copper mesh; polished copper foil; silver foam"


def test_roughness_and_selectivity_are_correlated_by_ranks_over_all_electrodes(
    mesh: coulombook.Book, compared: Comparison
) -> None:
    from scipy import stats

    summary = mesh.summary[mesh.summary["level"] == "-1.6"]
    reference = stats.spearmanr(summary["roughness factor"], summary["C2+/C1"])
    row = rows(compared, "correlations", quantity="C2+/C1", at="level", point="-1.6")[0]
    assert (row["electrodes"], row["catalysts"]) == (6, 3)
    assert row["Spearman rho"] == pytest.approx(reference.statistic)
    # three catalysts are too few, however many electrodes of each there are
    assert row["verdict"] == "too few"
    shown = rows(compared, "electrodes", quantity="C2+/C1", at="level", point="-1.6")
    assert [row["electrode"] for row in shown] == ["m1", "m2", "f1", "f2", "s1", "s2"]
    assert shown[0]["roughness factor"] == pytest.approx(
        summary.set_index("electrode").loc["m1", "roughness factor"]
    )


def test_four_electrodes_are_too_few_for_any_word_about_roughness(mesh: coulombook.Book) -> None:
    found = coulombook.compare_days([mesh], catalysts=["Annealed copper mesh", "polished copper foil"])
    assert {row["verdict"] for row in found.tables["correlations"].records()} == {"too few"}


def test_what_is_below_detection_is_not_known_to_be_nothing(tmp_path: Path) -> None:
    # one run just shows ethylene, the other just does not: nothing tells the two apart
    changes = {
        "runs.csv": swap(
            "run,catalyst", "run,level,catalyst", "a1,mesh", "a1,one,mesh", "a2,mesh,m1", "a2,one,foil,f1"
        ),
        "gas.csv": swap("C2H4,23\n", "C2H4,2.5\n", "C2H4,23.2\n", "C2H4,2.5\n", "C2H4,22.8\n", "C2H4,1.9\n"),
    }
    book = coulombook.tally(write_day(tmp_path, changes))
    assert book.settled is not None
    row = next(
        number
        for number, (run, name) in enumerate(
            zip(book.settled.plan.products.run, book.settled.plan.products.species, strict=True)
        )
        if (run, name) == (1, "ethylene")
    )
    limit = 100 * book.settled.detection.efficiency_limit[row]
    found = coulombook.compare_days([book], products=["C2+"], kinds=["FE", "C2+/C1"])
    foil = rows(found, "series", quantity="C2+ FE / %", catalyst="foil")[0]
    assert foil["value"] == 0.0
    # a rectangular distribution between nothing and the limit, about nothing: L/sqrt(3)
    assert foil["u(value)"] == pytest.approx(limit / 3**0.5)
    ratio = rows(found, "series", quantity="C2+/C1", catalyst="foil")[0]
    c1 = book.summary.set_index("run").loc["a2", "C1 FE / %"]
    assert ratio["u(value)"] == pytest.approx(limit / 3**0.5 / c1)
    pair = rows(found, "pairs", quantity="C2+ FE / %")[0]
    mesh = rows(found, "series", quantity="C2+ FE / %", catalyst="mesh")[0]
    assert float(str(mesh["value"])) > 3 * float(str(mesh["u(value)"])) > 0  # clear of zero, not of the foil
    assert pair["verdict"] == "cannot tell"


# --- published rows as series ---


def test_printed_rows_come_back_as_series() -> None:
    """Hori et al. 1994; see tests/published/hori_1994/SOURCE.md."""
    import tempfile

    printed = _printed("hori_1994")
    holds = [_hold(row["metal"], row, float(row["j / mA cm^-2"]), 6.8, 18.5) for row in printed]
    with tempfile.TemporaryDirectory() as folder:
        book = _tally(holds, Path(folder) / "hori")
    found = coulombook.compare_days([book])
    # C2+/C1 of a comparison is by charge, 39.0/44.0 = 0.886; by moles it would be 0.327, which the summary holds
    ratio = rows(found, "series", quantity="C2+/C1", at="level", catalyst="Cu")[0]["value"]
    assert ratio == pytest.approx(0.886, abs=0.0005)
    assert book.summary.set_index("run").loc["Cu", "C2+/C1 molar"] == pytest.approx(0.327, abs=0.0005)
    efficiency = rows(found, "series", quantity="C2+ FE / %", at="level")
    # ethylene, ethanol, n-propanol, ethane, allyl alcohol, acetaldehyde and propionaldehyde of each printed row
    names = (
        "ethylene",
        "ethanol",
        "n-propanol",
        "ethane",
        "allyl alcohol",
        "acetaldehyde",
        "propionaldehyde",
    )
    for row, value in zip(printed, efficiency, strict=True):
        assert value["catalyst"] == row["metal"]
        assert value["value"] == pytest.approx(sum(float(row[name]) for name in names), abs=1e-6)
    # one run of each metal: one level, nothing to interpolate, no replicates, and it is said
    assert {row["at"] for row in found.tables["series"].records()} == {"level"}
    assert {"no-replicates", "not-compared"} <= {one.kind for one in found.findings}
    assert found.verdict.startswith("Cu has the highest C2+ FE at every level compared (printed)")


def test_current_of_c2_products_is_their_share_of_the_current() -> None:
    """Common practice, no source: 68 % of 18.5 mA/cm2 is 12.6 mA/cm2 of C2+ current."""

    def number(value: float) -> Linearised:
        return Linearised(np.array([value]), sparse_map([], [], [], (1, 1)))

    runs = ComparedRuns(
        ("day",), ("r",), ("c",), (("day", "e"),), ("x",), ("closed",), number(-1.0), number(185.0), number(50.0),
        number(20.0), {"C2+": number(0.68)},
    )  # fmt: skip
    geometric = Quantity("C2+", "j", "geometric").of(runs).value[0]
    assert round(geometric, 1) == 12.6
    assert Quantity("C2+", "j", "real").of(runs).value[0] == pytest.approx(geometric / 50)
    assert Quantity("C2+", "FE").of(runs).value[0] == pytest.approx(68.0)


# --- several days ---


def _by_curve(book: coulombook.Book, run: str, product: str, curve: str) -> np.ndarray:
    """By how much one Faradaic efficiency of a day moves with each error of a curve."""
    assert book.settled is not None
    plan, inputs = book.settled.plan, book.settled.inputs
    row = next(
        place
        for place, name in enumerate(plan.products.species)
        if name == product and plan.runs[plan.products.run[place]].name == run
    )
    columns = [place for place, one in enumerate(inputs.sources) if one.name == f"curve {curve}"]
    efficiency = book.settled.outcome.faradaic_efficiency
    assert isinstance(efficiency, Linearised)
    return np.asarray(efficiency.jacobian[[row]].toarray())[0, columns]


@pytest.mark.parametrize(
    ("product", "curve"),
    [("ethylene", "ethylene@FID"), ("formate", "formate@CH 8.33"), ("methane", "methane@FID")],
)
def test_days_share_the_errors_of_their_curves_and_nothing_else(
    mesh: coulombook.Book, diffusion: coulombook.Book, product: str, curve: str
) -> None:
    runs = compared_runs([mesh, diffusion], [MESH, DIFFUSION])
    a, b = runs.run.index("m1-3"), runs.run.index("p1-100")
    # both days read the product by one curve of the same calibration; their flows, areas and standards are their own
    shared = _by_curve(mesh, "m1-3", product, curve) @ _by_curve(diffusion, "p1-100", product, curve)
    assert shared != 0.0
    assert covariance(runs.efficiency[product])[a, b] == pytest.approx(shared, rel=1e-9)
    assert covariance(runs.current_density_ampere_per_m2)[a, b] == 0.0


def test_days_share_a_specific_capacitance_of_the_same_source_and_no_other(
    mesh: coulombook.Book, tmp_path: Path
) -> None:
    declared = (
        "[[uncertainty]]",
        '[[uncertainty]]\nquantity = "specific_capacitance"\nstandard = "10 %"\nshared = "day"\n\n[[uncertainty]]',
    )
    books = []
    for name, value in (("one", "28 uF/cm^2"), ("two", "28 uF/cm^2"), ("three", "29 uF/cm^2")):
        day = tmp_path / name
        another_day(tmp_path, name, edit=[("28 uF/cm^2", value)])
        text = (day / "day.toml").read_text(encoding="utf-8").replace(*declared, 1)
        (day / "day.toml").write_text(text, encoding="utf-8")
        books.append(coulombook.tally(day, calibrations=[CALIBRATIONS]))
    same = covariance(compared_runs(books[:2], ["one", "two"]).roughness_factor)[0, 30]
    rough = float(mesh.summary["roughness factor"][0])
    # 10 % of either roughness factor, wholly in common
    assert same == pytest.approx((0.1 * rough) ** 2, rel=1e-6)
    assert covariance(compared_runs([books[0], books[2]], ["one", "three"]).roughness_factor)[0, 30] == 0.0


def test_days_with_other_standards_share_nothing_of_their_curves(
    mesh: coulombook.Book, tmp_path: Path
) -> None:
    other = tmp_path / "calibrations"
    shutil.copytree(CALIBRATIONS, other)
    standards = other / "gc-2043-04" / "standards.csv"
    lines = standards.read_text(encoding="utf-8").splitlines()
    changed = [
        re.sub(r"(\d)(\D*)$", lambda found: f"{(int(found[1]) + 1) % 10}{found[2]}", line) for line in lines
    ]
    standards.write_text("\n".join([lines[0], *changed[1:]]) + "\n", encoding="utf-8")
    day = another_day(tmp_path, "later")
    again = coulombook.tally(day, calibrations=[CALIBRATIONS])
    anew = coulombook.tally(day, calibrations=[other])
    a, b = 0, 30  # the first run of either day
    same, apart = (
        covariance(compared_runs([mesh, book], ["one", "two"]).efficiency["ethylene"])[a, b]
        for book in (again, anew)
    )
    assert same > 0
    assert apart == 0.0


def test_one_error_of_a_flow_meter_cancels_between_days_if_it_is_said_to_be_one(
    mesh: coulombook.Book, tmp_path: Path
) -> None:
    day = coulombook.tally(another_day(tmp_path, "later"), calibrations=[CALIBRATIONS])
    independent, one = (
        rows(
            coulombook.compare_days(
                [mesh, day], products=["ethylene"], kinds=["FE"], apart=True, one_error=shared
            ),
            "pairs",
            at="level",
            point="-1.6",
            catalyst=f"annealed copper mesh ({MESH})",
            other="annealed copper mesh (later)",
        )[0]
        for shared in ((), ("outlet flow",))
    )
    # the same readings twice: no difference, and no verdict
    assert independent["difference"] == pytest.approx(0.0, abs=1e-9)
    assert independent["verdict"] == "cannot tell"
    widths = [
        np.log(float(str(row["ratio high"])) / float(str(row["ratio low"]))) for row in (independent, one)
    ]
    assert widths[1] < widths[0]
    # two meters of 1.5 % each: sqrt(u1^2 - u0^2) of the logarithm is 1.5 % sqrt(2)
    us = [float(str(row["u(difference)"])) for row in (independent, one)]
    mean = rows(
        coulombook.compare_days([mesh], products=["ethylene"], kinds=["FE"]),
        "series",
        at="level",
        point="-1.6",
    )[0]["value"]
    assert np.sqrt(us[0] ** 2 - us[1] ** 2) / float(str(mean)) == pytest.approx(0.015 * np.sqrt(2), rel=1e-6)


def test_the_same_catalyst_of_two_days_is_pooled_and_its_runs_are_counted(
    mesh: coulombook.Book, tmp_path: Path
) -> None:
    day = coulombook.tally(another_day(tmp_path, "later"), calibrations=[CALIBRATIONS])
    found = coulombook.compare_days([mesh, day])
    row = rows(
        found, "series", quantity="C2+ FE / %", at="level", point="-1.6", catalyst="annealed copper mesh"
    )[0]
    assert (row["runs"], row["electrodes"]) == (4, 4)
    alone = rows(coulombook.compare_days([mesh]), "series", quantity="C2+ FE / %", at="level", point="-1.6")[
        0
    ]
    assert row["value"] == pytest.approx(alone["value"])
    assert float(str(row["u(value)"])) < float(str(alone["u(value)"]))


def test_days_of_other_levels_meet_at_common_potentials(
    mesh: coulombook.Book, diffusion: coulombook.Book
) -> None:
    found = coulombook.compare_days([mesh, diffusion])
    there = rows(found, "rankings", quantity="C2+ FE / %", at="potential")
    assert len(there) >= 3
    # the invented gas-diffusion copper makes most C2+ of all
    assert all(str(row["leaders"]) == "copper on carbon paper" for row in there)
    assert len({row["day"] for row in found.tables["electrodes"].records()}) == 2


def test_a_day_named_twice_is_refused_in_whatever_folder(
    mesh: coulombook.Book, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    copy = tmp_path / "copy"
    shutil.copytree(DAYS / MESH, copy)
    with pytest.raises(ComparisonError, match="are the same log"):
        coulombook.compare_days([mesh, copy], calibrations=[CALIBRATIONS])
    day = str(DAYS / MESH)
    assert main(["compare", day, day, "--calibrations", str(CALIBRATIONS)]) == WRONG_CALL
    assert "a run counted twice would be a replicate of itself" in capsys.readouterr().err


# --- the command ---


def run(capsys: pytest.CaptureFixture[str], *arguments: str) -> str:
    assert main(["compare", *arguments, "--calibrations", str(CALIBRATIONS)]) == DONE
    return capsys.readouterr().out


@pytest.mark.parametrize("days", [(MESH,), (DIFFUSION,), (MESH, DIFFUSION)])
def test_the_terminal_begins_with_the_verdict_and_fits_80_columns(
    days: tuple[str, ...], capsys: pytest.CaptureFixture[str]
) -> None:
    printed = run(capsys, *(str(DAYS / day) for day in days))
    assert max(map(len, printed.splitlines())) <= 80
    assert "has the highest C2+ FE at every potential compared" in words(printed.split("\n\n")[1])
    for title in ("C2+ FE / %", "C2+/C1 at levels", "H2 FE / %, lowest first", "by how much: C2+ FE / %"):
        assert title in printed
    assert "Spearman's rank correlation with the roughness factor" in words(printed)
    assert "Carbon monoxide poisons" in printed


def test_negative_potentials_are_a_value_of_at(capsys: pytest.CaptureFixture[str]) -> None:
    printed = run(capsys, str(DAYS / MESH), "--at", "-0.95,-1.05", "--product", "C2H4", "--quantity", "FE")
    assert re.search(r"^ +-0\.95 +\d", printed, re.MULTILINE)
    assert re.search(r"^ +-1\.05 +\d", printed, re.MULTILINE)
    assert "C2+/C1" not in printed
    assert "not a number" not in printed


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["--at", "here"], "takes potentials such as -0.95,-1.05, not 'here'"),
        (["--product", "xenon"], "no run reports 'xenon'; known: C2+, C1, H2"),
        (["--catalyst", "gold"], "no run has the catalyst 'gold'; known: annealed copper mesh"),
        (["--basis", "flat"], "unknown basis 'flat'"),
    ],
)
def test_what_cannot_be_compared_is_refused_in_words(
    arguments: list[str], said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["compare", str(DAYS / MESH), *arguments, "--calibrations", str(CALIBRATIONS)]) == WRONG_CALL
    assert said in words(capsys.readouterr().err)


def test_a_single_catalyst_is_shown_and_nothing_is_judged(capsys: pytest.CaptureFixture[str]) -> None:
    printed = run(capsys, str(DAYS / MESH), "--catalyst", "silver foam")
    assert "Nothing can be compared" in printed
    assert " > " not in printed.partition("told apart")[2].partition("cannot")[2]


def test_a_day_with_faults_is_not_compared(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    day = another_day(tmp_path, "broken", edit=[('shared = "day"', 'shared = "week"')])
    assert main(["compare", str(DAYS / MESH), str(day), "--calibrations", str(CALIBRATIONS)]) == FAULTS
    said = capsys.readouterr().err
    assert "week" in said
    assert "nothing was compared" in said


def test_tables_are_written_whole_with_the_documented_heads(
    tmp_path: Path, compared: Comparison, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "comparison"
    run(capsys, str(DAYS / MESH), "--out", str(out))
    assert {one.name for one in out.iterdir()} == {*(f"{name}.csv" for name in TABLES), "manifest.json"}
    for name, heads in TABLES.items():
        with (out / f"{name}.csv").open(encoding="utf-8", newline="") as handle:
            written = list(csv.reader(handle))
        assert tuple(written[0]) == heads
        assert len(written) - 1 == len(compared.tables[name])
    before = (out / "series.csv").read_bytes()
    run(capsys, str(DAYS / MESH), "--out", str(out))  # a comparison may be replaced
    assert (out / "series.csv").read_bytes() == before


def test_a_comparison_replaces_no_results_of_a_tally(
    mesh: coulombook.Book, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    results = tmp_path / "results"
    calibrations = ["--calibrations", str(CALIBRATIONS)]
    write_results(mesh, results, tables_only=True)
    kept = {one.name for one in results.iterdir()}
    assert main(["compare", str(DAYS / MESH), "--out", str(results), *calibrations]) == WRONG_CALL
    assert "holds results" in capsys.readouterr().err
    assert {one.name for one in results.iterdir()} == kept


def test_comparing_does_not_pay_for_the_slow_statistics_of_scipy() -> None:
    code = (
        "import sys, coulombook\n"
        f"coulombook.compare_days([{str(DAYS / MESH)!r}], calibrations=[{str(CALIBRATIONS)!r}])\n"
        "print('scipy.stats' in sys.modules, 'pandas' in sys.modules)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60
    )
    assert done.stdout.split() == ["False", "False"]


@pytest.mark.parametrize("name", TABLES)
def test_the_document_lists_every_column(name: str) -> None:
    listed = table(section(text_of("docs/how_to_compare.md"), f"{name}.csv"))
    assert [head for row in listed for head in quoted(row["column"])] == list(TABLES[name])
