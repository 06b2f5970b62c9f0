"""The sheets of calibration: the curves, their standards, and the checks of their drift."""

from __future__ import annotations

import numpy as np

from coulombook.balance.curves_used import GAS, UsedCurve
from coulombook.balance.readings import FloatArray
from coulombook.book.entries import PPM
from coulombook.curves.inverse import response
from coulombook.report.workbook.cells import FIRST_ROW, Sheet, Sheets
from coulombook.report.workbook.place import Account, found_in, values
from coulombook.uncertainty.linearised import IntArray

COEFFICIENTS = ("a0", "a1", "a2")
# heads of the table of calibrations that are text, and those whose cells are no coefficients
_TEXTS = ("calibration", "channel", "analyte", "form", "weights")
_OTHERS = (
    "points", "residual sd", "lack of fit p", "detection limit / ppm", "quantification limit / ppm", "lowest / ppm",
    "highest / ppm",
)  # fmt: skip


def curves_sheet(account: Account) -> Sheet:
    """One row per curve used, with what the table of calibrations says of it."""
    used = _fitted(account)
    rows = {number: row for row, (number, _) in enumerate(used)}
    sheet = Sheet(
        "curves",
        "Calibration curves",
        "Response = a0 + a1 x + a2 x^2, fitted to the sheet of standards; x is the mole fraction in ppm for a gas, and "
        "the amount ratio to the internal standard for a liquid (limits and range then in that ratio).",
        len(used),
        frozen=1,
    )
    sheet.text("curve", [one.name for _, one in used], "analyte @ channel or signal")
    for head in _TEXTS:
        sheet.text(head, account.column("calibrations", head))
    scales = [_relative_scale(account, one) for _, one in used]
    borrowed = any(one.like is not None for _, one in used)
    if borrowed:
        sheet.text(
            "like",
            ["" if one.like is None else account.settled.plan.curves.used[one.like].name for _, one in used],
        )
        scale = sheet.computed(
            "relative response", scales, "effective carbon numbers: of this over that analyte"
        )
    for power, name in enumerate(COEFFICIENTS):
        coefficient, u = account.column("calibrations", name), account.column("calibrations", f"u({name})")
        if borrowed:
            letter = sheet.next_letter
            factor = ("", f"*{scale}{{r}}", f"*{scale}{{r}}^2")[power]
            sheet.formula(
                name,
                (
                    None if one.like is None else f"={letter}{FIRST_ROW + rows[one.like]}{factor.format(r=r)}"
                    for r, (_, one) in zip(sheet.lines, used, strict=True)
                ),
                coefficient,
                "fitted; or of the curve it is like, x relative response to the power",
                u=u,
            )
        else:
            sheet.computed(name, coefficient, "fitted; empty: the form has none", u=u)
        sheet.computed(f"u({name})", u, "standard uncertainty", u=u)
    for head in _OTHERS:
        sheet.computed(head, account.column("calibrations", head))
    return sheet


def _fitted(account: Account) -> list[tuple[int, UsedCurve]]:
    """The curves that the table of calibrations lists, with their places in the plan."""
    return [
        (number, one) for number, one in enumerate(account.settled.plan.curves.used) if one.curve is not None
    ]


def _relative_scale(account: Account, one: UsedCurve) -> float | None:
    """By how much a borrowed curve's analyte responds more than that of the curve it is like."""
    if one.like is None or one.curve is None:
        return None
    of = account.settled.plan.curves.used[one.like].curve
    return None if of is None else float(one.curve.coefficients[1] / of.coefficients[1])


class CurveCells:
    """Where the coefficients of the curves stand, for readings in ppm or as ratios."""

    def __init__(self, account: Account, curves: Sheet) -> None:
        self._x = account.x
        self._units = np.array(
            [PPM if one.standards.kind == GAS else 1.0 for one in account.settled.plan.curves.used]
        )
        self._rows = {number: FIRST_ROW + row for row, (number, _) in enumerate(_fitted(account))}
        self._columns = [curves[name] for name in COEFFICIENTS]
        self.names = [one.name for one in account.settled.plan.curves.used]

    def enter(self, sheet: Sheet, curve: IntArray) -> tuple[str, str, str]:
        """Add the name and the coefficients of each record's curve (-1: none, of slope 1); the letters of these."""
        numbers: list[int] = curve.tolist()
        sheet.text("curve", ["" if one < 0 else self.names[one] for one in numbers], "of the sheet of curves")
        a0, a1, a2 = (
            sheet.formula(
                name,
                (None if one < 0 else f"={column}{self._rows[one]}" for one in numbers),
                self.values(power, curve),
                "of the curve",
            )
            for power, (name, column) in enumerate(zip(COEFFICIENTS, self._columns, strict=True))
        )
        return a0, a1, a2

    def values(self, power: int, curve: IntArray) -> FloatArray:
        """Coefficients of one power in the unit of the page."""
        unit = np.append(self._units, 1.0)[curve]  # index -1: the line of slope 1, last as in the plan
        result: FloatArray = self._x[COEFFICIENTS[power]][curve] / unit**power
        return result


