"""What to show for the names of curves and calibrations that were asked for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from pathlib import Path

from coulombook.findings import Finding, Findings
from coulombook.intake.day import open_day
from coulombook.library.checks import ChartedChecks, chart_checks
from coulombook.library.history import Comparison, by_date, compare
from coulombook.library.names import UnknownCurve, asked_for
from coulombook.library.shelf import Entry, Library, newest, stops
from coulombook.species import SpeciesTable


@dataclass(frozen=True, slots=True, eq=False)
class Answer:
    """What was asked for: calibrations to list, or a curve with its history, or curves compared.

    ``pairs`` compare every curve that two calibrations share, ``alone`` names those in one of them only. ``remark``
    says what could not be compared. ``findings`` are those of the curves concerned.
    """

    listed: tuple[str, ...] = ()
    entry: Entry | None = None
    comparison: Comparison | None = None
    pairs: tuple[Comparison, ...] = ()
    alone: tuple[str, ...] = ()
    checks: ChartedChecks | None = None
    remark: str = ""
    findings: tuple[Finding, ...] = ()


def answer(library: Library, names: Sequence[str], species: SpeciesTable, on: date) -> Answer:
    """What to show for some names; without any, everything.

    One curve named without its calibration is shown as the newest calibration has it, with its history.

    Raises
    ------
    UnknownCurve
        A name means nothing, or what it means cannot be shown beside the others.
    """
    if not names:
        faults = (*library.findings, *stops(library.entries))
        return Answer(listed=tuple(one.name for one in library.calibrations), findings=faults)
    asked = asked_for(library, names, species, on)
    if not asked.entries:
        return _of_calibrations(library, asked.calibrations)
    if len(asked.entries) == 1 or not asked.chosen:
        return _of_curve(asked.entries, on)
    faults = stops(asked.entries)
    if faults:
        return Answer(findings=faults)
    try:
        return Answer(comparison=compare(asked.entries))
    except ValueError as error:
        raise UnknownCurve(str(error)) from None


def _of_curve(entries: Sequence[Entry], on: date) -> Answer:
    comparison, remark = None, ""
    dated = by_date(entries)
    if len(dated) > 1:
        try:
            comparison = compare(dated)
        except ValueError as error:
            remark = f"its calibrations cannot be compared: {error}"
    return Answer(entry=newest(entries, on), comparison=comparison, remark=remark, findings=stops(entries))


def _of_calibrations(library: Library, names: Sequence[str]) -> Answer:
    if len(names) == 1:
        return Answer(listed=tuple(names), findings=stops(library.of(names[0])))
    if len(names) > 2:
        raise UnknownCurve(
            "more than two calibrations are compared one curve at a time; name the curve as well"
        )
    first, second = ({one.key: one for one in library.of(name)} for name in names)
    shared = [key for key in first if key in second]
    if not shared:
        raise UnknownCurve(f"calibrations '{names[0]}' and '{names[1]}' share no curve")
    alone = [one.full_name for one in (*library.of(names[0]), *library.of(names[1])) if one.key not in shared]
    pairs, remarks = [], []
    faults = stops(one for key in shared for one in (first[key], second[key]))
    for key in shared:
        if first[key].curve is None or second[key].curve is None:
            continue  # its fault is told
        try:
            pairs.append(compare((first[key], second[key])))
        except ValueError as error:
            remarks.append(f"{first[key].name} cannot be compared: {error}")
    return Answer(pairs=tuple(pairs), alone=tuple(alone), remark="; ".join(remarks), findings=faults)


def answer_checks(
    library: Library, names: Sequence[str], species: SpeciesTable, on: date, day: Path, places: Sequence[Path]
) -> Answer:
    """The check injections of a day on the control chart of one curve.

    Raises
    ------
    UnknownCurve
        Not one curve is named, or the day has no checks of it.
    """
    asked = asked_for(library, names, species, on)
    if (
        not asked.entries
        or len({one.key for one in asked.entries}) > 1
        or (asked.chosen and len(asked.entries) > 1)
    ):
        raise UnknownCurve("--checks charts one curve; name one, such as ethylene@FID")
    findings = Findings()
    source = open_day(day, places, findings)
    if source.day is None:
        return Answer(findings=findings.stops)
    entries = by_date(asked.entries) or list(asked.entries)
    try:
        return Answer(checks=chart_checks(entries, source.day))
    except ValueError as error:
        raise UnknownCurve(str(error)) from None
