"""From typed tables to the records of a day, one function a table."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

from coulombook.balance.readings import Check, Flow, FlowKind, Peak, Run, Scan, Signal, Spectrum, Vial
from coulombook.findings import Findings
from coulombook.intake.files import advice, did_you_mean
from coulombook.intake.limits import MOST_ADVICE
from coulombook.intake.tables import TypedTable
from coulombook.species import Species, SpeciesTable, internal_standard_name

_ROLES = ("sample", "blank")

# What stands for a cell of runs that is blank and has no [defaults].
DEFAULT_TEMPERATURE_KELVIN = 298.15
DEFAULT_PRESSURE_PASCAL = 101325.0


class Names:
    """Species by the words of the tables; an unknown one is a fault at its first place, and counted once."""

    def __init__(self, species: SpeciesTable, findings: Findings) -> None:
        self._species = species
        self._findings = findings
        self._found: dict[str, Species | None] = {}
        self._reported: set[str] = set()

    def find(self, text: str) -> Species | None:
        """The species called ``text``, or None."""
        if text not in self._found:
            self._found[text] = self._species.find(text)
        return self._found[text]

    def standard(self, text: str) -> str:
        """The one name of an internal standard: a trade name, a usual name, or the words as written."""
        found = self.find(text)
        return found.name if found is not None else internal_standard_name(text)

    def required(self, table: TypedTable, place: int, text: str) -> str | None:
        """The trade name of an analyte, or None with a fault."""
        if not text:
            return None  # a blank cell or an absent column, told of where the table is read
        found = self.find(text)
        if found is not None:
            return found.name
        if text not in self._reported:
            self._reported.add(text)
            few = len(self._reported) <= MOST_ADVICE
            rows = table.words("analyte").count(text) if few else 0
            more = f" ({rows} rows)" if rows > 1 else ""
            self._findings.add(
                "unknown-species",
                table.where(place, "analyte"),
                "the analyte is not in the table of species",
                f"correct the name, or add a section [species.{text}] to day.toml"
                f"{advice(self._findings, 'unknown-species', text, self._species.names())}",
                found=f"'{text}'{more}",
                expected="a species by name, formula or alias",
            )
        return None


def _whole(table: TypedTable) -> Iterator[int]:
    """Places of the rows without a fault."""
    return (place for place in range(len(table)) if place not in table.broken)


def _number(values: Sequence[float | None], place: int, otherwise: float) -> float:
    value = values[place]
    return otherwise if value is None else value


def _flows(table: TypedTable, quantity: str) -> Callable[[int], Flow | None]:
    values, kinds = table.numbers(quantity), table.flow_kind(quantity)

    def flow(place: int) -> Flow | None:
        value, kind = values[place], kinds[place]
        return None if value is None or kind is None else Flow(value, FlowKind(kind))

    return flow


def runs(table: TypedTable, traces: Sequence[str]) -> tuple[Run, ...]:
    """Runs; ``traces`` holds the path of each row's trace."""
    if not {"run", "catalyst", "electrode", "electrode area", "ph"} <= table.columns.keys():
        return ()
    names, catalysts, electrodes = table.words("run"), table.words("catalyst"), table.words("electrode")
    levels, notes, started = table.words("level"), table.words("note"), table.instants("started")
    set_potentials, set_currents = table.numbers("set potential"), table.numbers("set current")
    starts, stops = table.numbers("start"), table.numbers("stop")
    areas, ph = table.numbers("electrode area"), table.numbers("ph")
    temperatures, pressures = table.numbers("temperature"), table.numbers("pressure")
    resistances, compensated = table.numbers("resistance"), table.numbers("compensated")
    inlet, outlet, tracer = (_flows(table, f"{which} flow") for which in ("inlet", "outlet", "tracer"))
    headspaces, uptakes = table.numbers("headspace"), table.numbers("carbonate uptake")
    return tuple(
        Run(
            name=names[place],
            catalyst=catalysts[place],
            electrode=electrodes[place],
            level=levels[place] or None,
            set_potential_volt=set_potentials[place],
            set_current_ampere=set_currents[place],
            started=started[place],
            trace=traces[place],
            start_second=starts[place],
            stop_second=stops[place],
            electrode_area_m2=_number(areas, place, 0.0),
            pH=_number(ph, place, 0.0),
            temperature_kelvin=_number(temperatures, place, DEFAULT_TEMPERATURE_KELVIN),
            pressure_pascal=_number(pressures, place, DEFAULT_PRESSURE_PASCAL),
            resistance_ohm=_number(resistances, place, 0.0),
            compensated=_number(compensated, place, 0.0),
            inlet_flow=inlet(place),
            outlet_flow=outlet(place),
            tracer_flow=tracer(place),
            headspace_m3=headspaces[place],
            carbonate_uptake_mol_per_s=_number(uptakes, place, 0.0),
            note=notes[place],
            origin=table.row_origin(place),
            resistance_given=resistances[place] is not None,
        )
        for place in _whole(table)
    )


