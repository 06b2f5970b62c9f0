"""Curves of several calibrations against each other, and over the months."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from coulombook.compare.curve_drift import (
    DAYS_PER_MONTH,
    Change,
    Drift,
    MeanSlope,
    Parent,
    SlopeRatio,
    common_stretch,
    drift_rate,
    intercept_shift,
    mean_slope,
    parent_effects,
    slope_ratio,
)
from coulombook.curves.fit import Curve
from coulombook.library.shelf import Entry


@dataclass(frozen=True, slots=True, eq=False)
class Comparison:
    """Several curves, the first being what the others are compared with.

    ``low`` and ``high`` are the ends of the stretch their mean slopes are taken over. ``shared`` names the parent
    cylinders that more than one of them has, which are left out of the ratios.
    """

    entries: tuple[Entry, ...]
    low: float
    high: float
    slopes: tuple[MeanSlope, ...]
    ratios: tuple[SlopeRatio, ...]  # of every entry but the first
    intercepts: tuple[Change | None, ...]  # of the same
    shared: tuple[str, ...]
    drift: Drift | None  # None unless it is one curve at three dates or more

    @property
    def one_curve(self) -> bool:
        """Whether all are the same analyte on the same channel, so that a ratio is a drift."""
        return len({one.key for one in self.entries}) == 1

    def months(self, place: int) -> float | None:
        """Mean months from the first to another; None where a date is missing."""
        first, other = self.entries[0].calibration.measured_on, self.entries[place].calibration.measured_on
        return None if first is None or other is None else (other - first).days / DAYS_PER_MONTH


def by_date(entries: Sequence[Entry]) -> list[Entry]:
    """The entries that have a curve and a date, the oldest first."""
    dated = [
        (one.calibration.measured_on, one)
        for one in entries
        if one.curve is not None and one.calibration.measured_on is not None
    ]
    return [one for _, one in sorted(dated, key=lambda pair: pair[0])]


def compare(entries: Sequence[Entry]) -> Comparison:
    """Compare curves by their mean slopes over the range they have in common.

    Raises
    ------
    ValueError
        An entry has no curve, the kinds differ, or ranges that have nothing in common hold a quadratic.
    """
    curves: list[Curve] = []
    for one in entries:
        if one.curve is None:
            raise ValueError(f"{one.full_name} could not be fitted")
        curves.append(one.curve)
    if len({one.standards.kind for one in entries}) > 1:
        raise ValueError("a curve of gas standards cannot be compared with one of liquid standards")
    low, high = common_stretch(curves)
    parents = [_parents(one) for one in entries]
    shared = {
        parent
        for place, some in enumerate(parents)
        for parent in some
        if any(parent in other for other in parents[:place])
    }
    slopes = tuple(
        mean_slope(curve, low, high, _effects(one, low, high, shared & own))
        for one, curve, own in zip(entries, curves, parents, strict=True)
    )
    found = Comparison(
        entries=tuple(entries),
        low=low,
        high=high,
        slopes=slopes,
        ratios=tuple(slope_ratio(slopes[0], one) for one in slopes[1:]),
        intercepts=tuple(intercept_shift(curves[0], one) for one in curves[1:]),
        shared=tuple(sorted({name for name, _ in shared})),
        drift=None,
    )
    months = [found.months(place) for place in range(len(entries))]
    known = [one for one in months if one is not None]
    if found.one_curve and len(known) == len(entries) > 2 and len(set(known)) > 1:
        return replace(found, drift=drift_rate(known, slopes))
    return found


def _parents(entry: Entry) -> set[Parent]:
    standards = entry.standards
    if standards.parent is None or standards.u_parent is None:
        return set()
    return {
        (name, float(u))
        for name, u in zip(standards.parent, standards.u_parent, strict=True)
        if name and u > 0.0
    }


def _effects(entry: Entry, low: float, high: float, wanted: set[Parent]) -> dict[Parent, float]:
    standards = entry.standards
    if not wanted or standards.parent is None or standards.u_parent is None:
        return {}
    found = parent_effects(
        standards.x,
        standards.y,
        standards.options.form,
        standards.options.weights,
        low,
        high,
        parent=standards.parent,
        u_parent=standards.u_parent,
        u_x=standards.u_x,
    )
    return {parent: effect for parent, effect in found.items() if parent in wanted}
