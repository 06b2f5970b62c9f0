"""Every calibration in some folders, each curve fitted and judged as a day would have it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date
from enum import StrEnum
from pathlib import Path

from coulombook.balance.curves_used import GAS, CurvesUsed
from coulombook.balance.readings import Calibration, StandardSet
from coulombook.curves.fit import Curve
from coulombook.curves.judgement import Judgement
from coulombook.curves.limits import Limits
from coulombook.findings import Finding, Findings, Severity
from coulombook.intake.calibration import read_calibration
from coulombook.intake.files import Folder, report_outside
from coulombook.species import SpeciesTable, load_species

PPM = 1e6
_TABLES = ("standards.csv", "standards.tsv")


class Validity(StrEnum):
    """Whether a calibration may be used on a date."""

    VALID = "valid"
    EXPIRED = "expired"
    NOT_YET = "not yet"  # it was measured later
    NO_END = "no end"  # it names no date to which it is valid


class Verdict(StrEnum):
    """The gravest thing to be said of a curve, in a word; in order of gravity."""

    NO_CURVE = "no curve"
    UNKNOWN = "unknown"  # no standards to spare: the scatter is not known
    MISFIT = "misfit"
    FLAT = "flat"
    BENDS = "bends"
    UNEVEN = "uneven"
    OUTLIER = "outlier"
    BORROWED = "borrowed"
    UNTESTED = "untested"  # too few standards for any test
    SOUND = "sound"


@dataclass(frozen=True, slots=True, eq=False)
class Entry:
    """One curve of one calibration; ``curve`` is None when it could not be fitted.

    ``judgement`` is None for a curve made like another's, ``limits`` where there are none to be had. ``findings`` are
    those of this curve.
    """

    calibration: Calibration
    standards: StandardSet
    curve: Curve | None
    judgement: Judgement | None
    limits: Limits | None
    findings: tuple[Finding, ...]

    @property
    def name(self) -> str:
        """analyte@channel (gas) or analyte@signal (liquid)."""
        return f"{self.standards.analyte}@{self.standards.channel}"

    @property
    def full_name(self) -> str:
        """The name that finds this very curve: calibration/analyte@channel."""
        return f"{self.calibration.name}/{self.name}"

    @property
    def key(self) -> tuple[str, str, str]:
        """What makes curves of different calibrations the same curve."""
        return (
            self.standards.kind,
            " ".join(self.standards.channel.split()).casefold(),
            self.standards.analyte,
        )

    @property
    def x_scale(self) -> float:
        """What turns x into the unit people see: ppm for gases; an amount ratio has none."""
        return PPM if self.standards.kind == GAS else 1.0

    @property
    def verdict(self) -> Verdict:
        """The gravest thing to be said of it."""
        judged = self.judgement
        if self.curve is None:
            return Verdict.NO_CURVE
        if judged is None:
            return Verdict.BORROWED
        if self.curve.degrees_of_freedom == 0:
            return Verdict.UNKNOWN
        if not judged.fits:
            return Verdict.MISFIT
        if not judged.rises:
            return Verdict.FLAT
        if judged.bends and self.curve.form != "quadratic":
            return Verdict.BENDS
        # before the outlying standard, which under the wrong weights may be none
        if not judged.even_scatter:
            return Verdict.UNEVEN
        if judged.outlier is not None:
            return Verdict.OUTLIER
        if judged.suggested_weights is not None:
            return Verdict.UNEVEN
        return Verdict.SOUND if judged.tested else Verdict.UNTESTED


@dataclass(frozen=True, slots=True, eq=False)
class Library:
    """Calibrations found, in the order of the folders and of their names there.

    ``broken`` names calibrations with faults, none of whose curves is an entry; ``findings`` holds the faults and
    everything milder seen while reading.
    """

    calibrations: tuple[Calibration, ...]
    entries: tuple[Entry, ...]
    broken: tuple[str, ...]
    findings: tuple[Finding, ...]

    def of(self, calibration: str) -> tuple[Entry, ...]:
        """The curves of one calibration."""
        return tuple(one for one in self.entries if one.calibration.name == calibration)


def open_library(places: Sequence[Path], species: SpeciesTable | None = None) -> Library:
    """Read every calibration in some folders and fit its curves.

    A calibration whose name occurs in two folders is taken from the first, as a day would take it. A folder without
    calibration.toml or standards is no calibration and is passed by. Faults are findings, never raised.

    Parameters
    ----------
    places : sequence of Path
        Folders that hold calibrations.
    species : SpeciesTable, optional
        Species known; default: the shipped table.

    Raises
    ------
    OSError
        A folder cannot be listed.
    """
    known = species or load_species()
    calibrations: list[Calibration] = []
    entries: list[Entry] = []
    broken: list[str] = []
    findings = Findings()
    seen: set[str] = set()
    for place in places:
        for path in sorted(place.iterdir()):
            if path.name in seen or path.name.startswith(".") or not _is_calibration(path):
                continue
            seen.add(path.name)
            own = Findings()
            if not Folder(place).holds(path):
                report_outside(own, path.name, path.name)
                found = None
            else:
                found = read_calibration(Folder(path, path.name), path.name, known, own)
            findings.extend(own)
            if found is None or own.stops:
                broken.append(path.name)
            else:
                calibrations.append(found)
                entries += _entries(found)
    return Library(tuple(calibrations), tuple(entries), tuple(broken), tuple(findings))


def validity(calibration: Calibration, on: date) -> Validity:
    """Whether a calibration may be used on a date."""
    if calibration.measured_on is not None and on < calibration.measured_on:
        return Validity.NOT_YET
    if calibration.valid_until is None:
        return Validity.NO_END
    return Validity.VALID if on <= calibration.valid_until else Validity.EXPIRED


def newest(entries: Iterable[Entry], on: date) -> Entry:
    """The one a day of this date would best use: the last measured of those valid then, or of all.

    One without a curve only when none has any.
    """

    def rank(entry: Entry) -> tuple[bool, bool, date]:
        usable = validity(entry.calibration, on) in (Validity.VALID, Validity.NO_END)
        return entry.curve is not None, usable, entry.calibration.measured_on or date.min

    return max(entries, key=rank)


def _is_calibration(path: Path) -> bool:
    return path.is_dir() and any((path / name).exists() for name in ("calibration.toml", *_TABLES))


def _entries(calibration: Calibration) -> list[Entry]:
    """Its curves, each with what was found while making it."""
    findings = Findings()
    curves = CurvesUsed([calibration], findings)
    found = []
    for standards in calibration.standards:
        before = set(findings)
        index = curves.index(standards.kind, standards.channel, standards.analyte)
        assert index is not None  # its calibration holds it
        limits = curves.limits(index, 1)
        used = curves.used[index]
        fresh = tuple(one for one in findings if one not in before)
        found.append(Entry(calibration, standards, used.curve, used.judgement, limits, fresh))
    return found


def stops(entries: Iterable[Entry]) -> tuple[Finding, ...]:
    """The faults of some curves."""
    return tuple(one for entry in entries for one in entry.findings if one.severity is Severity.STOP)