def peaks(table: TypedTable, names: Names, channel_of: Callable[[str], str]) -> tuple[Peak, ...]:
    """Peaks of the gas injections; ``channel_of`` gives the one spelling of a channel."""
    runs, injections, channels = table.words("run"), table.words("injection"), table.words("channel")
    analytes, used = table.words("analyte"), table.yes_no("use", otherwise=True)
    times, areas = table.numbers("time"), table.numbers("peak area")
    found: list[Peak] = []
    for place in _whole(table):
        analyte = names.required(table, place, analytes[place])
        time, area = times[place], areas[place]
        if analyte is None or time is None or area is None:
            continue
        found.append(
            Peak(runs[place], injections[place], time, channel_of(channels[place]), analyte, area, used[place],
                 table.row_origin(place))
        )  # fmt: skip
    return tuple(found)


def vials(table: TypedTable, names: Names, findings: Findings) -> tuple[Vial, ...]:
    """Liquid samples and blanks."""
    own, runs, compartments = table.words("vial"), table.words("run"), table.words("compartment")
    standards, roles = table.words("standard"), table.words("role")
    used = table.yes_no("use", otherwise=True)
    times, volumes = table.numbers("time"), table.numbers("compartment volume")
    aliquots, amounts = table.numbers("aliquot"), table.numbers("standard amount")
    found: list[Vial] = []
    for place in range(len(table)):
        role = roles[place].casefold() or "sample"
        if role not in _ROLES:
            findings.add("not-allowed", table.where(place, "role"), "the role is not known",
                         f"write sample or blank{did_you_mean(role, _ROLES)}", found=f"'{roles[place]}'",
                         expected="sample or blank")  # fmt: skip
            continue
        blank = role == "blank"
        if not blank and used[place]:
            for quantity, given, known in (
                ("run", bool(runs[place]), "the run the sample was taken from"),
                ("compartment volume", volumes[place] is not None, "a number above zero"),
            ):
                told = quantity in table.unread or (place in table.broken and quantity in table.heads)
                if not given and not told:
                    findings.add("missing-value", table.where(place, quantity), f"the sample has no {quantity}",
                                 f"fill in the {quantity}, or mark the vial as a blank", found="nothing",
                                 expected=known)  # fmt: skip
        volume, aliquot, amount = volumes[place], aliquots[place], amounts[place]
        if volume is not None and aliquot is not None and aliquot > volume and used[place]:
            findings.add("not-allowed", table.where(place, "aliquot"),
                         "the aliquot is larger than the compartment it came from",
                         "correct the aliquot, the compartment volume, or their units",
                         found=f"{aliquot * 1e6:g} mL", expected=f"at most {volume * 1e6:g} mL")  # fmt: skip
        if place in table.broken or aliquot is None or amount is None:
            continue
        found.append(
            Vial(
                name=own[place],
                run=runs[place] or None,
                compartment=" ".join(compartments[place].split()).casefold(),
                time_second=times[place],
                compartment_volume_m3=volume,
                aliquot_m3=aliquot,
                standard=names.standard(standards[place]),
                standard_amount_mol=amount,
                blank=blank,
                used=used[place],
                origin=table.row_origin(place),
            )
        )
    return tuple(found)


