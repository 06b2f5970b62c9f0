"""From the truth of a day to the cells of its tables, in SI units."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import timedelta
from typing import Any

import numpy as np
from tests.forward.noise import Draws
from tests.forward.truth import Compartment, Curve, DayTruth, Hold, Key, Standards, gas_reading

Row = dict[str, Any]
Table = list[Row]


@dataclass
class Sheets:
    """Every table of a day, keyed by its name; traces, voltammograms and calibrations likewise."""

    tables: dict[str, Table] = field(default_factory=dict)
    traces: dict[str, dict[str, np.ndarray]] = field(default_factory=dict)  # run -> columns
    scans: dict[str, dict[str, np.ndarray]] = field(default_factory=dict)  # file name -> columns
    calibrations: dict[str, tuple[str, Table]] = field(default_factory=dict)  # name -> toml, standards


def sheets(day: DayTruth, draws: Draws | None = None) -> Sheets:
    """All the cells a bench would have written on this day."""
    draws = draws or Draws()
    out = Sheets()
    out.tables["runs"] = [_run_row(day, hold, draws) for hold in day.holds]
    gas = [row for hold in day.holds for row in _gas_rows(day, hold, draws)]
    if gas:
        out.tables["gas"] = gas
    vials, liquid = _liquid_rows(day, draws)
    if vials:
        out.tables["vials"], out.tables["liquid"] = vials, liquid
    if day.drift:
        out.tables["checks"] = _check_rows(day, draws)
    if day.surfaces:
        out.tables["scans"] = []
        for electrode in day.surfaces:
            _scan(day, electrode, draws, out)
    for hold in day.holds:
        out.traces[hold.name] = _trace(day, hold)
    _calibrations(day, draws, out)
    return out


def _run_row(day: DayTruth, hold: Hold, draws: Draws) -> Row:
    def entered(quantity: str, value: float | None) -> float | None:
        return None if value is None else draws.entered(quantity, value, hold.name)

    return {
        "run": hold.name,
        "catalyst": hold.catalyst,
        "electrode": hold.electrode,
        "level": hold.level,
        "set potential": hold.set_potential_volt,
        "set current": hold.set_current_ampere,
        "started": hold.started,
        "start": hold.start_second,
        "stop": hold.stop_second,
        "electrode area": entered("electrode area", hold.electrode_area_m2),
        "pH": entered("pH", hold.pH),
        "temperature": entered("temperature", hold.temperature_kelvin),
        "pressure": entered("pressure", hold.pressure_pascal),
        "resistance": entered("resistance", hold.resistance_ohm),
        "compensated": hold.compensated,
        "inlet flow": entered("inlet flow", hold.inlet_mol_per_s),
        "outlet flow": entered("outlet flow", _metered_outlet(day, hold)),
        "tracer flow": entered("tracer flow", hold.tracer_mol_per_s),
        "headspace": entered("headspace", hold.headspace_m3),
        "carbonate uptake": entered("carbonate uptake", hold.carbonate_mol_per_s or None),
        "note": hold.note,
    }


def _metered_outlet(day: DayTruth, hold: Hold) -> float | None:
    """What a meter of the outlet reads, as an amount of gas of any kind at T and p. [mol/s]"""
    if day.outlet_flow != "measured":
        return None
    from tests.forward.chemistry import water_vapour_pascal

    assert hold.outlet_mol_per_s is not None
    if not day.meter_wet:
        return hold.outlet_mol_per_s
    # the meter sees the vapour as well: dry share 1 - p_w/p
    return hold.outlet_mol_per_s / (1 - water_vapour_pascal(hold.temperature_kelvin) / hold.pressure_pascal)


def _channels(day: DayTruth, analyte: str) -> list[Key]:
    return [key for key in day.gas_curves if key[1] == analyte]


def _gas_rows(day: DayTruth, hold: Hold, draws: Draws) -> Table:
    rows = []
    for number in range(len(hold.injections_second)):
        reading = gas_reading(day, hold, number)
        for analyte, fraction in reading.mole_fraction.items():
            for key in _channels(day, analyte):
                area = day.gas_curves[key].response(1e6 * fraction * (1 - hold.leak))
                if key in day.drift:
                    assert hold.started is not None
                    area *= day.drift[key].at_time(hold.started + timedelta(seconds=reading.time_second))
                area = draws.entered("peak area", area * hold.spoiled.get(number, 1.0), hold.name)
                rows.append(
                    {
                        "run": hold.name,
                        "injection": number + 1,
                        "time": reading.time_second,
                        "channel": key[0],
                        "analyte": analyte,
                        "peak area": area,
                        "use": "no" if number in hold.spoiled else "yes",
                    }
                )
    return rows


def concentrations(day: DayTruth, hold: Hold, place: Compartment) -> list[dict[str, float]]:
    """True concentration of each liquid product at each sampling, blank included. [mol/m^3]"""
    from tests.forward.chemistry import FARADAY, PRODUCTS

    found: list[dict[str, float]] = []
    products = hold.products("liquid") if place.products is None else list(place.products)
    removed = dict.fromkeys(products, 0.0)  # taken away with the earlier aliquots [mol]
    for volume, aliquot, time in zip(place.volumes_m3, place.aliquots_m3, place.times_second, strict=True):
        passed = hold.charge_until(hold.window[1] if time is None else time)
        now = {}
        for name in products:
            made = place.shares.get(name, place.share) * hold.efficiency[name] * passed
            concentration = (made / (PRODUCTS[name].electrons * FARADAY) - removed[name]) / volume
            removed[name] += concentration * aliquot
            now[name] = concentration + day.blanks.get(place.name, {}).get(name, 0.0)
        found.append(now)
    return found


def _liquid_rows(day: DayTruth, draws: Draws) -> tuple[Table, Table]:
    vials: Table = []
    liquid: Table = []

    def tube(row: Row, contents: Mapping[str, float], run: str, aliquot: float) -> None:
        vials.append(row)
        gain = 50.0 + 7.0 * len(vials)  # of the spectrometer; no two spectra alike, and it must not matter
        reference = gain * day.standard_amount_mol * 1e6
        for one in day.standard_resonances:
            liquid.append(_signal_row(str(row["vial"]), one.analyte, one.signal, one.protons, reference, run))
        for one in day.resonances:
            if one.analyte not in contents:
                continue
            ratio = contents[one.analyte] * aliquot / day.standard_amount_mol
            curve = day.liquid_curves.get((one.analyte, one.signal), Curve(1.0))
            per_proton = reference * curve.response(ratio)
            liquid.append(
                _signal_row(str(row["vial"]), one.analyte, one.signal, one.protons, per_proton, run)
            )

    def _signal_row(vial: str, analyte: str, signal: str, protons: float, per_proton: float, run: str) -> Row:
        integral = draws.entered("integral", per_proton * protons, run)
        return {"vial": vial, "analyte": analyte, "signal": signal, "protons": protons, "integral": integral}

    used: dict[str, None] = {}
    for hold in day.holds:
        for place in hold.compartments:
            used.setdefault(place.name)
            steps = zip(
                place.volumes_m3,
                place.aliquots_m3,
                place.times_second,
                concentrations(day, hold, place),
                strict=True,
            )
            for number, (volume, aliquot, time, contents) in enumerate(steps):
                row = {
                    "vial": f"{hold.name}-{place.name}-{number + 1}",
                    "run": hold.name,
                    "compartment": place.name,
                    "time": time,
                    "compartment volume": draws.entered("compartment volume", volume, hold.name),
                    "aliquot": draws.entered("aliquot", aliquot, hold.name),
                    "standard": day.standard,
                    "standard amount": draws.entered("standard amount", day.standard_amount_mol, hold.name),
                    "role": "sample",
                }
                tube(row, contents, hold.name, aliquot)
    for name, contents in day.blanks.items():
        if name not in used:
            continue
        row = {
            "vial": f"blank-{name}",
            "run": None,
            "compartment": name,
            "time": None,
            "compartment volume": None,
            "aliquot": draws.entered("aliquot", day.blank_aliquot_m3, ""),
            "standard": day.standard,
            "standard amount": draws.entered("standard amount", day.standard_amount_mol, ""),
            "role": "blank",
        }
        tube(row, contents, "", day.blank_aliquot_m3)
    return vials, liquid


def _check_rows(day: DayTruth, draws: Draws) -> Table:
    rows = []
    for key, drift in day.drift.items():
        expected = day.gas_curves[key].response(1e6 * drift.mole_fraction)
        for at, factor in zip(drift.at, drift.factor, strict=True):
            rows.append(
                {
                    "at": at,
                    "channel": key[0],
                    "analyte": key[1],
                    "mole fraction": drift.mole_fraction,
                    "peak area": draws.entered("peak area", expected * factor, ""),
                }
            )
    return sorted(rows, key=lambda row: row["at"])


def _trace(day: DayTruth, hold: Hold) -> dict[str, np.ndarray]:
    from tests.forward.chemistry import FARADAY, GAS_CONSTANT

    reference = day.reference_volt + day.reference_volt_per_kelvin * (hold.temperature_kelvin - 298.15)
    nernst = GAS_CONSTANT * hold.temperature_kelvin * np.log(10) / FARADAY * hold.pH
    # E(RHE) = E + E_ref + nernst - (1 - f) I R, solved for the E that the reference electrode showed
    drop = (1 - hold.compensated) * hold.current_ampere * hold.resistance_ohm
    return {
        "t": hold.time_second,
        "E": hold.potential_rhe_volt - reference - nernst + drop,
        "I": hold.current_ampere,
    }


def _scan(day: DayTruth, electrode: str, draws: Draws, out: Sheets) -> None:
    surface = day.surfaces[electrode]
    low, high = surface.low_volt - surface.margin_volt, surface.high_volt + surface.margin_volt
    middle = 0.5 * (surface.low_volt + surface.high_volt)
    up = np.linspace(low, high, surface.samples)
    for rate in surface.rates_volt_per_second:
        potential, sweep, cycle = [], [], []
        for number in range(surface.cycles):
            potential += [up, up[::-1][1:-1]]
            sweep += [np.ones(up.size), -np.ones(up.size - 2)]
            cycle.append(np.full(2 * up.size - 2, number + 1.0))
        # the last cycle was broken off on its way up: it is no whole one
        potential.append(up[: surface.samples // 3])
        sweep.append(np.ones(surface.samples // 3))
        cycle.append(np.full(surface.samples // 3, surface.cycles + 1.0))
        e, sign, count = np.concatenate(potential), np.concatenate(sweep), np.concatenate(cycle)
        current = sign * (surface.capacitance_farad * rate + surface.offset_ampere)
        current = current + surface.leakage_siemens * (e - middle) + surface.drift_ampere
        # the first cycle still carries a decaying current; only a reader of the wrong cycle would see it
        current = np.where(count == 1.0, current * 1.3, current) if surface.cycles > 1 else current
        current = current + draws.many(surface.noise_ampere, e.size)
        step = (high - low) / (surface.samples - 1) / rate
        file = f"scans/{electrode}_{1000 * rate:g}mVs.csv"
        out.scans[file] = {"t": step * np.arange(e.size), "E": e, "I": current, "cycle": count}
        out.tables["scans"].append(
            {
                "electrode": electrode,
                "file": file,
                "scan rate": rate,
                "electrode area": surface.electrode_area_m2,
                "window low": surface.low_volt,
                "window high": surface.high_volt,
            }
        )


DEFAULT_GAS = Standards(tuple(np.geomspace(20.0, 20000.0, 12).round(3).tolist()))
DEFAULT_LIQUID = Standards((0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0))


def _calibrations(day: DayTruth, draws: Draws, out: Sheets) -> None:
    gas_name, liquid_name = day.calibration_names
    if day.gas_curves:
        rows = []
        for key, curve in day.gas_curves.items():
            for x, y in _standards(curve, day.gas_standards.get(key, DEFAULT_GAS), draws):
                rows.append({"channel": key[0], "analyte": key[1], "mole fraction": 1e-6 * x, "peak area": y})
        out.calibrations[gas_name] = (_calibration_toml("gas", day.gas_curves, swap=False), rows)
    if day.liquid_curves:
        rows = []
        for key, curve in day.liquid_curves.items():
            for x, y in _standards(curve, day.liquid_standards.get(key, DEFAULT_LIQUID), draws):
                rows.append({"analyte": key[0], "signal": key[1], "amount ratio": x, "integral ratio": y})
        out.calibrations[liquid_name] = (_calibration_toml("liquid", day.liquid_curves, swap=True), rows)


def _standards(curve: Curve, standards: Standards, draws: Draws) -> list[tuple[float, float]]:
    pairs = []
    for x in standards.x:
        y = curve.response(x)
        pairs.append((x, y + draws.scatter(standards.sd_absolute + standards.sd_relative * y)))
    return pairs


def _calibration_toml(kind: str, curves: Mapping[Key, Curve], *, swap: bool) -> str:
    first = next(iter(curves.values()))
    lines = [f'kind = "{kind}"', "measured_on = 2043-04-02", "", "[curve]"]
    lines += [f'form = "{first.form}"', f'weights = "{first.weights}"']
    for key, curve in curves.items():
        if (curve.form, curve.weights) != (first.form, first.weights):
            name = f"{key[0]}@{key[1]}" if swap else f"{key[1]}@{key[0]}"
            lines += ["", f'[curve."{name}"]', f'form = "{curve.form}"', f'weights = "{curve.weights}"']
    return "\n".join(lines) + "\n"