def inverse(a0: str, a1: str, a2: str, y: str) -> str:
    """The formula of x at the response ``y``, on the rising branch of the curve.

    >>> inverse("B1", "C1", "D1", "A1")
    '=2*(A1-B1)/(C1+SQRT(C1^2+4*D1*(A1-B1)))'
    """
    return f"=2*({y}-{a0})/({a1}+SQRT({a1}^2+4*{a2}*({y}-{a0})))"


def standards_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per standard of a curve: where it lies off its curve."""
    curves = sheets["curves"]
    points = [
        (FIRST_ROW + row, one, point)
        for row, (_, one) in enumerate(_fitted(account))
        if one.like is None
        for point in range(len(one.standards.x))
    ]
    sheet = Sheet(
        "standards",
        "Standards",
        "What the curves were fitted to, and how far each standard lies off its curve.",
        len(points),
        parted="curve",
    )
    x = np.array([one.standards.x[point] * _unit(one) for _, one, point in points])
    y = np.array([one.standards.y[point] for _, one, point in points])
    gas = np.array([one.standards.kind == GAS for _, one, _ in points], dtype=bool)
    sheet.text("curve", [one.name for _, one, _ in points])
    sheet.text("calibration", [one.standards.calibration for _, one, _ in points])
    columns = (
        sheet.entered("amount ratio", np.where(gas, np.nan, x), "to the internal standard, of a liquid"),
        sheet.entered("mole fraction / ppm", np.where(gas, x, np.nan), "of a gas"),
    )
    places = [columns[is_gas] for is_gas in gas.tolist()]
    measured = sheet.entered("response", y, "peak area, or integral ratio per proton")
    a0, a1, a2 = (curves[name] for name in COEFFICIENTS)
    coefficients = np.array([_coefficients(one) for _, one, _ in points], dtype=float).reshape(-1, 3)
    expected = values(response(coefficients[:, 0], coefficients[:, 1], coefficients[:, 2], x))
    sd = [one.curve.residual_sd if one.curve is not None else None for _, one, _ in points]
    at = sheet.formula(
        "response of the curve",
        (
            f"={a0}{row}+({a1}{row}+{a2}{row}*{place}{r})*{place}{r}"
            for r, (row, _, _), place in zip(sheet.lines, points, places, strict=True)
        ),
        expected,
        "a0 + a1 x + a2 x^2",
        u=sd,
    )
    sheet.formula(
        "residual", (f"={measured}{r}-{at}{r}" for r in sheet.lines), y - expected, "response - curve", u=sd
    )
    found_in(sheet, [one.standards.origins[point] for _, one, point in points])
    return sheet


def _response(letters: tuple[str, str, str], x: str, r: int) -> str:
    a0, a1, a2 = letters
    return f"={a0}{r}+({a1}{r}+{a2}{r}*{x}{r})*{x}{r}"


def _unit(one: UsedCurve) -> float:
    return PPM if one.standards.kind == GAS else 1.0


def _coefficients(one: UsedCurve) -> list[float]:
    assert one.curve is not None
    return [float(a) / _unit(one) ** power for power, a in enumerate(one.curve.coefficients)]


def checks_sheet(account: Account, curves: CurveCells) -> Sheet:
    """One row per check-gas injection: what it should have given, and the drift factor that follows."""
    plan, x = account.settled.plan, account.x
    gas = plan.gas
    held = np.flatnonzero(gas.check_curve >= 0)
    checks = [plan.day.checks[number] for number in held]
    sheet = Sheet(
        "checks",
        "Check gas",
        "Injections of a gas of known composition: how far the detector has drifted since its calibration.",
        len(held),
    )
    sheet.text("time", [check.at.isoformat(sep=" ", timespec="seconds") for check in checks], "by the clock")
    sheet.text("channel", [check.channel for check in checks])
    sheet.text("analyte", [check.analyte for check in checks])
    fraction = sheet.entered("mole fraction / ppm", gas.check_mole_fraction[held] * PPM, "as certified")
    area = sheet.entered("peak area", gas.check_area[held], "as measured")
    letters = curves.enter(sheet, gas.check_curve[held])
    a0, a1, a2 = (x[name][gas.check_curve[held]] for name in COEFFICIENTS)
    expected = values(response(a0, a1, a2, gas.check_mole_fraction[held]))
    at = sheet.formula(
        "expected area",
        (_response(letters, fraction, r) for r in sheet.lines),
        expected,
        "a0 + a1 x + a2 x^2",
    )
    sheet.formula(
        "drift factor",
        (f"={area}{r}/{at}{r}" for r in sheet.lines),
        gas.check_area[held] / expected,
        "area / expected",
    )
    found_in(sheet, [check.origin for check in checks])
    return sheet
