"""Capacitance scans of a day through the whole tally: what counts, what is told, what is uncertain. Invented days."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np
import pytest
from tests.unit.cell.rc_circuit import Record, sweep

import coulombook
from coulombook.book import Book
from coulombook.cell.impedance import brug_capacitance, circuit_impedance, hsu_mansfeld_capacitance

RATES = (0.02, 0.04, 0.08, 0.16)


def scan(capacitance: float, rate: float, rc_second: float = 0.0, **more: float) -> Record:
    return sweep(capacitance, rc_second / capacitance, rate, per_sweep=100, **more)  # type: ignore[arg-type]


def write_day(
    folder: Path,
    sets: Mapping[tuple[str, str], Sequence[Record]],
    surface: str = 'specific_capacitance = "28 uF/cm^2"',
    *,
    tables: Mapping[str, str] | None = None,
    heads: str = "",
    cells: str = "",
    resistance: bool = True,
) -> Path:
    """A day with a run on each electrode; ``heads`` and ``cells`` add columns to scans."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "scans").mkdir()
    (folder / "traces").mkdir()
    (folder / "day.toml").write_text(
        f'[day]\n[reference]\npotential = "0.210 V"\n[surface]\n{surface}\n', encoding="utf-8"
    )
    electrodes = list(dict.fromkeys(electrode for electrode, _ in sets)) or ["m1", "m2"]
    runs = ["run,catalyst,electrode,electrode area / cm^2,pH" + (",resistance / ohm" if resistance else "")]
    for electrode in electrodes:
        runs.append(f"r-{electrode},mesh,{electrode},1.0,6.8" + (",10" if resistance else ""))
        (folder / "traces" / f"r-{electrode}.csv").write_text(
            "t / s,E / V,I / mA\n0,-1.5,-10\n1800,-1.5,-10\n3600,-1.5,-10\n", encoding="utf-8"
        )
    (folder / "runs.csv").write_text("\n".join(runs) + "\n", encoding="utf-8")
    rows = [f"electrode,file,scan rate / mV s^-1,electrode area / cm^2,purpose{heads}"]
    for (electrode, purpose), records in sets.items():
        for rate, record in zip(RATES, records, strict=False):
            name = f"scans/{electrode}-{purpose or 'only'}-{1000 * rate:g}.csv"
            rows.append(f"{electrode},{name},{1000 * rate:g},1.0,{purpose}{cells}")
            columns = np.stack(
                [record.time_second, record.potential_volt, 1e3 * record.current_ampere], axis=1
            )
            np.savetxt(
                folder / name,
                columns,
                "%.15g",
                ",",
                header="t / s,E / V,I / mA",
                comments="",
                encoding="utf-8",
            )
    if sets:
        (folder / "scans.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    for name, text in (tables or {}).items():
        (folder / name).parent.mkdir(exist_ok=True)
        (folder / name).write_text(text, encoding="utf-8")
    return folder


def kinds(book: Book, where: str = "") -> list[str]:
    return [one.kind for one in book.findings if where in one.where]


SCAN_KINDS = frozenset(
    {"scan-left-out", "scan-contaminated", "scan-rate-off", "no-straight-line", "area-changed", "window-chosen",
     "leakage", "lag-not-told"}
)  # fmt: skip


def test_clean_scans_leave_nothing_to_tell(tmp_path: Path) -> None:
    book = coulombook.tally(write_day(tmp_path / "day", {("m1", ""): [scan(1e-3, rate) for rate in RATES]}))
    assert SCAN_KINDS.isdisjoint(kinds(book))
    row = book.surface.iloc[0]
    # the files hold 15 digits
    assert row["capacitance / mF"] == pytest.approx(1.0, rel=1e-9)
    assert row["form"] == "line"
    assert row["u(capacitance) / mF"] < 0.003
    # 1 mF/cm^2 over 28 uF/cm^2
    assert book.summary["roughness factor"][0] == pytest.approx(1000 / 28, rel=1e-9)


def test_scan_rates_that_lag_are_left_out_and_told_of(tmp_path: Path) -> None:
    # sweeps of 5, 2.5, 1.25 and 0.625 s; RC = 0.1 s is 0.02, 0.04, 0.08 and 0.16 of them
    scans = [scan(1e-3, rate, 0.1) for rate in RATES]
    book = coulombook.tally(write_day(tmp_path / "day", {("m1", ""): scans}))
    told = [one.text for one in book.findings if one.kind == "scan-left-out"]
    assert len(told) == 1
    assert "at 80, 160 mV/s" in told[0]
    assert "RC of 0.1 s" in told[0]
    assert book.surface["capacitance / mF"][0] == pytest.approx(1.0, rel=0.01)


def test_no_roughness_where_every_scan_lags(tmp_path: Path) -> None:
    scans = [scan(1e-3, rate, 1.0) for rate in RATES]
    book = coulombook.tally(write_day(tmp_path / "day", {("m1", ""): scans}))
    assert "no-roughness" in kinds(book, "electrode m1")
    assert book.surface.empty
    assert np.isnan(book.summary["roughness factor"][0])


def reacting(rate: float) -> Record:
    """Reduction at the low end of a wide scan, ten times the slowest charging current."""
    record = scan(1e-3, rate, low=-0.35, high=-0.05)
    extra = 2e-4 * np.exp(-(record.potential_volt + 0.35) / 0.02)
    return Record(record.time_second, record.potential_volt, record.current_ampere - extra)


def test_clean_window_is_chosen_only_where_the_table_gives_none(tmp_path: Path) -> None:
    scans = [reacting(rate) for rate in RATES]
    book = coulombook.tally(write_day(tmp_path / "a", {("m1", ""): scans}))
    assert "window-chosen" in kinds(book, "electrode m1")
    assert "scan-contaminated" not in kinds(book)
    assert book.surface["capacitance / mF"][0] == pytest.approx(1.0, rel=1e-6)
    given = write_day(
        tmp_path / "b", {("m1", ""): scans}, heads=",window low / V,window high / V", cells=",-0.35,-0.05"
    )
    book = coulombook.tally(given)
    assert "window-chosen" not in kinds(book)
    assert "scan-contaminated" in kinds(book, "electrode m1")


def test_leak_is_told_of_and_cancels(tmp_path: Path) -> None:
    # 1 mS over 0.05 V to either side is 50 uA; the slowest scan charges with 20 uA
    scans = [scan(1e-3, rate, leak=1e-3) for rate in RATES]
    book = coulombook.tally(write_day(tmp_path / "day", {("m1", ""): scans}))
    told = [one.text for one in book.findings if one.kind == "leakage"]
    assert len(told) == 1
    assert "1e+03 ohm" in told[0]
    assert book.surface["capacitance / mF"][0] == pytest.approx(1.0, rel=1e-9)


def test_wrong_scan_rate_is_told_by_the_time_of_the_record(tmp_path: Path) -> None:
    scans = [scan(1e-3, rate) for rate in RATES[:-1]] + [scan(1e-3, 0.1)]
    book = coulombook.tally(write_day(tmp_path / "day", {("m1", ""): scans}))
    told = [one.text for one in book.findings if one.kind == "scan-rate-off"]
    assert len(told) == 1
    assert "160 mV/s" in told[0]
    assert "100 mV/s" in told[0]


def test_power_law_is_told_of_and_widens_the_uncertainty(tmp_path: Path) -> None:
    scans = [scan(1e-3 * (rate / 0.05) ** -0.2, rate) for rate in RATES]
    book = coulombook.tally(write_day(tmp_path / "day", {("m1", ""): scans}))
    assert "no-straight-line" in kinds(book, "electrode m1")
    row = book.surface.iloc[0]
    assert row["form"] == "power law"
    assert row["exponent"] == pytest.approx(0.8, rel=1e-9)
    # i / v at the geometric mean of the rates, 20 x 2^1.5 mV/s
    secant = (20 * 2**1.5 / 50) ** -0.2
    assert row["u(capacitance) / mF"] > abs(row["capacitance / mF"] - secant) / 3**0.5


@pytest.mark.parametrize(("after", "told"), [(1.3e-3, True), (1.0e-3, False)])
def test_change_of_area_is_told_of_and_runs_keep_the_former(tmp_path: Path, after: float, told: bool) -> None:
    # the table lists the later set first
    sets = {
        ("m1", "after"): [scan(after, rate, noise=1e-7, seed=5) for rate in RATES],
        ("m1", "before"): [scan(1e-3, rate, noise=1e-7, seed=6) for rate in RATES],
    }
    book = coulombook.tally(write_day(tmp_path / "day", sets))
    assert ("area-changed" in kinds(book, "electrode m1")) is told
    assert list(book.surface["purpose"]) == ["before", "after"]
    assert list(book.surface["electrode"]) == ["m1", "m1"]
    # noise of 0.1 uA, averaged over the samples of a fifth, against 160 uA
    assert book.summary["roughness factor"][0] == pytest.approx(1000 / 28, rel=2e-3)


# --- the shipped table ---

FROM_TABLE = 'material = "copper"\nelectrolyte = "0.1 mol/L KHCO3"'


def test_shipped_capacitance_carries_one_large_error_shared_by_all_electrodes(tmp_path: Path) -> None:
    sets = {
        ("m1", ""): [scan(1e-3, rate, noise=1e-7, seed=1) for rate in RATES],
        ("m2", ""): [scan(2e-3, rate, noise=1e-7, seed=2) for rate in RATES],
    }
    folder = write_day(tmp_path / "day", sets, FROM_TABLE)
    book = coulombook.tally(folder)
    told = [one.text for one in book.findings if one.kind == "capacitance-from-table"]
    assert len(told) == 1
    assert "29 uF/cm^2" in told[0]
    found = book.summary.set_index("run")
    factor, u = found["roughness factor"], found["u(roughness factor)"]
    assert factor["r-m1"] == pytest.approx(1000 / 29, rel=2e-3)
    # 40 % of the table; the gain of the current range and the scatter add next to nothing
    assert u["r-m1"] / factor["r-m1"] == pytest.approx(0.40, rel=1e-3)


def test_error_of_the_shipped_capacitance_cancels_between_electrodes(tmp_path: Path) -> None:
    from coulombook.findings import Findings
    from coulombook.intake.day import open_day
    from coulombook.tally import settle_day
    from coulombook.uncertainty.linearised import gather, standard_uncertainty

    sets = {
        ("m1", ""): [scan(1e-3, rate, noise=1e-7, seed=1) for rate in RATES],
        ("m2", ""): [scan(2e-3, rate, noise=1e-7, seed=2) for rate in RATES],
    }
    findings = Findings()
    settled = settle_day(open_day(write_day(tmp_path / "day", sets, FROM_TABLE), [], findings), findings)
    assert settled is not None
    factor = settled.outcome.roughness_factor
    ratio = gather(factor, np.array([1])) / gather(factor, np.array([0]))
    # 0.1 uA of noise against 160 uA, some ten samples to a fifth
    assert standard_uncertainty(ratio)[0] < 0.01
    assert standard_uncertainty(factor)[0] > 10.0


@pytest.mark.parametrize(
    ("surface", "kind", "text"),
    [
        ('material = "brass"\nelectrolyte = "KOH"', "unknown-name", "this material"),
        ('material = "copper"\nelectrolyte = "KOH"', "unknown-name", "this electrolyte for copper"),
        ('material = "copper"', "missing-value", "without 'electrolyte'"),
        (
            'material = "copper"\nelectrolyte = "acid"\nsmooth_reference = "m1"',
            "not-allowed",
            "two references",
        ),
    ],
)
def test_what_the_shipped_table_lacks_is_a_fault(tmp_path: Path, surface: str, kind: str, text: str) -> None:
    folder = write_day(tmp_path / "day", {("m1", ""): [scan(1e-3, rate) for rate in RATES]}, surface)
    with pytest.raises(coulombook.DayFaults) as caught:
        coulombook.tally(folder)
    assert [(one.kind, text in one.text) for one in caught.value.stops] == [(kind, True)]


# --- spectra ---


def spectrum(resistance: float, *, noise: float = 0.0, drift: float = 0.0) -> str:
    """A constant-phase element of 1 mF s^-0.1 bridged by 200 ohm; ``drift`` is the growth of the resistance."""
    frequency = np.geomspace(1e5, 0.1, 43)
    growing = resistance * (1.0 + drift * np.linspace(0.0, 1.0, frequency.size))
    z = circuit_impedance(2 * np.pi * frequency, 0.0, 200.0, 1e-3, 0.9) + growing
    random = np.random.default_rng(4).standard_normal((2, frequency.size))
    z = z * (1.0 + noise * (random[0] + 1j * random[1]))
    rows = [f"{f:.15g},{one.real:.15g},{one.imag:.15g}" for f, one in zip(frequency, z, strict=True)]
    return "\n".join(["f / Hz,Zre / ohm,Zim / ohm", *rows]) + "\n"


def test_spectrum_gives_the_resistance_of_runs_that_name_none(tmp_path: Path) -> None:
    tables = {
        "spectra.csv": "run,electrode,file\nr-m1,,spectra/a.csv\n,m2,spectra/b.csv\n",
        "spectra/a.csv": spectrum(8.0, noise=0.003),
        "spectra/b.csv": spectrum(12.0, noise=0.003),
    }
    book = coulombook.tally(write_day(tmp_path / "day", {}, "", tables=tables, resistance=False))
    assert kinds(book).count("resistance-from-spectrum") == 2
    assert "resistance-missing" not in kinds(book)
    found = book.summary.set_index("run")
    spectra = book.tables["spectra"].frame().set_index("file")
    assert list(spectra["Kramers-Kronig"]) == ["passed", "passed"]
    for run, file, truth in (("r-m1", "spectra/a.csv", 8.0), ("r-m2", "spectra/b.csv", 12.0)):
        row = spectra.loc[file]
        u = row["u(resistance) / ohm"]
        assert abs(row["resistance / ohm"] - truth) < 3.0 * u < 0.3
        # cathodic: E + 0.210 + 0.0591594 x 6.8 + 10 mA x R
        potential = -1.5 + 0.210 + 0.0591594 * 6.8 + 0.010 * row["resistance / ohm"]
        assert found["E vs RHE / V"][run] == pytest.approx(potential, abs=1e-6)
        # what nothing else moves: the current's 0.2 % acts through the resistance as well
        expected = 0.010 * np.hypot(u, 0.002 * row["resistance / ohm"])
        assert found["u(E vs RHE) / V"][run] == pytest.approx(expected, rel=1e-6)


def test_resistance_of_the_table_stands_before_that_of_a_spectrum(tmp_path: Path) -> None:
    tables = {"spectra.csv": "electrode,file\nm1,spectra/a.csv\n", "spectra/a.csv": spectrum(8.0)}
    book = coulombook.tally(write_day(tmp_path / "day", {}, "", tables=tables))
    assert "resistance-from-spectrum" not in kinds(book)
    assert book.summary["E vs RHE / V"][0] == pytest.approx(-1.5 + 0.210 + 0.0591594 * 6.8 + 0.1, abs=1e-6)


def test_runs_without_a_spectrum_still_miss_their_resistance(tmp_path: Path) -> None:
    tables = {
        "spectra.csv": "electrode,file,purpose\nm1,spectra/a.csv,\nm2,spectra/a.csv,capacitance\n",
        "spectra/a.csv": spectrum(8.0),
    }
    book = coulombook.tally(write_day(tmp_path / "day", {}, "", tables=tables, resistance=False))
    assert [one.text[:40] for one in book.findings if one.kind == "resistance-missing"] == [
        "no resistance is given for 1 of 2 runs; "
    ]


def test_drifting_spectrum_is_told_of(tmp_path: Path) -> None:
    tables = {"spectra.csv": "electrode,file\nm1,spectra/a.csv\n", "spectra/a.csv": spectrum(8.0, drift=1.0)}
    book = coulombook.tally(write_day(tmp_path / "day", {}, "", tables=tables))
    assert "spectrum-unsteady" in kinds(book, "spectra/a.csv")
    assert book.tables["spectra"].column("Kramers-Kronig") == ["failed"]


@pytest.mark.parametrize(("capacitance", "apart"), [(0.5e-3, False), (5e-3, True)])
def test_capacitances_of_scans_and_spectra_are_compared(
    tmp_path: Path, capacitance: float, apart: bool
) -> None:
    tables = {"spectra.csv": "electrode,file\nm1,spectra/a.csv\n", "spectra/a.csv": spectrum(8.0)}
    scans = {("m1", ""): [scan(capacitance, rate) for rate in RATES]}
    book = coulombook.tally(write_day(tmp_path / "day", scans, tables=tables))
    row = book.surface.iloc[0]
    # the equations themselves are held against published numbers elsewhere
    assert row["capacitance by Brug / mF"] == pytest.approx(
        1e3 * brug_capacitance(1e-3, 0.9, 8.0, 200.0), rel=1e-4
    )
    assert row["capacitance by Hsu-Mansfeld / mF"] == pytest.approx(
        1e3 * hsu_mansfeld_capacitance(1e-3, 0.9, 200.0), rel=1e-4
    )
    assert ("capacitances-apart" in kinds(book)) is apart


@pytest.mark.parametrize(
    ("rows", "text", "kind"),
    [
        ("m9,spectra/a.csv", spectrum(8.0), "unknown-name"),
        ("m1,spectra/b.csv", spectrum(8.0), "missing-file"),
        (",spectra/a.csv", spectrum(8.0), "missing-value"),
        ("m1,spectra/a.csv", "f / Hz,Zre / ohm,Zim / ohm\n1,2,-3\n", "broken-spectrum"),
        ("m1,spectra/a.csv", "f / Hz,Zre / ohm\n1,2\n", "missing-column"),
        ("m1,spectra/a.csv", "f / Hz,Zre / ohm,Zim / V\n1,2,-3\n", "wrong-dimension"),
    ],
)
def test_fault_of_a_spectrum_is_told(tmp_path: Path, rows: str, text: str, kind: str) -> None:
    tables = {"spectra.csv": f"electrode,file\n{rows}\n", "spectra/a.csv": text}
    folder = write_day(tmp_path / "day", {}, "", tables=tables)
    with pytest.raises(coulombook.DayFaults) as caught:
        coulombook.tally(folder)
    assert [one.kind for one in caught.value.stops] == [kind]
