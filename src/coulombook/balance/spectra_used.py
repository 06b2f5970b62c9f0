"""What the impedance spectra of a day say: resistances for runs, capacitances of electrodes."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from coulombook.balance.readings import Day, Run, Spectrum, SpectrumRecord
from coulombook.balance.scan_verdicts import set_name
from coulombook.balance.surface_plan import SurfacePlan
from coulombook.cell.impedance import CircuitFit
from coulombook.cell.kramers_kronig import SOUND, KramersKronig
from coulombook.findings import Findings
from coulombook.prose.numbers import with_uncertainty

# words of a purpose that keep a spectrum from the other use
_RESISTANCE, _CAPACITANCE = "resistance", "capacitance"
# ratio of two capacitances of one electrode above which they do not speak of the same thing (common practice, no
# source)
_APART = 2.0


@dataclass(frozen=True, slots=True, eq=False)
class SpectrumFigures:
    """What is taken from one spectrum, and the spectrum as it was read."""

    fit: CircuitFit
    check: KramersKronig | None  # None: too few points
    record: SpectrumRecord


@dataclass(frozen=True, slots=True)
class Resistance:
    """An uncompensated resistance from one or several spectra."""

    ohm: float
    u_ohm: float
    files: tuple[str, ...]


def gives_resistance(spectrum: Spectrum) -> bool:
    """Whether a spectrum may tell a resistance: its purpose is not capacitance alone."""
    return spectrum.purpose.casefold() != _CAPACITANCE


def spectra_of_run(day_spectra: Sequence[Spectrum], run: str, electrode: str) -> list[int]:
    """The spectra that know the resistance of a run: its own, or else those of its electrode that name no run."""
    able = [number for number, one in enumerate(day_spectra) if gives_resistance(one)]
    own = [number for number in able if day_spectra[number].run == run]
    return own or [
        number
        for number in able
        if day_spectra[number].run is None and day_spectra[number].electrode == electrode
    ]


def mean_resistance(fits: Sequence[CircuitFit], files: Sequence[str]) -> Resistance:
    """Mean over spectra; its uncertainty by their own, or by how far they scatter, whichever is larger."""
    n = len(fits)
    mean = sum(one.resistance_ohm for one in fits) / n
    u = math.sqrt(sum(one.u_resistance_ohm**2 for one in fits)) / n
    if n > 1:
        spread = math.sqrt(sum((one.resistance_ohm - mean) ** 2 for one in fits) / (n - 1) / n)
        u = max(u, spread)
    return Resistance(mean, u, tuple(files))


def use_spectra(day: Day, figures: Sequence[SpectrumFigures | None], findings: Findings) -> Day:
    """The day with resistances of spectra for the runs that name none; tell of them, and of doubtful spectra.

    ``figures`` are in the order of ``day.spectra``; None for a spectrum that could not be read.
    """
    for spectrum, one in zip(day.spectra, figures, strict=True):
        if one is not None:
            _report_doubts(spectrum, one, findings)

    def with_resistance(run: Run) -> Run:
        numbers = [] if run.resistance_given else spectra_of_run(day.spectra, run.name, run.electrode)
        fits = [one.fit for number in numbers if (one := figures[number]) is not None]
        if not fits:
            return run
        found = mean_resistance(fits, [day.spectra[number].file for number in numbers])
        findings.add(
            "resistance-from-spectrum",
            f"run {run.name}",
            f"no resistance is given; {with_uncertainty(found.ohm, found.u_ohm)} ohm was taken from "
            f"{', '.join(found.files)}",
            "give a resistance to use your own",
        )
        return replace(
            run,
            resistance_ohm=found.ohm,
            u_resistance_ohm=found.u_ohm,
            resistance_from=", ".join(found.files),
        )

    return replace(day, runs=tuple(map(with_resistance, day.runs)))


def _report_doubts(spectrum: Spectrum, one: SpectrumFigures, findings: Findings) -> None:
    where = f"{spectrum.file} ({spectrum.origin})"
    if one.check is not None and not one.check.sound:
        findings.add(
            "spectrum-unsteady",
            where,
            f"the spectrum breaks the Kramers-Kronig relations: residuals of {100 * one.check.residual:.2g} % that "
            f"follow each other (good spectra stay below {100 * SOUND:g} %)",
            "let the electrode come to rest, take a smaller amplitude, or end at a higher frequency",
        )
    if not one.fit.fits:
        findings.add(
            "circuit-misfit",
            where,
            f"a resistance and one constant-phase element miss the spectrum by {100 * one.fit.misfit:.2g} %; its "
            "resistance was taken from the highest frequencies where these fit, its capacitances mean little",
            "end at a frequency above the second process",
        )


def electrode_of(spectrum: Spectrum, day: Day) -> str | None:
    """The electrode of a spectrum: as given, or that of its run."""
    if spectrum.electrode is not None:
        return spectrum.electrode
    return next((run.electrode for run in day.runs if run.name == spectrum.run), None)


@dataclass(frozen=True, slots=True)
class ImpedanceCapacitance:
    """Mean capacitances of an electrode by its spectra. [F]"""

    brug_farad: float
    hsu_mansfeld_farad: float  # NaN where an electrode is blocking


def impedance_capacitances(
    day: Day, figures: Sequence[SpectrumFigures | None]
) -> dict[tuple[str, str], ImpedanceCapacitance]:
    """Capacitances by electrode and purpose; a purpose that only names a use counts as none."""
    groups: dict[tuple[str, str], list[CircuitFit]] = {}
    for spectrum, one in zip(day.spectra, figures, strict=True):
        electrode = electrode_of(spectrum, day)
        word = spectrum.purpose.casefold()
        if one is None or electrode is None or word == _RESISTANCE:
            continue
        purpose = "" if word == _CAPACITANCE else spectrum.purpose
        groups.setdefault((electrode, purpose), []).append(one.fit)
    return {
        key: ImpedanceCapacitance(
            sum(fit.brug_farad for fit in fits) / len(fits),
            sum(fit.hsu_mansfeld_farad for fit in fits) / len(fits),
        )
        for key, fits in groups.items()
    }


def capacitances_of_sets(
    surface: SurfacePlan, found: Mapping[tuple[str, str], ImpedanceCapacitance]
) -> list[ImpedanceCapacitance | None]:
    """What spectra say of each set of scans: those of the same purpose, or those of none."""
    return [found.get(owner, found.get((owner[0], ""))) for owner in surface.owners]


def report_capacitances(
    surface: SurfacePlan, found: Mapping[tuple[str, str], ImpedanceCapacitance], findings: Findings
) -> None:
    """Tell of electrodes whose voltammograms and spectra give capacitances far apart."""
    for number, one in enumerate(capacitances_of_sets(surface, found)):
        slope = surface.fits[number].capacitance_farad
        if one is None or not slope > 0.0:
            continue
        ratio = slope / one.brug_farad
        if not 1.0 / _APART <= ratio <= _APART:
            findings.add(
                "capacitances-apart",
                f"electrode {set_name(*surface.owners[number])}",
                f"its voltammograms give {slope * 1e3:.3g} mF, its spectra {one.brug_farad * 1e3:.3g} mF by Brug's "
                f"equation and {one.hsu_mansfeld_farad * 1e3:.3g} mF by Hsu and Mansfeld's",
                "check the potential and the frequencies of the spectra, and the window of the scans",
            )
