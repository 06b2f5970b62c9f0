"""The library of curves on the terminal: all of them, one of them, and one against another.

Words say what colour repeats. Uncertainties are standard ones (k = 1), in brackets.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from datetime import date

import numpy as np
from rich.console import Console
from rich.text import Text

from coulombook.balance.readings import Calibration
from coulombook.compare.curve_drift import Change, SlopeRatio
from coulombook.curves.judgement import ADEQUATE_GOODNESS, Judgement
from coulombook.library.answer import Answer
from coulombook.library.history import Comparison
from coulombook.library.picture import axis_heads, picture, reading_scatter
from coulombook.library.shelf import Entry, Library, Validity, Verdict, validity
from coulombook.prose.numbers import ABSENT, between, brief, fixed, plain, with_uncertainty
from coulombook.prose.text import crop, visible
from coulombook.report.checks_view import show_checks
from coulombook.report.curve_plot import legend, terminal_plot
from coulombook.report.grid import GAP, Column, grid
from coulombook.report.terminal import hanging

HOW_TO_READ = "1.880(12) is 1.880 with a standard uncertainty (k = 1) of 0.012."
LONGEST_NAME = 26
_LABEL = 12  # columns before what is said of a curve
_PERCENT = 100.0

_FORM = {"line through zero": "through zero"}
_STYLE = {
    Verdict.SOUND: "green",
    Verdict.NO_CURVE: "red",
    Validity.VALID: "green",
    Validity.NO_END: "green",
}
_OTHERWISE = "yellow"
_MEANING = {
    Verdict.NO_CURVE: "the standards give no curve",
    Verdict.UNKNOWN: "no standards to spare, so that the scatter is unknown",
    Verdict.MISFIT: "the standards lie further off than their scatter explains",
    Verdict.FLAT: "the slope is not certainly above zero all over the range",
    Verdict.BENDS: "a quadratic fits significantly better",
    Verdict.UNEVEN: "other weights would suit the scatter better",
    Verdict.OUTLIER: "one standard does not belong to the others",
    Verdict.BORROWED: "made like another analyte's curve",
    Verdict.UNTESTED: "too few standards for any test",
}


def show_answer(found: Answer, library: Library, console: Console, on: date) -> None:
    """Print what was asked for."""
    if found.listed:
        show_library(library, console, on, found.listed)
    if found.entry is not None:
        show_curve(found.entry, console, on)
    if found.comparison is not None:
        if found.entry is not None:
            console.print()
        show_comparison(found.comparison, console)
    if found.pairs:
        show_calibrations_compared(found.pairs, found.alone, console)
    if found.checks is not None:
        show_checks(found.checks, console)
    if found.remark:
        console.print()
        hanging("", f"{found.remark[0].upper()}{found.remark[1:]}.", console)


# --- all of them


def show_library(library: Library, console: Console, on: date, calibrations: Sequence[str]) -> None:
    """Print the curves of some calibrations, a table for each."""
    chosen = [one for one in library.calibrations if one.name in calibrations]
    for place, one in enumerate(chosen):
        if place:
            console.print()
        console.print(_heading(one, on))
        _show_table(library.of(one.name), console)
    verdicts = {one.verdict for calibration in chosen for one in library.of(calibration.name)}
    meanings = [f"{one}: {meaning}" for one, meaning in _MEANING.items() if one in verdicts]
    if meanings:
        console.print()
        hanging("", "; ".join(meanings) + ".", console)


def _heading(calibration: Calibration, on: date) -> Text:
    text = Text(visible(calibration.name, 60), style="bold")
    text.append(f": {calibration.kind}", style="not bold")
    measured, until = calibration.measured_on, calibration.valid_until
    if measured and until:
        text.append(f", {measured} to {until}", style="not bold")
    elif measured or until:
        text.append(f", measured {measured}" if measured else f", valid until {until}", style="not bold")
    state = validity(calibration, on)
    style = _STYLE.get(state, _OTHERWISE)
    text.append(", ", style="not bold").append(_on_date(calibration, on), style=f"not bold {style}")
    return text


def _on_date(calibration: Calibration, on: date) -> str:
    state = validity(calibration, on)
    measured, until = calibration.measured_on, calibration.valid_until
    if state is Validity.NOT_YET:
        return f"not yet measured on {on}"
    if state is Validity.NO_END:
        return f"no end of validity, {_days((on - measured).days)} old on {on}" if measured else "no dates"
    assert until is not None  # otherwise it has no end
    return f"valid on {on}" if state is Validity.VALID else f"expired {_days((on - until).days)} before {on}"


def _days(count: int) -> str:
    return "1 day" if count == 1 else f"{count} days"


def _show_table(entries: Sequence[Entry], console: Console) -> None:
    unit = "ppm" if entries and entries[0].x_scale != 1.0 else "ratio"
    verdicts = {row: _STYLE.get(one.verdict, _OTHERWISE) for row, one in enumerate(entries)}

    def limit(one: Entry, name: str) -> str:
        return ABSENT if one.limits is None else plain(getattr(one.limits, name) * one.x_scale, 3)

    columns = [
        (0, Column(("", "curve"), tuple(crop(visible(one.name), LONGEST_NAME) for one in entries), True)),
        (4, Column(("", "form"), tuple(_form(one) for one in entries), True)),
        (5, Column(("", "weights"), tuple(_weights(one) for one in entries), True)),
        (3, Column(("", "n"), tuple(str(one.standards.x.size) for one in entries))),
        (1, Column(("range", unit), tuple(_range(one) for one in entries))),
        (1, Column(("detects", unit), tuple(limit(one, "detection") for one in entries))),
        (2, Column(("quantifies", unit), tuple(limit(one, "quantification") for one in entries))),
        (0, Column(("", "verdict"), tuple(one.verdict.value for one in entries), True, verdicts)),
    ]
    gap = GAP
    if sum(one.width + gap for _, one in columns) - gap > console.width:
        gap = 1
    while sum(one.width + gap for _, one in columns) - gap > console.width and max(columns, key=_luxury)[0]:
        columns.remove(max(columns, key=_luxury))
    rule = "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"
    console.print(grid([one for _, one in columns], rule=rule, gap=gap), soft_wrap=True)


def _luxury(column: tuple[int, Column]) -> int:
    return column[0]


def _form(entry: Entry) -> str:
    form = entry.curve.form if entry.curve else entry.standards.options.form
    return _FORM.get(form, form)


def _weights(entry: Entry) -> str:
    return entry.curve.weights if entry.curve else entry.standards.options.weights


def _range(entry: Entry) -> str:
    if entry.curve is None:
        return ABSENT
    return between(brief(entry.curve.lowest * entry.x_scale), brief(entry.curve.highest * entry.x_scale))


# --- one of them


def show_curve(entry: Entry, console: Console, on: date) -> None:
    """Print one curve: coefficients, range, limits, verdicts in plain words, and a plot."""
    console.print(Text(visible(entry.name, 100), style="bold"))
    console.print(_heading(entry.calibration, on))
    if entry.curve is None:
        console.print(Text("No curve could be fitted to its standards.", style="bold red"))
        return
    console.print()
    _show_coefficients(entry, console)
    if entry.judgement is not None:
        console.print()
        for label, text, good in _verdicts(entry, entry.judgement):
            _say(label, text, console, "" if good else _OTHERWISE)
    console.print()
    drawn = picture(entry)
    x_label, y_label = axis_heads(entry)
    ascii_only = console.options.ascii_only
    plot = terminal_plot(drawn, console.width, x_label=x_label, y_label=y_label, ascii_only=ascii_only)
    console.print(plot, soft_wrap=True)
    hanging("", legend(drawn, ascii_only=ascii_only), console)


def _say(label: str, text: str, console: Console, style: str = "") -> None:
    lines = Text(visible(text, 1000), style=style).wrap(console, max(console.width - _LABEL, 20))
    for place, line in enumerate(lines):
        line.rstrip()
        head = Text(f"{label:{_LABEL}}" if place == 0 else " " * _LABEL)
        console.print(head + line, soft_wrap=True)


def _show_coefficients(entry: Entry, console: Console) -> None:
    curve, scale = entry.curve, entry.x_scale
    assert curve is not None
    x_label, y_label = axis_heads(entry)
    terms = [("a0", "a1 x", "a2 x^2")[power] for power in curve.powers]
    levels = np.unique(entry.standards.x).size
    standards = f", {entry.standards.x.size} standards on {levels} levels" if entry.judgement else ""
    _say("curve", f"{y_label} = {' + '.join(terms)}, x = {x_label}", console)
    _say("", f"{curve.form}, weights {curve.weights}{standards}", console)
    if entry.standards.options.like:
        _say("", f"made like {entry.standards.options.like}, by effective carbon numbers", console)
    u = np.sqrt(np.diag(curve.covariance))
    for power in curve.powers:
        value, spread = curve.coefficients[power] / scale**power, u[power] / scale**power
        _say(f"a{power}", with_uncertainty(float(value), float(spread)), console)
    for first, second in zip(curve.powers, curve.powers[1:], strict=False):
        if u[first] > 0.0 and u[second] > 0.0:
            r = float(curve.covariance[first, second] / u[first] / u[second])
            _say(f"r(a{first},a{second})", fixed(r, 3), console)
    _say("range", f"{_range(entry)} {_unit(entry)}", console)
    scatter = reading_scatter(entry)
    if scatter is not None:
        low, high = (f"{plain(one * _PERCENT, 2)} %" for one in scatter)
        _say("scatter", f"a reading, {between_words(low, high)} of the response", console)
    limits = entry.limits
    if limits is None:
        _say("limits", "none: the scatter is unknown, or the scheme cannot be used", console)
        return
    decision, detection, quantification = (
        plain(one * scale, 3) for one in (limits.decision, limits.detection, limits.quantification)
    )
    _say(
        "limits",
        f"decision {decision}, detection {detection}, quantification {quantification} {_unit(entry)} "
        f"({limits.scheme})",
        console,
    )


def between_words(low: str, high: str) -> str:
    """Two ends of a range in words; one of them where they look the same."""
    return low if low == high else f"{low} at the low end and {high} at the high end"


def _unit(entry: Entry) -> str:
    return "ppm" if entry.x_scale != 1.0 else "(amount ratio)"


def probability(p: float) -> str:
    """A probability as people read it: "p = 0.034", "p < 0.001"."""
    if math.isnan(p):
        return "p unknown"
    return "p < 0.001" if p < 0.001 else f"p = {plain(p, 2)}"


def _verdicts(entry: Entry, judged: Judgement) -> list[tuple[str, str, bool]]:
    """What is said of a curve: a label, a sentence, and whether all is well."""
    found = [_form_verdict(judged, entry), _bend_verdict(judged, entry), _scatter_verdict(judged)]
    if judged.suggested_weights is not None:
        sentence = f"the points speak for weights {judged.suggested_weights} instead of {_weights(entry)}"
        found.append(("weights", sentence + _akaike(judged, entry), False))
    found += [_standard_verdict(judged, entry), _rise_verdict(judged, entry)]
    level = f"Tests at the {judged.level * _PERCENT:.0f} % level."
    return [*found, ("", level, True)]


def _form_verdict(judged: Judgement, entry: Entry) -> tuple[str, str, bool]:
    form = _form_name(entry)
    parts = []
    if judged.lack_of_fit is not None:
        test = judged.lack_of_fit
        parts.append(
            f"lack of fit F({test.upper}, {test.lower}) = {plain(test.value, 3)}, {probability(test.p)}"
        )
    if judged.goodness is not None:
        parts.append(
            f"largest weighted deviation {plain(judged.goodness, 3)}, up to {ADEQUATE_GOODNESS:g} is adequate"
        )
    if judged.chi_square_p is not None:
        parts.append(f"chi-square {probability(judged.chi_square_p)}")
    if not parts:
        return "form", "cannot be tested: no replicates", True
    word = f"the {form} fits" if judged.fits else f"the {form} lies further off than the scatter explains"
    return "form", f"{word} ({'; '.join(parts)})", judged.fits


def _bend_verdict(judged: Judgement, entry: Entry) -> tuple[str, str, bool]:
    test = judged.mandel
    if test is None:
        return "bend", "cannot be tested: too few levels, or no scatter", True
    values = f"Mandel F({test.upper}, {test.lower}) = {plain(test.value, 3)}, {probability(test.p)}"
    if _form_name(entry) == "quadratic":
        word = "the square term is needed" if judged.bends else "a line would do as well"
        return "bend", f"{word} ({values})", True
    word = "a quadratic fits significantly better" if judged.bends else "no square term is called for"
    return "bend", f"{word} ({values})", not judged.bends


def _scatter_verdict(judged: Judgement) -> tuple[str, str, bool]:
    test = judged.homogeneity
    if test is None:
        return "scatter", "whether it follows the weights cannot be tested", True
    word = "follows the weights" if judged.even_scatter else "does not follow the weights"
    return "scatter", f"{word} ({test.method}, {probability(test.p)})", judged.even_scatter


def _akaike(judged: Judgement, entry: Entry) -> str:
    mine, other = (judged.weights_aic.get(one or "") for one in (_weights(entry), judged.suggested_weights))
    if mine is None or other is None:
        return ""
    return f" (Akaike's criterion {plain(mine - other, 2)} lower)"


def _standard_verdict(judged: Judgement, entry: Entry) -> tuple[str, str, bool]:
    place = judged.most_outlying
    if place is None:
        return "standards", "whether one is outlying cannot be told", True
    origins = entry.standards.origins
    where = f"{origins[place]}, " if place < len(origins) else ""
    x = brief(float(entry.standards.x[place]) * entry.x_scale)
    farthest = (
        f"{where}x = {x} {_unit(entry)}, {plain(float(judged.deleted[place]), 2)} of its standard deviations from the "
        f"curve through the others, {probability(judged.outlier_p)}"
    )
    if judged.outlier is None:
        return "standards", f"none is outlying; farthest: {farthest}", True
    return "standards", f"one is outlying: {farthest}", False


def _rise_verdict(judged: Judgement, entry: Entry) -> tuple[str, str, bool]:
    scale = entry.x_scale
    least = with_uncertainty(judged.least_slope / scale, judged.u_least_slope / scale)
    word = "rises over the whole range" if judged.rises else "is not certain to rise over the whole range"
    return "slope", f"{word}; least slope {least}", judged.rises


def _form_name(entry: Entry) -> str:
    return entry.curve.form if entry.curve else entry.standards.options.form


# --- one against another


def show_comparison(found: Comparison, console: Console) -> None:
    """Print curves against the first of them: mean slopes, ratios, what is significant, and the drift."""
    first = found.entries[0]
    title = visible(first.name, 100) if found.one_curve else "slopes of several curves"
    console.print(Text(title, style="bold"))
    ends = between_words_of(found)
    hanging("", f"Mean slopes over {ends}; ratios to {visible(first.full_name, 100)}.", console)
    _show_slopes(found, console)
    console.print()
    for place, (entry, ratio, shift) in enumerate(
        zip(found.entries[1:], found.ratios, found.intercepts, strict=True), start=1
    ):
        name = entry.calibration.name if found.one_curve else entry.full_name
        hanging("", f"{visible(name, 100)}: {_change(found, ratio, found.months(place))}", console)
        if shift is not None and shift.significant:
            hanging("  ", f"Its intercept differs too, by {_tested(shift)}.", console)
    if found.shared:
        names = ", ".join(visible(one, 40) for one in found.shared)
        hanging(
            "", f"What is wrong with parent {names} is wrong with both, and left out of the ratios.", console
        )
    if found.drift is not None:
        console.print()
        _show_drift(found, console)


def between_words_of(found: Comparison) -> str:
    """The stretch the slopes are taken over."""
    scale = found.entries[0].x_scale
    ends = between(brief(found.low * scale), brief(found.high * scale))
    return f"{ends} {_unit(found.entries[0])}"


def _show_slopes(found: Comparison, console: Console) -> None:
    scale = found.entries[0].x_scale
    names = [one.calibration.name if found.one_curve else one.full_name for one in found.entries]
    ratios = ["1", *(with_uncertainty(one.ratio, one.u_ratio) for one in found.ratios)]
    columns = [
        Column(
            ("calibration" if found.one_curve else "curve",),
            tuple(crop(visible(one), 40) for one in names),
            True,
        ),
        Column(
            ("measured",), tuple(str(one.calibration.measured_on or ABSENT) for one in found.entries), True
        ),
        Column(
            ("slope",),
            tuple(
                with_uncertainty(one.slope / scale, one.u_relative * one.slope / scale)
                for one in found.slopes
            ),
        ),
        Column(("ratio",), tuple(ratios)),
        Column(("",), ("", *(_word(one.significant) for one in found.ratios)), True),
    ]
    rule = "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"
    console.print(grid(columns, rule=rule), soft_wrap=True)


def _word(significant: bool | None) -> str:
    return {True: "differs", False: "no difference", None: "cannot be told"}[significant]


def _change(found: Comparison, ratio: SlopeRatio, months: float | None) -> str:
    """A sentence on one ratio."""
    change = with_uncertainty((ratio.ratio - 1.0) * _PERCENT, ratio.u_ratio * _PERCENT)
    what = "the slope changed" if found.one_curve else "the slope differs"
    over = f" in {fixed(months, 1)} months" if months else ""
    if ratio.significant is None:
        return f"{what} by {change} %{over}; a curve has no standards to spare, so that nothing can be said of chance."
    low, high = (fixed(math.expm1(one) * _PERCENT, 2) for one in ratio.log.interval())
    verdict = "significant" if ratio.significant else "no more than chance explains"
    return (
        f"{what} by {change} %{over} ({ratio.log.level * _PERCENT:.0f} % interval {low} to {high} %), {verdict} "
        f"({probability(ratio.log.p)})."
    )


def _tested(change: Change) -> str:
    return f"{with_uncertainty(change.value, change.u)} ({probability(change.p)})"


def _show_drift(found: Comparison, console: Console) -> None:
    drift = found.drift
    assert drift is not None
    rate = drift.rate
    shown = with_uncertainty(rate.value * _PERCENT, rate.u * _PERCENT)
    count = len(found.entries)
    if rate.significant is None:
        hanging(
            "drift   ", f"{shown} % a month over {count} calibrations; its uncertainty is unknown.", console
        )
        return
    low, high = (fixed(one * _PERCENT, 2) for one in rate.interval())
    verdict = "significant" if rate.significant else "no more than chance explains"
    freedom = f"{rate.freedom:.0f} degree{'s' * (rate.freedom != 1)} of freedom"
    hanging(
        "drift   ",
        f"{shown} % a month over {count} calibrations ({rate.level * _PERCENT:.0f} % interval {low} to {high} %), "
        f"{verdict} ({probability(rate.p)}, {freedom}).",
        console,
    )
    if drift.steady:
        text = "The calibrations lie on one line within their uncertainties"
    else:
        text = (
            f"The calibrations scatter about a steady drift by {plain(drift.unexplained * _PERCENT, 2)} % more than "
            "their uncertainties explain: the instrument jumped, or a standard was wrong"
        )
    hanging("        ", f"{text} (chi-square {plain(drift.chi_square, 2)} for {drift.chi_freedom}, "
            f"{probability(drift.chi_p)}).", console)  # fmt: skip


def show_calibrations_compared(
    comparisons: Sequence[Comparison], alone: Sequence[str], console: Console
) -> None:
    """Print every curve two calibrations share, a line each."""
    first, second = (visible(one.calibration.name, 60) for one in comparisons[0].entries)
    console.print(Text(f"{second} against {first}", style="bold"))
    significant = {row: _OTHERWISE for row, one in enumerate(comparisons) if one.ratios[0].significant}
    months = comparisons[0].months(1)
    head = f"change in {fixed(months, 1)} months" if months else "change"
    columns = [
        Column(
            ("", "curve"),
            tuple(crop(visible(one.entries[0].name), LONGEST_NAME) for one in comparisons),
            True,
        ),
        Column(("slope", first[:12]), tuple(_slope(one, 0) for one in comparisons)),
        Column(("slope", second[:12]), tuple(_slope(one, 1) for one in comparisons)),
        Column((head, "%"), tuple(_percent(one.ratios[0]) for one in comparisons)),
        Column(
            ("", "verdict"), tuple(_word(one.ratios[0].significant) for one in comparisons), True, significant
        ),
    ]
    rule = "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"
    console.print(grid(columns, rule=rule), soft_wrap=True)
    hanging("", "By chance alone one curve in twenty differs.", console)
    if alone:
        hanging("", f"In one of them only: {', '.join(visible(one, 60) for one in alone)}.", console)


def _slope(found: Comparison, place: int) -> str:
    one, scale = found.slopes[place], found.entries[0].x_scale
    return with_uncertainty(one.slope / scale, one.u_relative * one.slope / scale)


def _percent(ratio: SlopeRatio) -> str:
    return with_uncertainty((ratio.ratio - 1.0) * _PERCENT, ratio.u_ratio * _PERCENT)
