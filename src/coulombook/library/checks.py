"""The check injections of a day on the control chart of a curve."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from coulombook.balance.readings import Check, Day
from coulombook.curves.control import ControlChart, control_chart
from coulombook.library.shelf import Entry


@dataclass(frozen=True, slots=True, eq=False)
class ChartedChecks:
    """Checks in the order of time, and where each lies on the chart."""

    entry: Entry
    day: str
    checks: tuple[Check, ...]
    chart: ControlChart


def chart_checks(entries: Sequence[Entry], day: Day) -> ChartedChecks:
    """Checks of a curve on the chart of the curve the day itself uses, or of the last of ``entries``.

    Parameters
    ----------
    entries : sequence of Entry
        One curve as several calibrations have it.
    day : Day
        The day whose checks are taken.

    Raises
    ------
    ValueError
        The day has no check of the curve, or no curve could be fitted.
    """
    own = [one for one in entries if one.calibration.name in day.settings.calibrations]
    entry = (own or list(entries))[-1]
    if entry.curve is None:
        raise ValueError(f"{entry.full_name} could not be fitted")
    checks = sorted(
        (
            one
            for one in day.checks
            if one.analyte == entry.standards.analyte
            and " ".join(one.channel.split()).casefold() == entry.key[1]
        ),
        key=lambda one: one.at,
    )
    if not checks:
        raise ValueError(f"day {day.name} has no check injection of {entry.name}")
    chart = control_chart(
        entry.curve, [one.mole_fraction for one in checks], [one.peak_area for one in checks]
    )
    return ChartedChecks(entry, day.name, tuple(checks), chart)
