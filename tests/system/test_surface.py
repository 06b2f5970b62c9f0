"""Capacitance scans of a day through the whole tally: what counts, what is told, what is uncertain. Invented days."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np
import pytest
from tests.unit.cell.rc_circuit import Record, sweep

import coulombook
from coulombook.book import Book

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
