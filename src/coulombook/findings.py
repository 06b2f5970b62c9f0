"""Findings: what the reader of a day should know, and where in the files it was seen.

A finding of severity *stop* is a fault of the day's data: every fault is gathered, nothing is written,
and all of them are shown together. *warn* means a number may mislead; *note* means something was assumed.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from enum import StrEnum

# A finding takes half a kilobyte; nobody reads ten thousand, and a hostile table would bring a million.
MOST_OF_A_KIND = 10_000


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
# The meaning stands beside the kind in the list of `coulombook why`, which is 80 columns wide.
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
    "not-a-time": (Severity.STOP, "a cell that must hold a date and time does not"),
    "not-allowed": (Severity.STOP, "a value is outside what is possible"),
    "duplicate": (Severity.STOP, "the same thing is entered twice"),
    "unknown-name": (Severity.STOP, "a name (run, vial, electrode) is used but not defined"),
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
    "curve-without-scatter": (Severity.WARN, "a curve has no standards to spare for its scatter"),
    "propagation-not-validated": (Severity.NOTE, "draws give another interval than propagation"),
    "standard-outlying": (Severity.WARN, "a standard lies too far off the others' curve"),
    "curve-misfit": (Severity.WARN, "a curve misses its standards by more than scatter"),
    "curve-bends": (Severity.WARN, "a quadratic fits the standards better than the line"),
    "weights-suggested": (Severity.NOTE, "the scatter of standards speaks for other weights"),
    "borrowed-curve": (Severity.WARN, "a curve was scaled from another analyte's"),
    "signals-disagree": (Severity.WARN, "the signals of one analyte give different amounts"),
    "saturation-in-curve": (Severity.NOTE, "T1 of a signal read by a curve corrects nothing"),
    "check-off": (Severity.WARN, "a check injection lies outside the limits of its curve"),
    "not-reconciled": (Severity.WARN, "the readings cannot be adjusted to the balance"),
    "no-limits": (Severity.WARN, "the detection limit of a curve cannot be found"),
    "no-curve": (Severity.WARN, "a signal has no curve; proton counting was used"),
    "injection-left-out": (Severity.WARN, "an injection cannot be used and was left out"),
    "uncertainty-not-used": (Severity.WARN, "a declared uncertainty acts on nothing in this day"),
    "spectrum-unsteady": (Severity.WARN, "an impedance spectrum breaks Kramers-Kronig"),
    "circuit-misfit": (Severity.WARN, "an impedance spectrum does not fit its circuit"),
    "capacitances-apart": (Severity.WARN, "scans and spectra give capacitances far apart"),
    "scan-left-out": (Severity.WARN, "the charging current of a scan has not settled"),
    "scan-contaminated": (Severity.WARN, "a capacitance scan holds a current of another kind"),
    "scan-rate-off": (Severity.WARN, "a scan rate is not that of the record's own time"),
    "no-straight-line": (Severity.WARN, "charging currents follow a power law, not a line"),
    "area-changed": (Severity.WARN, "the capacitance of an electrode has changed"),
    "resistance-missing": (Severity.WARN, "no solution resistance is given; 0 ohm was taken"),
    "flow-matters": (Severity.WARN, "inlet flow taken for outlet flow moves a total"),
    "no-products": (Severity.WARN, "a run has no gas peaks and no liquid readings"),
    "balance-open": (Severity.WARN, "the total lies off 100 % beyond its uncertainty"),
    "transport-limit": (Severity.WARN, "partial currents fall off as transport would limit them"),
    "log-gap": (Severity.WARN, "a log has no readings for a part of its run's window"),
    "negative-amount": (Severity.WARN, "a reading below blank or intercept gives an amount < 0"),
    "open-runs-compared": (Severity.WARN, "runs whose balance does not close count in a comparison"),
    "no-replicates": (Severity.WARN, "no catalyst of a comparison has replicates"),
    "scatter-apart": (Severity.WARN, "replicates scatter more than those of the others"),
    # --- notes: what was assumed or left aside ---
    "unread-column": (Severity.NOTE, "a column nobody knows was carried along unread"),
    "unread-table": (Severity.NOTE, "a file or sheet is no table of a day; left unread"),
    "lines-passed-over": (Severity.NOTE, "lines of a file that hold no row were passed over"),
    "units-row": (Severity.NOTE, "units were taken from the row under the heads"),
    "numbers-interpreted": (Severity.NOTE, "numbers in an unusual writing were interpreted"),
    "clock-read": (Severity.NOTE, "the times of a log are a clock's; made seconds"),
    "clock-jump": (Severity.NOTE, "the clock of a log jumped; its time goes on"),
    "times-repeated": (Severity.NOTE, "readings of a log share a time"),
    "last-line-cut": (Severity.NOTE, "the last line of a log is or may be cut short"),
    "merged-cells": (Severity.NOTE, "a cell spans rows; its value was taken for each"),
    "hidden-sheet": (Severity.NOTE, "something hidden in a workbook was read"),
    "date-from-number": (Severity.NOTE, "a date-time stands as a number in a workbook"),
    "assumed-uncertainty": (Severity.NOTE, "no uncertainty is declared; a usual one was taken"),
    "assumed-default": (Severity.NOTE, "a value was not given; the default was taken"),
    "left-out": (Severity.NOTE, "a row marked unused was left out"),
    "several-channels": (Severity.NOTE, "a product was measured on several channels"),
    "resistance-from-spectrum": (Severity.NOTE, "a run's resistance is that of a spectrum"),
    "capacitance-from-table": (Severity.NOTE, "the specific capacitance is the shipped table's"),
    "window-chosen": (Severity.NOTE, "a clean window of a capacitance scan was chosen"),
    "leakage": (Severity.NOTE, "a leak exceeds the charging current; it cancels"),
    "lag-not-told": (Severity.NOTE, "the samples cannot tell if a scan has settled"),
    "falls-away": (Severity.NOTE, "a partial current falls away from its line"),
    "drifting-run": (Severity.NOTE, "the products of a run drift over its injections"),
    "no-roughness": (Severity.NOTE, "an electrode has no roughness factor"),
    "levels-apart": (Severity.NOTE, "catalysts at one level lie at different potentials"),
    "not-compared": (Severity.NOTE, "a catalyst lacks what one of the comparisons needs"),
}


def finding(
    kind: str, where: object, text: str, mend: str = "", *, found: str = "", expected: str = ""
) -> Finding:
    """A finding of a known kind; the kind sets the severity."""
    return Finding(KINDS[kind][0], kind, str(where), text, mend, found, expected)


class Findings:
    """Gathers the findings of a day in the order they were seen; equal ones are kept once.

    Of one kind `MOST_OF_A_KIND` are kept; the others are counted, and told of in one finding at the end.
    """

    def __init__(self, start: Iterable[Finding] = ()) -> None:
        self._seen: dict[Finding, None] = {}
        self._kept: dict[str, int] = {}
        self._more: dict[str, int] = {}
        self.extend(start)

    def add(
        self, kind: str, where: object, text: str, mend: str = "", *, found: str = "", expected: str = ""
    ) -> None:
        """Note one finding; see `finding`."""
        self.extend((finding(kind, where, text, mend, found=found, expected=expected),))

    def extend(self, more: Iterable[Finding]) -> None:
        """Take over findings gathered elsewhere."""
        for one in more:
            if one in self._seen:
                continue
            if self.is_full(one.kind):
                self._more[one.kind] = self._more.get(one.kind, 0) + 1
            else:
                self._seen[one] = None
                self._kept[one.kind] = self._kept.get(one.kind, 0) + 1

    def kept(self, kind: str) -> int:
        """How many findings of a kind are kept."""
        return self._kept.get(kind, 0)

    def is_full(self, kind: str) -> bool:
        """Whether findings of a kind are only counted by now, so that nothing need be spent on their words."""
        return self.kept(kind) >= MOST_OF_A_KIND

    def _counted(self) -> Iterator[Finding]:
        for kind, count in self._more.items():
            yield finding(
                kind,
                "further places",
                "more findings of this kind were counted, and not kept",
                "mend those that are shown first",
                found=f"{count} more",
                expected=f"at most {MOST_OF_A_KIND} findings of one kind",
            )

    def __iter__(self) -> Iterator[Finding]:
        yield from self._seen
        yield from self._counted()

    def __len__(self) -> int:
        return len(self._seen) + len(self._more)

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
