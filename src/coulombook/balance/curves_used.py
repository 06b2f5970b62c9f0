"""The calibration curves a day uses: each fitted once, when the first reading asks for it."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from coulombook.balance.readings import Calibration, FloatArray, StandardSet
from coulombook.curves.carbon_number import relative_response, scale_curve
from coulombook.curves.fit import Curve, fit_curve
from coulombook.curves.judgement import Judgement, judge
from coulombook.curves.limits import Limits, limits
from coulombook.findings import Findings
from coulombook.prose.numbers import with_uncertainty

GAS, LIQUID = "gas", "liquid"


# What a curve needs, in words: for its form, and for its weights on top of that.
_WANTED = {
    "line": "standards at two levels or more, on a line that rises",
    "line through zero": "a standard above zero or more, on a line that rises",
    "quadratic": "standards at three levels or more, on a curve that rises over its whole range",
}
_WANTED_TOO = {
    "1/x": ", every level above zero",
    "1/x^2": ", every level above zero",
    "replicates": ", with replicates that differ",
}


@dataclass(frozen=True, slots=True, eq=False)
class UsedCurve:
    """A fitted curve with the standards it came from; ``curve`` is None when it could not be fitted.

    ``judgement`` is None for a curve without standards of its own: one made like another, whose place in
    `CurvesUsed.used` is ``like``.
    """

    standards: StandardSet
    curve: Curve | None
    judgement: Judgement | None = None
    like: int | None = None

    @property
    def name(self) -> str:
        """How people call it: analyte@channel (gas) or analyte@signal (liquid)."""
        return f"{self.standards.analyte}@{self.standards.channel}"


class CurvesUsed:
    """Finds curves by kind, channel (or signal) and analyte; faults of the curves go to ``findings``."""

    def __init__(self, calibrations: Iterable[Calibration], findings: Findings) -> None:
        self._findings = findings
        self._known: dict[tuple[str, str, str], StandardSet] = {}
        self._index: dict[tuple[str, str, str], int] = {}
        self.used: list[UsedCurve] = []
        self._limits: dict[tuple[int, int], Limits | None] = {}
        self.kinds = set()
        for calibration in calibrations:
            self.kinds.add(calibration.kind)
            for standards in calibration.standards:
                key = _key(standards.kind, standards.channel, standards.analyte)
                if key in self._known:
                    other = self._known[key].calibration
                    findings.add(
                        "duplicate",
                        f"calibrations {other} and {standards.calibration}",
                        f"both hold a curve for {standards.analyte} on {standards.channel}",
                        "name only one of them in [day] calibrations",
                    )
                self._known[key] = standards

    def index(self, kind: str, channel: str, analyte: str) -> int | None:
        """Place of the curve in `used`, or None when no calibration holds it."""
        key = _key(kind, channel, analyte)
        if key in self._index:
            return self._index[key]
        standards = self._known.get(key)
        if standards is None:
            return None
        made = self._borrow(standards) if standards.options.like is not None else self._make(standards)
        # after its reference, if it has one
        self._index[key] = len(self.used)
        self.used.append(made)
        return self._index[key]

    def channels(self, kind: str, analyte: str) -> tuple[str, ...]:
        """Channels (or signals) on which ``analyte`` has a curve."""
        return tuple(
            standards.channel
            for key, standards in self._known.items()
            if key[0] == kind and key[2] == analyte
        )

    def _borrow(self, standards: StandardSet) -> UsedCurve:
        """The curve of another analyte on the same channel, scaled by effective carbon numbers."""
        like = standards.options.like or ""
        reference = like.partition("@")[0]
        where = f"calibration {standards.calibration}"
        index = self.index(standards.kind, standards.channel, reference)
        source = None if index is None else self.used[index]
        if source is None or source.curve is None or source.like is not None:
            self._findings.add(
                "broken-curve",
                where,
                f"{standards.analyte}@{standards.channel} is to be made like {like}, which has no standards of its own",
                "name a curve with standards",
                found=like,
            )
            return UsedCurve(standards, None)
        try:
            factor, u_factor = relative_response(standards.analyte, reference)
            curve = scale_curve(source.curve, factor, u_factor)
        except ValueError as error:
            self._findings.add(
                "broken-curve",
                where,
                f"{standards.analyte}@{standards.channel} cannot be made like {like}: {error}",
                f"add standards of {standards.analyte}, or mark its peaks with use = no",
            )
            return UsedCurve(standards, None)
        self._findings.add(
            "borrowed-curve",
            where,
            f"{standards.analyte}@{standards.channel} is {like} times {with_uncertainty(factor, u_factor)} by "
            "effective carbon numbers",
            f"add standards of {standards.analyte}",
        )
        return UsedCurve(standards, curve, like=index)

    def _make(self, standards: StandardSet) -> UsedCurve:
        curve = self._fit(standards)
        if curve is None:
            return UsedCurve(standards, None)
        judgement = judge(
            curve,
            standards.x,
            standards.y,
            u_x=standards.u_x,
            parent=standards.parent,
            u_parent=standards.u_parent,
        )
        report_judgement(standards, curve, judgement, self._findings)
        return UsedCurve(standards, curve, judgement)

    def _fit(self, standards: StandardSet) -> Curve | None:
        where = standards.origins[0].file if standards.origins else f"calibration {standards.calibration}"
        name = f"{standards.analyte}@{standards.channel}"
        try:
            curve = fit_curve(
                standards.x,
                standards.y,
                standards.options.form,
                standards.options.weights,
                u_x=standards.u_x,
                parent=standards.parent,
                u_parent=standards.u_parent,
            )
        except ValueError as error:
            self._findings.add(
                "broken-curve",
                standards.origins[0] if standards.origins else where,
                f"the curve {name} ({len(standards.x)} standards, form '{standards.options.form}', "
                f"weights '{standards.options.weights}') cannot be fitted",
                "correct the standards or choose another form or weights in calibration.toml",
                found=str(error),
                expected=_WANTED[standards.options.form] + _WANTED_TOO.get(standards.options.weights, ""),
            )
            return None
        if curve.degrees_of_freedom == 0:
            self._findings.add(
                "curve-without-scatter",
                where,
                f"{name} has as many coefficients as standards; its uncertainty is unknown and was taken as zero",
                "add standards or replicates",
            )
        return curve

    def limits(self, index: int, repeats: int) -> Limits | None:
        """Limits of a used curve for the mean of ``repeats`` readings; None where there are none to be had.

        The line of slope 1 (index -1) has no scatter to derive limits from.
        """
        if index < 0:
            return None
        key = index, repeats
        if key not in self._limits:
            self._limits[key] = self._limits_of(self.used[index], repeats)
        return self._limits[key]

    def _limits_of(self, one: UsedCurve, repeats: int) -> Limits | None:
        if one.curve is None or one.curve.degrees_of_freedom == 0:
            return None
        standards = one.standards
        try:
            return limits(
                one.curve,
                standards.options.limits,
                repeats=repeats,
                blank_responses=standards.y[standards.x == 0.0],
            )
        except ValueError as error:
            self._findings.add(
                "no-limits",
                f"calibration {standards.calibration}",
                f"{one.name} has no limits by {standards.options.limits}: {error}",
                "choose another scheme under limits in calibration.toml",
            )
            return None

    def coefficients(self) -> tuple[FloatArray, FloatArray, FloatArray]:
        """a0, a1, a2 of the used curves, followed by the line of slope 1 (index -1 of each array)."""
        rows = [one.curve.coefficients if one.curve else (0.0, 1.0, 0.0) for one in self.used]
        table = np.array([*rows, (0.0, 1.0, 0.0)], dtype=float)
        return table[:, 0], table[:, 1], table[:, 2]


def report_judgement(standards: StandardSet, curve: Curve, judgement: Judgement, findings: Findings) -> None:
    """What the standards say against their curve."""
    name = f"{standards.analyte}@{standards.channel}"
    where = f"calibration {standards.calibration}, {name}"
    if judgement.outlier is not None:
        point = standards.origins[judgement.outlier]
        findings.add(
            "standard-outlying",
            point,
            f"this standard of {name} lies {abs(float(judgement.deleted[judgement.outlier])):.3g} of its standard "
            "deviations from the curve through the others",
            "prepare and measure it again; leave it out only for a reason that can be written down",
        )
    if judgement.lack_of_fit is not None and judgement.lack_of_fit.p < 1.0 - judgement.level:
        findings.add(
            "curve-misfit",
            where,
            f"replicates scatter less than the levels lie off the {curve.form} (lack of fit, p = "
            f"{judgement.lack_of_fit.p:.2g})",
            "choose another form, or look for a wrong standard",
        )
    elif not judgement.fits:
        findings.add(
            "curve-misfit",
            where,
            f"the {curve.form} lies further off its standards than their uncertainties allow (ISO 6143)",
            "choose another form, or look at the certificates",
        )
    if judgement.bends and curve.form != "quadratic":
        findings.add(
            "curve-bends",
            where,
            f"a quadratic fits significantly better than the {curve.form} (Mandel test, {judgement.level:.0%})",
            'set form = "quadratic" in calibration.toml, or narrow the range',
        )
    if judgement.suggested_weights is not None:
        findings.add(
            "weights-suggested",
            where,
            f"the scatter does not follow the weights '{curve.weights}'; '{judgement.suggested_weights}' fits better",
            f'set weights = "{judgement.suggested_weights}" in calibration.toml if that makes sense to you',
        )


def _key(kind: str, channel: str, analyte: str) -> tuple[str, str, str]:
    return kind, " ".join(channel.split()).casefold(), analyte
