"""The calibration curves a day uses: each fitted once, when the first reading asks for it."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from coulombook.balance.readings import Calibration, FloatArray, StandardSet
from coulombook.curves.fit import Curve, fit_curve
from coulombook.curves.limits import Limits, limits
from coulombook.findings import Findings

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
    """A fitted curve with the standards it came from; ``curve`` is None when it could not be fitted."""

    standards: StandardSet
    curve: Curve | None

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
        self._index[key] = len(self.used)
        self.used.append(UsedCurve(standards, self._fit(standards)))
        return self._index[key]

    def channels(self, kind: str, analyte: str) -> tuple[str, ...]:
        """Channels (or signals) on which ``analyte`` has a curve."""
        return tuple(
            standards.channel
            for key, standards in self._known.items()
            if key[0] == kind and key[2] == analyte
        )

    def _fit(self, standards: StandardSet) -> Curve | None:
        where = standards.origins[0].file if standards.origins else f"calibration {standards.calibration}"
        name = f"{standards.analyte}@{standards.channel}"
        if standards.options.like is not None:
            self._findings.add(
                "broken-curve",
                where,
                f"{name} is to be made like {standards.options.like}, which this version cannot do yet",
                f"add standards of {standards.analyte}, or mark its peaks with use = no",
            )
            return None
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


def _key(kind: str, channel: str, analyte: str) -> tuple[str, str, str]:
    return kind, " ".join(channel.split()).casefold(), analyte
