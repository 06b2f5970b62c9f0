"""Calibration folders."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from pathlib import Path

import numpy as np
import pytest
from tests.unit.intake.conftest import MINIATURE, Opened, Write

from coulombook.balance.readings import Calibration, CurveOptions

Open = Callable[..., Opened]
STANDARDS = MINIATURE["calibrations/mini/standards.csv"]


def _calibrated(open_changed: Open, toml: str, standards: str = STANDARDS) -> Opened:
    return open_changed(
        {"calibrations/mini/calibration.toml": toml, "calibrations/mini/standards.csv": standards}
    )


def _only(opened: Opened) -> Calibration:
    assert opened.source.day is not None, list(opened.findings)
    (one,) = opened.source.day.calibrations
    return one


def test_standards_are_gathered_by_channel_and_species_in_si(open_changed: Open) -> None:
    standards = STANDARDS + "fid,C2H4,50,10\n"
    one = _only(
        _calibrated(
            open_changed, 'kind = "gas"\nmeasured_on = 2043-04-02\nvalid_until = 2043-10-02\n', standards
        )
    )
    assert (one.name, one.kind, one.measured_on, one.valid_until) == (
        "mini",
        "gas",
        date(2043, 4, 2),
        date(2043, 10, 2),
    )
    carbon_monoxide, ethylene = one.standards
    assert (carbon_monoxide.channel, carbon_monoxide.analyte) == ("FID", "carbon monoxide")
    np.testing.assert_allclose(ethylene.x, [1e-4, 1e-3, 5e-5], rtol=1e-15)
    np.testing.assert_array_equal(ethylene.y, [20, 200, 10])
    assert ethylene.u_x is None
    assert ethylene.parent is None
    assert (
        str(ethylene.origins[0].of("peak area"))
        == "calibrations/mini/standards.csv, row 4, column 'peak area'"
    )
    assert not ethylene.x.flags.writeable


def test_options_of_one_curve_override_those_of_all_by_any_alias(open_changed: Open) -> None:
    general = 'kind = "gas"\n[curve]\nform = "line through zero"\nweights = "1/x"\n'
    toml = general + '[curve."Ethene@fid"]\nform = "quadratic"\n'
    carbon_monoxide, ethylene = _only(_calibrated(open_changed, toml)).standards
    assert carbon_monoxide.options == CurveOptions("line through zero", "1/x", "ISO 11843-2", None)
    assert ethylene.options == CurveOptions("quadratic", "1/x", "ISO 11843-2", None)


def test_a_curve_like_another_has_no_points_of_its_own(open_changed: Open) -> None:
    toml = 'kind = "gas"\n[curve."ethane@FID"]\nlike = "C2H4@fid"\n'
    ethane = _only(_calibrated(open_changed, toml)).standards[-1]
    assert (ethane.channel, ethane.analyte, ethane.x.size) == ("FID", "ethane", 0)
    assert ethane.options.like == "ethylene@FID"


def test_uncertainties_and_parents_of_standards(open_changed: Open) -> None:
    standards = (
        "channel;analyte;mole fraction / ppm;u(mole fraction) / ppm;peak area / pA s;parent;u(parent) / %\n"
        "FID;CO;100;0,5;10;C-1;0,5\nFID;CO;1000;5;100;;\n"
    )
    (one,) = _only(_calibrated(open_changed, 'kind = "gas"\n', standards)).standards
    assert one.u_x is not None
    np.testing.assert_allclose(one.u_x, [5e-7, 5e-6], rtol=1e-15)
    assert one.parent == ("C-1", "")
    assert one.u_parent is not None
    np.testing.assert_allclose(one.u_parent, [0.005, 0.0], rtol=1e-15)


def test_liquid_standards_are_gathered_by_analyte_and_signal(open_changed: Open) -> None:
    standards = (
        "analyte,signal,amount ratio,integral ratio\nformate,CH,1,0.99\nHCOO-,ch,2,1.99\nethanol,CH3,1,1\n"
    )
    one = _only(_calibrated(open_changed, 'kind = "liquid"\n', standards))
    assert [(curve.analyte, curve.channel, curve.x.size) for curve in one.standards] == [
        ("formate", "CH", 2),
        ("ethanol", "CH3", 1),
    ]


@pytest.mark.parametrize(
    ("toml", "kind", "mend"),
    [
        ('kind = "gass"\n', "not-allowed", "'gas'"),
        ("measured_on = 2043-04-02\n", "missing-value", "'kind'"),
        ('kind = "gas"\nvalid_untl = 2043-04-02\n', "unknown-key", "'valid_until'"),
        ('kind = "gas"\nvalid_until = "soon"\n', "not-a-time", "correct"),
        ('kind = "gas"\n[curve]\nform = "linear"\n', "not-allowed", "correct"),
        ('kind = "gas"\n[curve]\nwieghts = "1/x"\n', "unknown-key", "'weights'"),
        ('kind = "gas"\n[curve."ethylne@FID"]\nform = "line"\n', "unknown-species", "'ethylene'"),
        ('kind = "gas"\n[curve.ethylene]\nform = "line"\n', "unknown-key", "'@'"),
        ('kind = "gas"\n[curve."methane@FID"]\nform = "line"\n', "unknown-name", "like"),
        ('kind = "gas"\n[curve."ethane@FID"]\nlike = "methane@FID"\n', "unknown-name", "standards.csv"),
        ('kind = "gas"\n[curve."ethane@TCD"]\nlike = "ethylene@FID"\n', "not-allowed", "same channel"),
        ('kind = "gas"\n[curve."ethylene@FID"]\nlike = "CO@FID"\n', "not-allowed", "delete"),
        ("kind = \n", "broken-settings", "correct"),
    ],
)
def test_a_fault_of_the_settings_names_what_would_do(
    open_changed: Open, toml: str, kind: str, mend: str
) -> None:
    opened = _calibrated(open_changed, toml)
    fault = opened.one(kind)
    assert fault.where.startswith("calibrations/mini/calibration.toml")
    assert mend in fault.mend
    assert opened.source.day is None


@pytest.mark.parametrize(
    ("standards", "kind"),
    [
        (STANDARDS.replace("100,10\n", "x,10\n"), "not-a-number"),
        (STANDARDS.replace("/ ppm", "/ mol"), "wrong-dimension"),
        (STANDARDS.replace(",peak area", ",peak hight"), "missing-column"),
        (STANDARDS.replace("ethylene", "ethylne"), "unknown-species"),
        (STANDARDS.splitlines()[0] + "\n", "missing-value"),
        ("", "unreadable-file"),
        ("\0", "unreadable-file"),
    ],
)
def test_a_fault_of_the_standards_names_their_file(open_changed: Open, standards: str, kind: str) -> None:
    opened = _calibrated(open_changed, 'kind = "gas"\n', standards)
    faults = [one for one in opened.findings if one.kind == kind]
    assert faults
    assert all(one.where.startswith("calibrations/mini/standards.csv") for one in faults)
    assert opened.source.day is None


def test_a_curve_gives_the_uncertainty_of_every_standard_or_of_none(open_changed: Open) -> None:
    heads = "channel,analyte,mole fraction / ppm,u(mole fraction) / ppm,peak area\n"
    standards = heads + "FID,CO,100,1,10\nFID,CO,1000,,100\n"
    fault = _calibrated(open_changed, 'kind = "gas"\n', standards + "FID,C2H4,1,,1\n").one("missing-value")
    assert "row 3, column 'u(mole fraction) / ppm'" in fault.where


def test_one_cylinder_has_one_uncertainty(open_changed: Open) -> None:
    heads = "channel,analyte,mole fraction / ppm,peak area,parent,u(parent) / %\n"
    standards = heads + "FID,CO,100,10,C,1\nFID,CO,1000,100,C,2\n"
    assert "'C'" in _calibrated(open_changed, 'kind = "gas"\n', standards).one("not-allowed").text


def test_calibrations_are_looked_for_in_the_day_first(write_day: Write, tmp_path: Path) -> None:
    other, third = tmp_path / "other", tmp_path / "third"
    for place, form in ((other, "quadratic"), (third, "line")):
        for name in ("mini", "more"):
            (place / name).mkdir(parents=True)
            (place / name / "calibration.toml").write_text(
                f'kind = "gas"\n[curve]\nform = "{form}"\n', encoding="utf-8"
            )
            text = (
                STANDARDS if name == "mini" else "channel,analyte,mole fraction / ppm,peak area\nTCD,H2,1,1\n"
            )
            (place / name / "standards.csv").write_text(text, encoding="utf-8")
    folder = write_day({"day.toml": MINIATURE["day.toml"].replace('"mini"', '"mini", "more"')})
    opened = Opened(folder, other, third)
    assert opened.source.day is not None
    forms = [one.standards[0].options.form for one in opened.source.day.calibrations]
    assert forms == ["line through zero", "quadratic"]
    labels = {opened.source.label(path) for path in opened.source.files}
    assert {
        "calibrations/mini/standards.csv",
        "calibrations/more/standards.csv",
        "gas.csv",
        "traces/a1.csv",
    } <= labels


def test_a_missing_calibration_names_where_it_was_looked_for(write_day: Write, tmp_path: Path) -> None:
    folder = write_day({"day.toml": MINIATURE["day.toml"].replace('"mini"', '"mnii"')})
    fault = Opened(folder, tmp_path / "elsewhere").one("missing-calibration")
    assert fault.found == "'mnii'"
    assert "<day>/calibrations" in fault.expected
    assert "elsewhere" in fault.expected
    assert "did you mean 'mini'" in fault.mend


def test_a_calibration_folder_that_is_a_link_out_of_the_day_is_refused(
    write_day: Write, tmp_path: Path
) -> None:
    folder = write_day()
    (folder / "calibrations" / "mini").rename(tmp_path / "mini")
    (folder / "calibrations" / "mini").symlink_to(tmp_path / "mini")
    assert Opened(folder).one("outside-folder").found == "'mini'"


@pytest.mark.parametrize(("day", "kinds"), [("2043-10-02", []), ("2043-10-03", ["calibration-expired"])])
def test_an_expired_calibration_is_a_finding_not_a_fault(
    open_changed: Open, day: str, kinds: list[str]
) -> None:
    opened = open_changed(
        {
            "day.toml": MINIATURE["day.toml"].replace("[day]\n", f"[day]\ndate = {day}\n"),
            "calibrations/mini/calibration.toml": 'kind = "gas"\nvalid_until = 2043-10-02\n',
        }
    )
    assert opened.kinds == kinds
    assert opened.source.day is not None


def test_two_calibrations_of_one_curve_are_a_fault(open_changed: Open) -> None:
    opened = open_changed(
        {
            "day.toml": MINIATURE["day.toml"].replace('"mini"', '"mini", "twin"'),
            "calibrations/twin/calibration.toml": 'kind = "gas"\n',
            "calibrations/twin/standards.csv": STANDARDS.splitlines()[0] + "\nfid,C2H4,1,1\nfid,C2H4,2,2\n",
        }
    )
    assert "'mini' and 'twin'" in opened.one("duplicate").found
