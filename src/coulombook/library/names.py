"""What a curve or calibration typed on the command line means."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date

from coulombook.intake.files import did_you_mean
from coulombook.library.shelf import Entry, Library, newest
from coulombook.species import SpeciesTable

MOST_LISTED = 12


class UnknownCurve(Exception):
    """A name that finds nothing, or too much; the message says what would do."""


@dataclass(frozen=True, slots=True)
class Asked:
    """What was asked for: ``calibrations`` alone, or the ``entries`` of one curve or of several.

    ``chosen`` is False where the curve was named without its calibration, so that ``entries`` is every one there is.
    """

    calibrations: tuple[str, ...]
    entries: tuple[Entry, ...]
    chosen: bool


def asked_for(library: Library, names: Sequence[str], species: SpeciesTable, on: date) -> Asked:
    """Calibrations and curves that names mean.

    A name is a calibration, or a curve: analyte@channel (analyte by any name or formula, channel without regard to
    case), the analyte alone where it has one channel only, or calibration/analyte@channel. One curve beside
    calibrations means the curve as each of them has it; several curves mean each as the newest calibration has it.

    Raises
    ------
    UnknownCurve
        A name means nothing, more than one curve, or does not go with the others.
    """
    calibrations = [one.name for one in library.calibrations]
    wanted = [name for name in names if name in calibrations]
    curves = [_named(library, name, species) for name in names if name not in calibrations]
    if not curves:
        return Asked(tuple(wanted), (), True)
    if len(curves) == 1 and wanted:
        by_name = {one.calibration.name: one for one in _same(library, curves[0])}
        missing = [one for one in wanted if one not in by_name]
        if missing:
            raise UnknownCurve(f"calibration '{missing[0]}' has no curve {curves[0][0].name}")
        return Asked((), tuple(by_name[one] for one in dict.fromkeys(wanted)), True)
    if wanted:
        raise UnknownCurve("name curves, or one curve and calibrations, or calibrations alone")
    if len(curves) == 1:
        return Asked((), tuple(curves[0]), len(curves[0]) == 1)
    entries = tuple(newest(one, on) for one in curves)
    if len(set(map(id, entries))) < len(entries):
        raise UnknownCurve("the same curve is named twice")
    return Asked((), entries, True)


def _same(library: Library, some: Sequence[Entry]) -> list[Entry]:
    return [one for one in library.entries if one.key == some[0].key]


def _named(library: Library, name: str, species: SpeciesTable) -> list[Entry]:
    """Every entry of the one curve that a name means."""
    calibration, slash, rest = name.partition("/")
    if slash and "@" not in calibration:
        if calibration not in {one.name for one in library.calibrations}:
            raise UnknownCurve(_no("calibration", calibration, [one.name for one in library.calibrations]))
        among, text = library.of(calibration), rest
    else:
        among, text = library.entries, name
    analyte, at, channel = text.rpartition("@")
    if not at:
        analyte, channel = text, ""
    known = species.find(analyte)
    called = known.name if known else " ".join(analyte.split()).casefold()
    key = " ".join(channel.split()).casefold()
    found = [one for one in among if one.standards.analyte == called and (not at or one.key[1] == key)]
    curves = list(dict.fromkeys(one.key for one in found))
    if not found:
        places = [one.name for one in among]
        what = "curve" if at else "curve or calibration"
        raise UnknownCurve(_no(what, text, [*places, *(one.name for one in library.calibrations)]))
    if len(curves) > 1:
        choices = ", ".join(f"'{one}'" for one in dict.fromkeys(one.name for one in found))
        raise UnknownCurve(f"'{text}' is measured on several channels or signals; name one: {choices}")
    return found


def _no(what: str, name: str, known: Iterable[str]) -> str:
    places = list(dict.fromkeys(known))
    listed = ", ".join(places[:MOST_LISTED]) + (", ..." if len(places) > MOST_LISTED else "")
    hint = did_you_mean(name, places) or (f"; there are: {listed}" if places else "")
    return f"there is no {what} '{name}'{hint}"
