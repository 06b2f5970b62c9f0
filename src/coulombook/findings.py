"""Findings: what the reader of a day should know, and where in the files it was seen.

A finding of severity *stop* is a fault of the day's data: every fault is gathered, nothing is written,
and all of them are shown together. *warn* means a number may mislead; *note* means something was assumed.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from enum import StrEnum


class Severity(StrEnum):
    """How much a finding matters to the reader."""

    STOP = "stop"
    WARN = "warn"
    NOTE = "note"


@dataclass(frozen=True, slots=True)
class Origin:
    """The place of a value in the bench's files.

    ``file`` is relative to the day folder (or to the calibration's parent), with forward slashes;
    ``row`` counts as the spreadsheet does, the first line of the file being row 1;
    ``column`` is the head as written.
    """

    file: str
    sheet: str | None = None
    row: int | None = None
    column: str | None = None

    def __str__(self) -> str:
        parts = [self.file]
        if self.sheet is not None:
            parts.append(f"sheet '{self.sheet}'")
        if self.row is not None:
            parts.append(f"row {self.row}")
        if self.column is not None:
            parts.append(f"column '{self.column}'")
        return ", ".join(parts)


@dataclass(frozen=True, slots=True)
class RowOrigin:
    """The row a record was read from; ``heads`` maps a quantity to the head as written in the file."""

    file: str
    sheet: str | None
    row: int | None
    heads: Mapping[str, str]

    def of(self, quantity: str) -> Origin:
        """Place of one quantity of this row."""
        return Origin(self.file, self.sheet, self.row, self.heads.get(quantity))

    def __str__(self) -> str:
        return str(Origin(self.file, self.sheet, self.row))


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing the reader should know.

    ``where`` names a run, a vial or a place in a file; ``found`` quotes the cell and ``expected`` says what
    would do (faults of the files only); ``mend`` alone gives advice.
    """

    severity: Severity
    kind: str
    where: str
    text: str
    mend: str = ""
    found: str = ""
    expected: str = ""


# Every kind of finding, with its severity and its meaning in one line: the only list of them.
KINDS: dict[str, tuple[Severity, str]] = {
    # --- faults: the day cannot be tallied as it stands ---
    "missing-file": (Severity.STOP, "a file or folder the day needs is not there"),
    "unreadable-file": (Severity.STOP, "a file cannot be read as the table or text it should be"),
    "outside-folder": (Severity.STOP, "a path leads out of the day folder"),
    "two-sources": (Severity.STOP, "a table stands both as a file and as a sheet of day.xlsx"),
    "missing-column": (Severity.STOP, "a table lacks a column it needs"),
    "repeated-column": (Severity.STOP, "two columns of one table carry the same quantity"),
    "unknown-unit": (Severity.STOP, "the unit of a head or value is not known"),
    "wrong-dimension": (Severity.STOP, "a unit is known but measures something else"),
    "missing-value": (Severity.STOP, "a needed cell is empty"),
    "not-a-number": (Severity.STOP, "a cell that must hold a number holds something else"),
    "not-a-time": (Severity.STOP, "a cell that must hold a date and time holds something else"),
    "not-allowed": (Severity.STOP, "a value is outside what is physically or logically possible"),
    "duplicate": (Severity.STOP, "the same thing is entered twice"),
    "unknown-name": (Severity.STOP, "a run, vial, electrode or other name is used but never defined"),
    "unknown-species": (Severity.STOP, "an analyte is not in the table of species"),
    "unknown-key": (Severity.STOP, "a key of a settings file is not known"),
    "broken-settings": (Severity.STOP, "a settings file is not valid TOML"),
    "missing-calibration": (Severity.STOP, "a calibration named by the day cannot be found"),
    "missing-curve": (Severity.STOP, "a peak has no calibration curve"),
    "broken-curve": (Severity.STOP, "a calibration curve cannot be fitted or inverted"),
    "missing-standard": (Severity.STOP, "a vial has no usable internal standard"),
    "broken-trace": (Severity.STOP, "a potentiostat log cannot be integrated"),
    "anodic-run": (Severity.STOP, "the mean current of a run is not cathodic"),
    "broken-spectrum": (Severity.STOP, "an impedance spectrum cannot give a resistance"),
    "broken-scan": (Severity.STOP, "a voltammogram cannot give a charging current"),
    # --- warnings: a number may mislead ---
    "calibration-expired": (Severity.WARN, "a calibration is past its date of validity"),
    "above-calibration": (Severity.WARN, "a reading lies above the calibrated range"),
    "below-calibration": (Severity.WARN, "a reading lies below the calibrated range"),
    "curve-without-scatter": (
        Severity.WARN,
        "a curve has no standards to spare, so that its scatter is unknown",
    ),
    "propagation-not-validated": (
        Severity.NOTE,
        "draws give another interval than the law of propagation, by more than the digits shown",
    ),
    "standard-outlying": (Severity.WARN, "a standard lies too far from the curve through the others"),
    "curve-misfit": (Severity.WARN, "a curve lies further off its standards than their scatter explains"),
    "curve-bends": (Severity.WARN, "a quadratic fits the standards significantly better than the line"),
    "weights-suggested": (
        Severity.NOTE,
        "the scatter of the standards speaks for other weights; nothing was changed",
    ),
    "borrowed-curve": (Severity.WARN, "a curve was made like another analyte's by effective carbon numbers"),
    "signals-disagree": (Severity.WARN, "the signals of one analyte give different amounts"),
    "saturation-in-curve": (
        Severity.NOTE,
        "T1 was given for a signal that is read by a curve; no correction was made",
    ),
    "check-off": (Severity.WARN, "a check injection lies outside the limits of its curve"),
    "not-reconciled": (Severity.WARN, "the readings cannot be adjusted to the balance"),
    "no-limits": (Severity.WARN, "the detection limit of a curve cannot be found by the scheme chosen"),
    "no-curve": (Severity.WARN, "a signal has no curve in the calibration; proton counting was used"),
    "injection-left-out": (Severity.WARN, "an injection cannot be used and was left out"),
    "uncertainty-not-used": (Severity.WARN, "a declared uncertainty acts on nothing in this day"),
    "spectrum-unsteady": (Severity.WARN, "an impedance spectrum breaks the Kramers-Kronig relations"),
    "circuit-misfit": (Severity.WARN, "an impedance spectrum is not that of the circuit fitted to it"),
    "capacitances-apart": (
        Severity.WARN,
        "voltammograms and spectra of an electrode give capacitances far apart",
    ),
    "scan-left-out": (Severity.WARN, "the charging current of a scan has not settled; its rate was left out"),
    "scan-contaminated": (Severity.WARN, "a capacitance scan holds a current that is no double layer's"),
    "scan-rate-off": (Severity.WARN, "a scan rate as entered is not that of the record's own time"),
    "no-straight-line": (
        Severity.WARN,
        "charging currents follow a power law of the scan rate better than a line",
    ),
    "area-changed": (Severity.WARN, "the capacitance of an electrode changed between two sets of scans"),
    "resistance-missing": (Severity.WARN, "no solution resistance is given; 0 ohm was taken"),
    "flow-matters": (
        Severity.WARN,
        "the inlet flow was taken for the outlet's, and that moves a total by more than its interval",
    ),
    "no-products": (Severity.WARN, "a run has no gas peaks and no liquid readings"),
    "balance-open": (
        Severity.WARN,
        "the total Faradaic efficiency differs from 100 % by more than its uncertainty",
    ),
    "negative-amount": (Severity.WARN, "a reading below its blank or intercept gives a negative amount"),
    # --- notes: what was assumed or left aside ---
    "unread-column": (Severity.NOTE, "a column nobody knows was carried along unread"),
    "unread-table": (
        Severity.NOTE,
        "a file or sheet of the day folder is no table of a day and was left unread",
    ),
    "assumed-uncertainty": (
        Severity.NOTE,
        "nothing was declared about the uncertainty of a kind of reading; a usual one was taken",
    ),
    "assumed-default": (Severity.NOTE, "a value was not given; the default was taken"),
    "left-out": (Severity.NOTE, "a row marked unused was left out"),
    "several-channels": (Severity.NOTE, "a product was measured on several channels; the mean was taken"),
    "resistance-from-spectrum": (
        Severity.NOTE,
        "a run names no resistance; that of an impedance spectrum was taken",
    ),
    "capacitance-from-table": (Severity.NOTE, "the specific capacitance is that of the shipped table"),
    "window-chosen": (
        Severity.NOTE,
        "a window of a capacitance scan was chosen, for the whole scan is not clean",
    ),
    "leakage": (Severity.NOTE, "a leak exceeds the charging current of a capacitance scan; it cancels"),
    "lag-not-told": (
        Severity.NOTE,
        "the samples of a scan cannot tell whether its charging current has settled",
    ),
    "no-roughness": (Severity.NOTE, "an electrode has no roughness factor"),
}


def finding(
    kind: str, where: object, text: str, mend: str = "", *, found: str = "", expected: str = ""
) -> Finding:
    """A finding of a known kind; the kind sets the severity."""
    return Finding(KINDS[kind][0], kind, str(where), text, mend, found, expected)


class Findings:
    """Gathers the findings of a day in the order they were seen; equal ones are kept once."""

    def __init__(self, start: Iterable[Finding] = ()) -> None:
        self._seen: dict[Finding, None] = dict.fromkeys(start)

    def add(
        self, kind: str, where: object, text: str, mend: str = "", *, found: str = "", expected: str = ""
    ) -> None:
        """Note one finding; see `finding`."""
        self._seen.setdefault(finding(kind, where, text, mend, found=found, expected=expected))

    def extend(self, more: Iterable[Finding]) -> None:
        """Take over findings gathered elsewhere."""
        for one in more:
            self._seen.setdefault(one)

    def __iter__(self) -> Iterator[Finding]:
        return iter(self._seen)

    def __len__(self) -> int:
        return len(self._seen)

    @property
    def stops(self) -> tuple[Finding, ...]:
        """The faults among them."""
        return tuple(one for one in self if one.severity is Severity.STOP)

    def raise_stops(self) -> None:
        """Raise `DayFaults` with every fault gathered so far, if there is any."""
        if self.stops:
            raise DayFaults(tuple(self))


class DayFaults(Exception):
    """The day's data have faults; ``findings`` holds all of them (and the milder findings seen by then)."""

    def __init__(self, findings: tuple[Finding, ...]) -> None:
        self.findings = findings
        self.stops = tuple(one for one in findings if one.severity is Severity.STOP)
        super().__init__(
            f"{len(self.stops)} fault(s) in the day's data; the first: {self.stops[0].where}: "
            f"{self.stops[0].text}"
        )