def signals(
    table: TypedTable, standards: dict[str, str], names: Names, signal_of: Callable[[str], str]
) -> tuple[Signal, ...]:
    """Integrated signals; ``standards`` maps a vial to its standard, whose rows carry the standard's name."""
    vials, analytes, words = table.words("vial"), table.words("analyte"), table.words("signal")
    protons, integrals = table.numbers("protons"), table.numbers("integral")
    relaxation, repetition, flip = (table.numbers(head) for head in ("t1", "repetition time", "flip angle"))
    found: list[Signal] = []
    for place in _whole(table):
        text, standard = analytes[place], standards.get(vials[place])
        analyte: str | None
        if standard is not None and is_standard(text, standard, names):
            analyte = standard
        elif vials[place] not in standards and names.find(text) is None:
            continue  # the vial is unknown, and with it the name of its standard
        else:
            analyte = names.required(table, place, text)
        count, integral = protons[place], integrals[place]
        if analyte is None or count is None or integral is None:
            continue
        found.append(
            Signal(
                vials[place],
                analyte,
                signal_of(words[place]),
                count,
                integral,
                table.row_origin(place),
                relaxation[place],
                repetition[place],
                flip[place],
            )
        )
    return tuple(found)


def is_standard(text: str, standard: str, names: Names) -> bool:
    """Whether an analyte of ``liquid`` is the vial's internal standard."""
    return names.standard(text).casefold() == standard.casefold()


def scans(table: TypedTable) -> tuple[Scan, ...]:
    """Voltammograms for double-layer capacitance."""
    electrodes, files = table.words("electrode"), table.words("file")
    rates, areas, cycles = table.numbers("scan rate"), table.numbers("electrode area"), table.numbers("cycle")
    lows, highs = table.numbers("window low"), table.numbers("window high")
    purposes = table.words("purpose")
    found: list[Scan] = []
    for place in _whole(table):
        rate, area = rates[place], areas[place]
        if rate is None or area is None:
            continue
        found.append(
            Scan(electrodes[place], files[place].replace("\\", "/"), rate, area, cycles[place], lows[place],
                 highs[place], table.row_origin(place), " ".join(purposes[place].split()))
        )  # fmt: skip
    return tuple(found)


def spectra(table: TypedTable, findings: Findings) -> tuple[Spectrum, ...]:
    """Impedance spectra."""
    runs, electrodes = table.words("run"), table.words("electrode")
    files, purposes = table.words("file"), table.words("purpose")
    found: list[Spectrum] = []
    for place in _whole(table):
        if not runs[place] and not electrodes[place]:
            findings.add(
                "missing-value",
                table.where(place, "electrode"),
                "the spectrum has no run and no electrode",
                "fill in one of the two",
                found="nothing",
                expected="a run of runs, or an electrode",
            )
            continue
        found.append(
            Spectrum(runs[place] or None, electrodes[place] or None, files[place].replace("\\", "/"),
                     " ".join(purposes[place].split()), table.row_origin(place))
        )  # fmt: skip
    return tuple(found)


def checks(table: TypedTable, names: Names, channel_of: Callable[[str], str]) -> tuple[Check, ...]:
    """Check-gas injections."""
    times, channels, analytes = table.instants("at"), table.words("channel"), table.words("analyte")
    fractions, areas = table.numbers("mole fraction"), table.numbers("peak area")
    found: list[Check] = []
    for place in _whole(table):
        analyte = names.required(table, place, analytes[place])
        at, fraction, area = times[place], fractions[place], areas[place]
        if analyte is None or at is None or fraction is None or area is None:
            continue
        found.append(Check(at, channel_of(channels[place]), analyte, fraction, area, table.row_origin(place)))
    return tuple(found)
