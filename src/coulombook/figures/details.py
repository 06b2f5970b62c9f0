"""What the figures of single logs, curves and electrodes draw, as tables; see `coulombook.figures.data`."""

from __future__ import annotations

import numpy as np

from coulombook.balance.settle import Settled
from coulombook.book.tables import Book, Cell, Table
from coulombook.cell.impedance import circuit_impedance
from coulombook.figures.data import MARK, Row, known
from coulombook.figures.marks import mark_id
from coulombook.library.picture import Picture, axis_heads, picture
from coulombook.library.shelf import Entry

TRACE = (
    "what", "name", "time / s", "until / s", "lowest I / mA", "highest I / mA", "lowest E / V", "highest E / V",
    MARK,
)  # fmt: skip
LOG, WINDOW, INJECTION, AVERAGED = "log", "window", "injection", "averaged"
CAPACITANCE = ("what", "scan rate / mV s^-1", "charging current / mA", MARK)
SCAN, LINE = "scan", "line"
SPECTRUM = ("what", "f / Hz", "Zre / ohm", "-Zim / ohm", MARK)
MEASURED, FITTED = "measured", "fitted"
STANDARD, OUTLYING, CURVE, LIMIT = "standard", "outlying standard", "curve", "limit"

_MILLI = 1e3
_POINTS = 200  # of a fitted line that is no straight one


def settled_of(book: Book) -> Settled:
    """What the book was computed from; a ValueError where it was not kept."""
    if book.settled is None:
        raise ValueError("the book holds its tables alone; tally the day to draw this")
    return book.settled


def trace(book: Book, run: str) -> Table:
    """The envelope of a log, the window of its run, and each injection with the stretch its current is averaged over.

    Current as logged, cathodic negative; the time of an injection is that of the log, its dead time not taken off.
    """
    plan = settled_of(book).plan
    names = [one.name for one in plan.runs]
    place = names.index(known("run", run, names))
    shown, figures = book.pictures[place], plan.figures[place]
    mark = mark_id("trace", run)
    rows: list[Row] = [
        {"what": LOG, "time / s": time, "lowest I / mA": low * _MILLI, "highest I / mA": high * _MILLI,
         "lowest E / V": lowest, "highest E / V": highest, MARK: mark}
        for time, low, high, lowest, highest in zip(
            shown.time_second.tolist(), shown.lowest_current_ampere.tolist(), shown.highest_current_ampere.tolist(),
            shown.lowest_potential_volt.tolist(), shown.highest_potential_volt.tolist(), strict=True,
        )
    ]  # fmt: skip
    rows.append({"what": WINDOW, "time / s": figures.start_second, "until / s": figures.stop_second,
                 MARK: f"{mark}:window"})  # fmt: skip
    injections = plan.gas.injections
    for one, (low, high) in zip(
        injections.of_run(place).tolist(), figures.injection_window_second.tolist(), strict=True
    ):
        name = injections.label[one]
        at = f"{mark}:{mark_id(name)}"
        rows.append(
            {"what": INJECTION, "name": name, "time / s": float(injections.time_second[one]), MARK: at}
        )
        if low < high:
            rows.append(
                {"what": AVERAGED, "name": name, "time / s": low, "until / s": high, MARK: f"{at}:window"}
            )
    return Table.under("trace", TRACE, rows)


def potential_scale(book: Book) -> str:
    """What the potential of the logs is counted from, in words."""
    name = settled_of(book).plan.settings.reference_name
    return f"E vs {name} / V" if name else "E as logged / V"


def capacitance(book: Book, electrode: str) -> Table:
    """Charging current against scan rate, and the line whose slope is the capacitance."""
    surface = settled_of(book).plan.surface
    place = surface.electrodes.index(known("electrode with scans", electrode, surface.electrodes))
    held = np.flatnonzero(surface.scan_electrode == place)
    rate, current = surface.scan_rate_volt_per_second[held], surface.charging_current_ampere[held]
    fit = surface.fits[place]
    mark = mark_id("capacitance", electrode)
    rows: list[Row] = [
        {"what": SCAN, "scan rate / mV s^-1": float(rate[one] * _MILLI),
         "charging current / mA": float(current[one] * _MILLI), MARK: f"{mark}:{place_in}"}
        for place_in, one in enumerate(np.argsort(rate, kind="stable").tolist(), start=1)
    ]  # fmt: skip
    rows += [
        {"what": LINE, "scan rate / mV s^-1": float(end * _MILLI),
         "charging current / mA": float((fit.intercept_ampere + fit.capacitance_farad * end) * _MILLI),
         MARK: f"{mark}:line"}
        for end in (0.0, float(rate.max()))
    ]  # fmt: skip
    return Table.under("capacitance", CAPACITANCE, rows)


