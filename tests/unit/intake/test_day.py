"""The whole day folder: what is read, what is found missing, what is told."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from tests.unit.intake.conftest import MINIATURE, Change, Opened, Write

from coulombook.balance.readings import Flow, FlowKind
from coulombook.findings import DayFaults, Findings
from coulombook.intake.day import open_day

Open = Callable[..., Opened]
RUNS, GAS, VIALS, LIQUID = (MINIATURE[f"{name}.csv"] for name in ("runs", "gas", "vials", "liquid"))
TOML = MINIATURE["day.toml"]


def _with(table: str, head: str, *cells: str) -> str:
    """A table with one more column."""
    lines = table.splitlines()
    return "\n".join(f"{line},{cell}" for line, cell in zip(lines, (head, *cells), strict=True)) + "\n"


def test_the_day_in_miniature_is_read_whole_and_in_si(open_changed: Open) -> None:
    opened = open_changed()
    assert list(opened.findings) == []
    day = opened.source.day
    assert day is not None
    (run,) = day.runs
    assert (run.name, run.catalyst, run.electrode, run.level) == ("a1", "mesh", "m1", None)
    assert run.electrode_area_m2 == pytest.approx(1e-4)
    assert (run.temperature_kelvin, run.pressure_pascal, run.resistance_ohm) == (298.15, 101325.0, 10.0)
    assert run.inlet_flow == Flow(pytest.approx(20e-6 / 60), FlowKind.STANDARD)
    assert run.trace == "traces/a1.csv"
    assert [(peak.analyte, peak.peak_area, peak.time_second) for peak in day.peaks] == [
        ("carbon monoxide", 50.0, 1800.0),
        ("ethylene", 20.0, 1800.0),
    ]
    (vial,) = day.vials
    assert vial.compartment_volume_m3 == pytest.approx(30e-6)
    assert vial.aliquot_m3 == pytest.approx(0.5e-6)
    assert vial.standard_amount_mol == pytest.approx(0.2e-6)
    assert [(one.analyte, one.protons, one.integral) for one in day.signals] == [
        ("DMSO", 6, 600),
        ("formate", 1, 250),
    ]
    trace = opened.source.trace(run)
    np.testing.assert_allclose(trace.current_ampere, -0.01, rtol=1e-15)
    assert str(day.peaks[1].origin.of("peak area")) == "gas.csv, row 3, column 'peak area'"


def test_every_input_read_is_listed_once(open_changed: Open) -> None:
    source = open_changed().source
    assert sorted(map(source.label, source.files)) == sorted(MINIATURE)


def test_only_settings_runs_and_traces_are_needed(open_changed: Open) -> None:
    opened = open_changed(
        {
            "gas.csv": None,
            "vials.csv": None,
            "liquid.csv": None,
            "day.toml": '[reference]\npotential = "0 V"\n',
        }
    )
    assert opened.source.day is not None
    assert opened.source.day.peaks == ()


def test_defaults_taken_are_one_finding_a_column(open_changed: Open) -> None:
    runs = "run,catalyst,electrode,electrode area / cm^2,pH,temperature / degC,inlet flow / sccm\n"
    rows = "a1,mesh,m1,1,7,,20\na2,mesh,m1,1,7,30,20\na3,mesh,m1,1,7,,20\n"
    traces = {f"traces/a{number}.csv": MINIATURE["traces/a1.csv"] for number in (2, 3)}
    opened = open_changed({"runs.csv": runs + rows, **traces})
    assert sorted(opened.kinds) == ["assumed-default", "assumed-default", "resistance-missing"]
    texts = [one.text for one in opened.findings]
    assert "no temperature is given for 2 of 3 runs; 25 degC was taken" in texts
    assert opened.source.day is not None
    assert [run.temperature_kelvin for run in opened.source.day.runs] == [298.15, 303.15, 298.15]


def test_no_default_is_noted_for_a_column_whose_head_is_at_fault(open_changed: Open) -> None:
    runs = "run,catalyst,electrode,electrode area / cm^2,pH,temperature / J,inlet flow / sccm\n"
    rows = "a1,mesh,m1,1,7,22,20\na2,mesh,m1,1,7,22,20\n"
    opened = open_changed({"runs.csv": runs + rows, "traces/a2.csv": MINIATURE["traces/a1.csv"]})
    texts = [one.text for one in opened.findings]
    assert not any("no temperature is given" in text for text in texts)
    assert "no pressure is given for any run; 101.325 kPa was taken" in texts


def test_a_missing_flow_is_told_beside_every_head_there_is(open_changed: Open) -> None:
    opened = open_changed({"runs.csv": MINIATURE["runs.csv"].replace("inlet flow", "flow")})
    (fault,) = [one for one in opened.findings if one.kind == "missing-column"]
    assert "'flow / sccm'" in fault.found


def test_the_species_of_the_day_are_found_by_name_formula_or_alias(open_changed: Open) -> None:
    gas = "run,injection,time / s,channel,analyte,peak area\n" + "".join(
        f"a1,{number},1,FID,{name},1\n"
        for number, name in enumerate(["C2H4", "ethene", "ETHYLENE", " Ethylene "])
    )
    day = open_changed({"gas.csv": gas}).source.day
    assert day is not None
    assert {peak.analyte for peak in day.peaks} == {"ethylene"}


def test_channels_take_the_spelling_of_the_calibration(open_changed: Open) -> None:
    day = open_changed({"gas.csv": GAS.replace("FID", "fid")}).source.day
    assert day is not None
    assert {peak.channel for peak in day.peaks} == {"FID"}


def test_the_internal_standard_is_matched_by_any_of_its_names(open_changed: Open) -> None:
    for written in ("dmso", "Dimethyl sulfoxide"):
        day = open_changed({"liquid.csv": LIQUID.replace("DMSO", written)}).source.day
        assert day is not None
        assert day.signals[0].analyte == day.vials[0].standard == "DMSO"
    own = open_changed(
        {"liquid.csv": LIQUID.replace("DMSO", "my Salt"), "vials.csv": VIALS.replace("DMSO", "My salt")}
    )
    assert own.source.day is not None
    assert own.source.day.signals[0].analyte == own.source.day.vials[0].standard == "My salt"


def test_a_carrier_gas_may_have_peaks(open_changed: Open) -> None:
    day = open_changed({"gas.csv": GAS + "a1,1,1800,FID,N2,5\n"}).source.day
    assert day is not None
    assert day.peaks[-1].analyte == "nitrogen"


def test_a_blank_needs_no_run_and_no_compartment_volume(open_changed: Open) -> None:
    vials = _with(VIALS, "role", "sample") + "b1,,catholyte,,0.5,DMSO,0.2,Blank\n"
    day = open_changed({"vials.csv": vials, "liquid.csv": LIQUID + "b1,DMSO,CH3,6,600\n"}).source.day
    assert day is not None
    blank = day.vials[1]
    assert (blank.blank, blank.run, blank.compartment_volume_m3) == (True, None, None)


def test_a_trace_may_be_named_or_have_another_suffix(open_changed: Open) -> None:
    trace = MINIATURE["traces/a1.csv"]
    tabs = open_changed({"traces/a1.csv": None, "traces/a1.tsv": trace.replace(",", "\t")}).source
    assert tabs.day is not None
    assert tabs.day.runs[0].trace == "traces/a1.tsv"
    named = open_changed(
        {"runs.csv": _with(RUNS, "trace", r"logs\long.txt"), "traces/a1.csv": None, "logs/long.txt": trace}
    )
    assert named.source.day is not None
    assert named.source.trace(named.source.day.runs[0]).time_second.size == 3


def test_the_faults_of_a_trace_are_raised_when_it_is_read(open_changed: Open) -> None:
    source = open_changed({"traces/a1.csv": "t / s,E / V,I / mA\n0,x,-1\n1,-1,y\n"}).source
    assert source.day is not None
    with pytest.raises(DayFaults) as caught:
        source.trace(source.day.runs[0])
    assert [one.where for one in caught.value.stops] == [
        "traces/a1.csv, row 2, column 'E / V'",
        "traces/a1.csv, row 3, column 'I / mA'",
    ]


SCANS = "electrode,file,scan rate / mV s^-1,electrode area / cm^2\nm1,scans/m1.csv,20,1\n"


def test_a_voltammogram_is_read_through_its_row(open_changed: Open) -> None:
    source = open_changed({"scans.csv": SCANS, "scans/m1.csv": "E / V,I / mA\n0,1\n1,2\n"}).source
    assert source.day is not None
    (scan,) = source.day.scans
    assert scan.scan_rate_volt_per_second == pytest.approx(0.02)
    np.testing.assert_allclose(source.voltammogram(scan).current_ampere, [1e-3, 2e-3], rtol=1e-15)


FAULTS: list[tuple[dict[str, Change], str, str, str]] = [
    ({"runs.csv": None}, "missing-file", "runs.csv", "add runs.csv"),
    ({"day.toml": None}, "missing-file", "day.toml", "coulombook new"),
    ({"traces/a1.csv": None, "traces/a1x.csv": "x"}, "missing-file", "runs.csv, row 2", "did you mean 'a1x.csv'"),
    ({"liquid.csv": None}, "missing-file", "liquid.csv", "take vials away"),
    ({"vials.csv": None}, "missing-file", "vials.csv", "take liquid away"),
    ({"runs.csv": RUNS + RUNS.splitlines()[1]}, "duplicate", "runs.csv, row 3, column 'run'", "delete"),
    ({"runs.csv": RUNS.splitlines()[0] + "\n", "gas.csv": None, "vials.csv": None, "liquid.csv": None},
     "missing-value", "runs.csv, row 1", "add a row"),
    ({"vials.csv": VIALS + VIALS.splitlines()[1]}, "duplicate", "vials.csv, row 3, column 'vial'", "delete"),
    ({"gas.csv": GAS + "a1,1,1800,fid,carbon monoxide,5\n"}, "duplicate", "gas.csv, row 4, column 'analyte'", "delete"),
    ({"liquid.csv": LIQUID + "v1,HCOO-,ch,1,5\n"}, "duplicate", "liquid.csv, row 4, column 'analyte'", "delete"),
    ({"gas.csv": GAS + "a9,1,1800,FID,CO,5\n"}, "unknown-name", "gas.csv, row 4, column 'run'", "'a1'"),
    ({"vials.csv": VIALS.replace("v1,a1", "v1,a9")}, "unknown-name", "vials.csv, row 2, column 'run'", "'a1'"),
    ({"liquid.csv": LIQUID + "v9,formate,CH,1,5\n"}, "unknown-name", "liquid.csv, row 4, column 'vial'", "'v1'"),
    ({"gas.csv": GAS.replace("C2H4", "ethylne")}, "unknown-species", "gas.csv, row 3, column 'analyte'", "'ethylene'"),
    ({"liquid.csv": LIQUID.replace("formate", "fromate")}, "unknown-species", "liquid.csv, row 3, column 'analyte'",
     "'formate'"),
    ({"liquid.csv": LIQUID.replace("v1,DMSO,CH3,6,600\n", "")}, "missing-standard",
     "vials.csv, row 2, column 'standard'", "add the standard's signals"),
    ({"liquid.csv": LIQUID.replace("600", "0")}, "missing-standard",
     "liquid.csv, row 2, column 'integral'", "integrate"),
    ({"liquid.csv": LIQUID.replace("600", "-3")}, "missing-standard",
     "liquid.csv, row 2, column 'integral'", "integrate"),
    ({"vials.csv": VIALS.replace(",30,", ",,")}, "missing-value",
     "vials.csv, row 2, column 'compartment volume / mL'", "blank"),
    ({"vials.csv": VIALS.replace("DMSO,0.2", "DMSO,")}, "missing-value",
     "vials.csv, row 2, column 'standard amount / umol'", "fill in"),
    ({"vials.csv": VIALS.replace(",0.5,", ",50,")}, "not-allowed", "vials.csv, row 2, column 'aliquot / mL'", "units"),
    ({"vials.csv": _with(VIALS, "role", "blnk")}, "not-allowed", "vials.csv, row 2, column 'role'", "'blank'"),
    ({"runs.csv": RUNS.replace("inlet flow", "outlet flow")}, "missing-column", "runs.csv, row 1", "[defaults]"),
    ({"runs.csv": RUNS.replace(",10,20", ",10,")}, "missing-value",
     "runs.csv, row 2, column 'inlet flow / sccm'", "fill in"),
    ({"runs.csv": _with(_with(RUNS, "start / s", "100"), "stop / s", "100")}, "not-allowed",
     "runs.csv, row 2, column 'stop / s'", "correct either end"),
    ({"runs.csv": _with(RUNS, "compensated", "1.2")}, "not-allowed",
     "runs.csv, row 2, column 'compensated'", "correct"),
    ({"runs.csv": RUNS.replace("m1,1.0", "m1,-1")}, "not-allowed", "column 'electrode area / cm^2'", "correct"),
    ({"runs.csv": RUNS.replace(",25,", ",298.15,")}, "not-allowed", "column 'temperature / degC'", "unit in the head"),
    ({"runs.csv": RUNS.replace(",25,", ",0.25 C,")}, "not-a-number", "column 'temperature / degC'", "correct"),
    ({"gas.csv": GAS.replace("CO,50", "CO,-50")}, "not-allowed", "gas.csv, row 2, column 'peak area'", "correct"),
    ({"runs.csv": _with(RUNS, "trace", "../a1.csv")}, "outside-folder", "runs.csv, row 2, column 'trace'", "copy"),
    ({"runs.csv": _with(RUNS, "trace", "/etc/hostname")}, "outside-folder", "runs.csv, row 2, column 'trace'", "copy"),
    ({"runs.csv": _with(RUNS, "trace", "C:\\\\data\\\\a1.csv")}, "outside-folder", "column 'trace'", "copy"),
    ({"gas.tsv": GAS.replace(",", "\t")}, "two-sources", "gas.csv", "delete one"),
    ({"gas.csv": b"\0\1\2"}, "unreadable-file", "gas.csv", "save the file again"),
    ({"day.xlsx": b"PK\x03\x04 cut short"}, "unreadable-file", "day.xlsx", "save the workbook again"),
    ({"scans.csv": SCANS}, "missing-file", "scans.csv, row 2, column 'file'", "add the file"),
    ({"scans.csv": SCANS + SCANS.splitlines()[1], "scans/m1.csv": "x"}, "duplicate", "scans.csv, row 3", "delete"),
    ({"day.toml": TOML + '[surface]\nsmooth_reference = "m2"\n', "scans.csv": SCANS, "scans/m1.csv": "x"},
     "unknown-name", "key 'smooth_reference'", "'m1'"),
]  # fmt: skip


@pytest.mark.parametrize(("changes", "kind", "where", "mend"), FAULTS)
def test_a_broken_day_gives_one_fault_with_its_place_and_mend(
    open_changed: Open, changes: dict[str, Change], kind: str, where: str, mend: str
) -> None:
    opened = open_changed(changes)
    # the one mistake gives one fault, not a train of them
    assert [one.kind for one in opened.findings.stops] == [kind]
    fault = opened.one(kind)
    assert where in fault.where
    assert mend in fault.mend
    assert fault.found
    assert fault.expected
    assert opened.source.day is None


def test_faults_of_many_tables_are_gathered_together(open_changed: Open) -> None:
    opened = open_changed(
        {
            "day.toml": TOML.replace("outlet_flow", "outlet_flwo"),
            "runs.csv": RUNS.replace("6.8", "x"),
            "gas.csv": GAS.replace("CO,50", "CO,nan"),
            "liquid.csv": LIQUID.replace("formate", "fromate"),
            "calibrations/mini/standards.csv": MINIATURE["calibrations/mini/standards.csv"].replace(
                "ppm", "V"
            ),
        }
    )
    places = {one.where.split(",")[0] for one in opened.findings.stops}
    assert places == {"day.toml", "runs.csv", "gas.csv", "liquid.csv", "calibrations/mini/standards.csv"}


CHECKS = "at,channel,analyte,mole fraction / ppm,peak area\n2043-05-18T08:00:00,FID,CO,1000,100\n"


def test_checks_need_the_starting_time_of_runs_with_peaks(open_changed: Open) -> None:
    assert open_changed({"checks.csv": CHECKS}).one("missing-column").expected == "'started'"
    blank = open_changed({"checks.csv": CHECKS, "runs.csv": _with(RUNS, "started", "")})
    assert blank.one("missing-value").where == "runs.csv, row 2, column 'started'"
    day = open_changed(
        {"checks.csv": CHECKS, "runs.csv": _with(RUNS, "started", "2043-05-18T09:00")}
    ).source.day
    assert day is not None
    assert day.checks[0].mole_fraction == pytest.approx(1e-3)


def test_date_times_with_and_without_zone_are_not_mixed(open_changed: Open) -> None:
    opened = open_changed({"checks.csv": CHECKS, "runs.csv": _with(RUNS, "started", "2043-05-18T09:00Z")})
    assert opened.one("not-allowed").text == "date-times with and without a time zone are mixed"


@pytest.mark.parametrize(
    ("outlet", "needed"), [("measured", "outlet flow"), ("tracer", "tracer flow"), ("balance", None)]
)
def test_each_outlet_flow_needs_its_own_flow(open_changed: Open, outlet: str, needed: str | None) -> None:
    opened = open_changed({"day.toml": TOML.replace('"inlet"', f'"{outlet}"\ntracer = "nitrogen"')})
    assert [f"{needed} / sccm" in one.expected for one in opened.findings.stops] == ([True] if needed else [])


def test_a_table_of_unknown_name_is_noted_with_the_nearest(open_changed: Open) -> None:
    opened = open_changed({"gass.csv": GAS, "potentials.csv": "file,run\n"})
    assert [one.where for one in opened.findings if one.kind == "unread-table"] == [
        "gass.csv",
        "potentials.csv",
    ]
    assert next(iter(opened.findings)).mend == "did you mean 'gas'?"
    assert opened.source.day is not None


@pytest.mark.parametrize(
    "name", ["gas.csv", "day.toml", "runs.csv", "day.xlsx", "calibrations/mini/standards.csv"]
)
def test_a_link_out_of_the_folder_is_never_followed(write_day: Write, tmp_path: Path, name: str) -> None:
    folder = write_day()
    outside = tmp_path / "outside"
    outside.write_text(MINIATURE.get(name, ""), encoding="utf-8")
    (folder / name).unlink(missing_ok=True)
    (folder / name).symlink_to(outside)
    opened = Opened(folder)
    assert "outside-folder" in opened.kinds
    assert opened.source.day is None


def test_a_folder_that_is_not_there_is_a_fault(tmp_path: Path) -> None:
    findings = Findings()
    source = open_day(tmp_path / "none", [], findings)
    assert source.day is None
    assert [one.kind for one in findings] == ["missing-file"]


def test_nothing_but_reading_happens_in_the_folder(write_day: Write) -> None:
    folder = write_day()
    before = {path: path.stat().st_mtime_ns for path in folder.rglob("*")}
    Opened(folder)
    assert {path: path.stat().st_mtime_ns for path in folder.rglob("*")} == before


def test_unknown_columns_travel_with_the_day(open_changed: Open) -> None:
    day = open_changed({"gas.csv": _with(GAS, "operator's remark", "odd", "")}).source.day
    assert day is not None
    assert day.carried == {"gas": {"operator's remark": ("odd", "")}}