def spectra_of(book: Book) -> tuple[str, ...]:
    """Files of the spectra that could be read, a file of two rows once."""
    if book.settled is None:
        return ()
    plan = book.settled.plan
    pairs = zip(plan.day.spectra, plan.spectra, strict=True)
    return tuple(dict.fromkeys(spectrum.file for spectrum, one in pairs if one is not None))


def spectrum(book: Book, file: str) -> Table:
    """An impedance spectrum in the complex plane, and the fitted circuit at its frequencies."""
    plan = settled_of(book).plan
    known("spectrum", file, spectra_of(book))
    figures = next(
        one
        for row, one in zip(plan.day.spectra, plan.spectra, strict=True)
        if row.file == file and one is not None
    )
    frequency, z, fit = figures.record.frequency_hertz, figures.record.impedance_ohm, figures.fit
    mark = mark_id("spectrum", file)
    rows: list[Row] = [
        {
            "what": MEASURED,
            "f / Hz": f,
            "Zre / ohm": one.real,
            "-Zim / ohm": -one.imag,
            MARK: f"{mark}:{place}",
        }
        for place, (f, one) in enumerate(zip(frequency.tolist(), z.tolist(), strict=True), start=1)
    ]
    along = np.geomspace(frequency.max(), frequency.min(), _POINTS)
    circle = circuit_impedance(
        2.0 * np.pi * along, fit.resistance_ohm, fit.transfer_ohm, fit.admittance, fit.alpha
    )
    rows += [
        {"what": FITTED, "f / Hz": f, "Zre / ohm": one.real, "-Zim / ohm": -one.imag, MARK: f"{mark}:fit"}
        for f, one in zip(along.tolist(), circle.tolist(), strict=True)
    ]
    return Table.under("spectrum", SPECTRUM, rows)


def curves_of(book: Book) -> tuple[str, ...]:
    """Names of the curves the day used, as analyte@channel."""
    if book.settled is None:
        return ()
    return tuple(one.name for one in book.settled.plan.curves.used if one.curve is not None)


def entry_of(book: Book, name: str) -> Entry:
    """A curve of the day as it stands on the shelf."""
    plan = settled_of(book).plan
    known("curve", name, curves_of(book))
    place = next(
        number for number, one in enumerate(plan.curves.used) if one.name == name and one.curve is not None
    )
    used = plan.curves.used[place]
    owner = next(one for one in plan.day.calibrations if one.name == used.standards.calibration)
    return Entry(owner, used.standards, used.curve, used.judgement, plan.curves.limits(place, 1), ())


def curve_heads(drawn: Picture, x_head: str, y_head: str) -> tuple[str, ...]:
    """Heads of a curve's table; residuals are in percent where the axes are logarithmic."""
    of = " / %" if drawn.wide else ""
    return ("what", x_head, y_head, f"residual{of}", f"band of the curve{of}", f"band of a reading{of}", MARK)


def curve_table(drawn: Picture, name: str, x_head: str, y_head: str) -> Table:
    """Standards with their residuals, the curve with its bands, and its limits."""
    heads = curve_heads(drawn, x_head, y_head)
    mark = mark_id("curve", name)
    rows: list[dict[str, Cell]] = []
    for place, values in enumerate(
        zip(drawn.x.tolist(), drawn.y.tolist(), drawn.residual.tolist(), strict=True)
    ):
        what = OUTLYING if place == drawn.outlier else STANDARD
        rows.append(dict(zip(heads, (what, *values), strict=False)) | {MARK: f"{mark}:{place + 1}"})
    columns = (
        drawn.grid_x,
        drawn.grid_y,
        np.zeros(drawn.grid_x.size),
        drawn.scaled(drawn.curve_band),
        drawn.scaled(drawn.reading_band),
    )
    for values in zip(*(one.tolist() for one in columns), strict=True):
        rows.append(dict(zip(heads, (CURVE, *values), strict=False)) | {MARK: f"{mark}:curve"})
    for limit, value in (
        ("detection limit", drawn.detection),
        ("quantification limit", drawn.quantification),
    ):
        if value is not None:
            rows.append({"what": limit, x_head: value, MARK: f"{mark}:{limit.replace(' ', '-')}"})
    return Table.under("curve", heads, rows)


def curve(book: Book, name: str) -> Table:
    """A calibration curve of the day; see `curve_table`."""
    entry = entry_of(book, name)
    return curve_table(picture(entry), name, *axis_heads(entry))
