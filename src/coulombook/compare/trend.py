"""Lines through series of results, and what lies beside them, with errors in both axes and errors that points share.

The slope is York's: every point weighs by 1/(u_y^2 - 2 b u_xy + b^2 u_x^2 + v), where u_x, u_y and u_xy come from the
errors that a point has for its own, and v is the variance of a single point that they leave unexplained. The
uncertainty of the slope comes from all errors: what moves all points of a series together (one flow meter, one
reference electrode) cancels in it. v is found by moments, as what the weighted squares of the residuals exceed their
expectation under the stated covariance, not below zero; it enters with its degrees of freedom (Welch-Satterthwaite).

Many series are fitted at once, each a group of points. Results are named tuples: they are made in a twentieth of the
time of slotted data classes, and every tally loads this module.

Sources: York, Evensen, Martinez & De Basabe Delgado, Am. J. Phys. 72 (2004) 367; JCGM 100:2008, 5.2 and G.4;
DerSimonian & Laird, Control. Clin. Trials 7 (1986) 177, for a variance by moments.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import NDArray

from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Linearised,
    Number,
    nominal,
    squared_norms,
)

if TYPE_CHECKING:
    from scipy.sparse import csr_array

_TURNS, _NEAR, _SETTLED = 100, 1e-4, 1e-13  # of York's iteration, which gains a digit or more a turn
_FLOOR = 1e-9  # no point weighs more than 1e9 times one with the largest error of its series
_BELIEF = 3.0  # degrees of freedom of a stated uncertainty that is good to 40 % (JCGM 100:2008, G.4.2)
_ODD = 0.001  # chance below which the scatter of a group is its own
_ROUNDING = 1e-12  # a residual of this share of the values is rounding, not scatter


class Variances(NamedTuple):
    """Variances of the x and the y of points, and the covariance of the two, (n,) each."""

    xx: FloatArray
    xy: FloatArray
    yy: FloatArray

    def of_residuals(self, slope: FloatArray) -> FloatArray:
        """Variance of y - slope times x."""
        result: FloatArray = self.yy - 2.0 * slope * self.xy + slope**2 * self.xx
        return result

    def take(self, rows: IntArray) -> Variances:
        """Those of some of the points."""
        return Variances(self.xx[rows], self.xy[rows], self.yy[rows])


class Points(NamedTuple):
    """Points (n,) of series: values, variances by all errors and by those that each has for its own.

    ``derivatives`` holds those of y and, behind them, those of x where x has errors; None where nothing has.
    """

    x: FloatArray
    y: FloatArray
    every: Variances
    own: Variances
    derivatives: csr_array | None

    @classmethod
    def of(cls, x: Number, y: Number, own: NDArray[np.bool_]) -> Points:
        """``own`` (n_errors,) tells which errors no two points of a series share."""
        n = len(nominal(x))
        none = np.zeros((2, n))
        xx, yy, both = none, none, none
        derivatives = None
        if isinstance(y, Linearised):
            yy, derivatives = _variances(y.jacobian, own), y.jacobian
        if isinstance(x, Linearised):
            from scipy.sparse import vstack

            above = type(x.jacobian)(x.jacobian.shape) if derivatives is None else derivatives
            xx, both = _variances(x.jacobian, own), _variances(x.jacobian + above, own)
            derivatives = vstack((above, x.jacobian), format="csr")
        every, alone = (
            Variances(*parts)
            for parts in zip(xx, 0.5 * (both - xx - yy) if both is not none else none, yy, strict=True)
        )
        return cls(nominal(x), nominal(y), every, alone, derivatives)


def _variances(jacobian: csr_array, own: NDArray[np.bool_]) -> FloatArray:
    """Variance by all errors and by those that are a point's own, (2, n)."""
    kept = type(jacobian)(
        (np.where(own[jacobian.indices], jacobian.data, 0.0), jacobian.indices, jacobian.indptr),
        shape=jacobian.shape,
    )
    return np.stack((squared_norms(jacobian), squared_norms(kept)))


class Estimate(NamedTuple):
    """Values (n_groups,) with standard uncertainties, and their degrees of freedom: infinite where u is all stated."""

    value: FloatArray
    u: FloatArray
    degrees_of_freedom: FloatArray

    @property
    def p(self) -> FloatArray:
        """Probability of a value so far from zero by chance, on either side."""
        from scipy.special import stdtr

        with np.errstate(invalid="ignore", divide="ignore"):
            t = np.where(self.value == 0, 0.0, np.abs(self.value) / self.u)
        result: FloatArray = 2.0 * stdtr(_finite(self.degrees_of_freedom), -t)
        return result

    def half_width(self, level: float) -> FloatArray:
        """Half of the interval at a level of confidence."""
        from scipy.special import stdtrit

        result: FloatArray = stdtrit(_finite(self.degrees_of_freedom), 0.5 + level / 2.0) * self.u
        return result


def _finite(freedom: FloatArray) -> FloatArray:
    # Student's t with more than 1e9 degrees of freedom is the normal distribution to nine digits
    return np.minimum(freedom, 1e9)


class Scatter(NamedTuple):
    """Variance of a single point about its curve, (n_groups,), and how much of it the stated errors explain."""

    variance: FloatArray
    explained: FloatArray
    degrees_of_freedom: (
        FloatArray  # zero where there is no point to spare: nothing is known of the scatter then
    )

    @property
    def unexplained(self) -> FloatArray:
        """v, the variance that the stated errors do not explain."""
        return np.maximum(self.variance - self.explained, 0.0)

    @classmethod
    def of(
        cls, square: FloatArray, stated: FloatArray, trace: FloatArray, degrees_of_freedom: FloatArray
    ) -> Scatter:
        """From the weighted squares of the residuals, what is expected of them, and what a unit of v adds to that."""
        spare = degrees_of_freedom > 0
        variance, explained = (np.where(spare, one / trace, 0.0) for one in (square, stated))
        return cls(variance, explained, np.where(spare, degrees_of_freedom, 0.0))

    def believing_the_stated(self) -> Scatter:
        """Scatter with the stated errors taken into account as so many degrees of freedom more."""
        freedom = self.degrees_of_freedom
        believed = np.where(self.explained > 0, _BELIEF, 0.0)
        variance = (freedom * self.variance + believed * self.explained) / (freedom + believed)
        some = freedom > 0
        return Scatter(
            np.where(some, variance, self.variance),
            self.explained,
            np.where(some, freedom + believed, freedom),
        )

    def pooled(self, unit: FloatArray, kind: IntArray) -> Scatter:
        """Scatter that groups of one ``kind`` (n_groups,) have in common, in proportion to their ``unit`` (n_groups,).

        A group that scatters more than the others of its kind, as chance would make it in one of a thousand, keeps its
        own scatter and adds nothing to theirs.
        """
        from scipy.special import fdtrc

        def total(values: FloatArray) -> FloatArray:
            return np.asarray(np.bincount(kind, weights=values)[kind], dtype=np.float64)

        freedom, ratio = self.degrees_of_freedom, self.variance / unit
        others = (total(freedom * ratio) - freedom * ratio) / (total(freedom) - freedom)
        odd = fdtrc(freedom, total(freedom) - freedom, ratio / others) < _ODD
        kept = np.where(odd, 0.0, freedom)
        together = total(kept)
        common = ~odd & (together > 0)
        variance, explained = (
            np.where(common, unit * total(kept * one / unit) / together, one)
            for one in (self.variance, self.explained)
        )
        return Scatter(variance, explained, np.where(common, together, freedom))

    def estimate(self, value: FloatArray, propagated: FloatArray, squares: FloatArray) -> Estimate:
        """A linear function of the points, from its propagated variance and the sum of its squared coefficients."""
        variance = propagated + self.unexplained * squares
        with np.errstate(invalid="ignore", divide="ignore"):
            freedom = self.degrees_of_freedom * (variance / (self.variance * squares)) ** 2
        return Estimate(value, np.sqrt(variance), np.where(self.unexplained > 0, freedom, np.inf))


class _Held(NamedTuple):
    """The points that are fitted: ``rows`` (n,) of them all, each in its ``group`` (n,), ascending, of ``groups``."""

    points: Points
    rows: IntArray
    group: IntArray
    groups: int

    def total(self, values: FloatArray) -> FloatArray:
        """Sums over each group."""
        return np.asarray(np.bincount(self.group, weights=values, minlength=self.groups), dtype=np.float64)

    def propagated(self, loadings: FloatArray, slope: FloatArray) -> FloatArray:
        """Variance by all errors of linear functions (n_functions, n) of the points of each group."""
        functions, derivatives = len(loadings), self.points.derivatives
        if derivatives is None:
            return np.zeros((functions, self.groups))
        n = len(self.points.x)
        column, weight = self.rows[:, None], loadings[:, :, None]
        if derivatives.shape[0] > n:
            # an error of x moves y less the line by minus the slope
            column = np.stack((self.rows, n + self.rows), axis=1)
            weight = np.stack((loadings, -slope[self.group] * loadings), axis=2)
        each = column.shape[1] * np.bincount(self.group, minlength=self.groups)
        pointer = np.concatenate(([0], np.cumsum(np.tile(each, functions))))
        matrix = type(derivatives)(
            (weight.ravel(), np.tile(column.ravel(), functions), pointer),
            shape=(functions * self.groups, derivatives.shape[0]),
        )
        return squared_norms(matrix @ derivatives).reshape(functions, self.groups)


class Lines(NamedTuple):
    """A line through each group of points, (n_groups,) each.

    ``mean`` is that of y at ``centre``, both weighted. ``beside`` are the coefficients of the shapes that were fitted
    beside the line, each alone with it and with the scatter about both; NaN where the line leaves no room for the
    shape, or where nothing tells how large chance makes it. ``to_slope`` and ``to_mean`` (n,) tell how far each y moves
    slope and mean.
    """

    slope: Estimate
    mean: Estimate
    beside: tuple[Estimate, ...]
    centre: FloatArray
    scatter: Scatter
    to_slope: FloatArray
    to_mean: FloatArray
    held: _Held

    def relative_slope(self, x: FloatArray) -> Estimate:
        """Slope over the line's own value at ``x`` (n_groups,): what moves all y in proportion cancels in it."""
        away = x - self.centre
        value = self.mean.value + self.slope.value * away
        with np.errstate(invalid="ignore", divide="ignore"):
            relative = self.slope.value / value
            to_slope, to_mean = (1.0 - relative * away) / value, -relative / value
        group = self.held.group
        loading = to_slope[group] * self.to_slope + to_mean[group] * self.to_mean
        propagated = self.held.propagated(loading[None], self.slope.value)[0]
        return self.scatter.estimate(relative, propagated, self.held.total(loading**2))


def fit_lines(
    points: Points,
    rows: IntArray,
    group: IntArray,
    groups: int,
    *,
    shapes: FloatArray | None = None,
    kind: IntArray | None = None,
) -> Lines:
    """Lines through groups of points.

    The points weigh by their own errors and by the scatter about a first line that these leave unexplained.

    Parameters
    ----------
    points : Points
    rows : (n,) int array
        The points that are used.
    group : (n,) int array
        The group of each, ascending; one that does not hold two different x has no slope, NaN.
    groups : int
    shapes : (n_shapes, n) float array, optional
        Functions of x that may stand beside a line: their values at the points.
    kind : (n_groups,) int array, optional
        Groups of one kind scatter alike, in proportion to their own errors, or to their mean where none are stated.
    """
    held = _Held(points, rows, group, groups)
    with np.errstate(invalid="ignore", divide="ignore"):
        slope, unexplained = _first(held)
        return _fit(held, slope, unexplained, np.zeros((0, len(rows))) if shapes is None else shapes, kind)


def _first(held: _Held) -> tuple[FloatArray, FloatArray]:
    """First slopes, and the scatter beyond the errors that each point has for its own, good enough to weigh with."""
    group, total = held.group, held.total
    x, y = held.points.x[held.rows], held.points.y[held.rows]
    from_mean = x - (total(x) / total(np.ones(len(x))))[group]
    start = total(from_mean * y) / total(from_mean**2)
    slope, weight, _ = _york(held, x, y, start, np.zeros(held.groups), _NEAR)
    whole, count = total(weight), total(np.ones(len(x)))
    u, v = x - (total(weight * x) / whole)[group], y - (total(weight * y) / whole)[group]
    own = held.points.own.take(held.rows).of_residuals(slope[group])
    excess = total(weight * (v - slope[group] * u) ** 2) - total(weight * own) * (count - 2.0) / count
    found: FloatArray = np.maximum(excess * count / (whole * (count - 2.0)), 0.0)
    return slope, np.where(count > 2, np.nan_to_num(found), 0.0)


def _fit(
    held: _Held, start: FloatArray, unexplained: FloatArray, shapes: FloatArray, kind: IntArray | None
) -> Lines:
    group, total = held.group, held.total
    x, y = held.points.x[held.rows], held.points.y[held.rows]
    count = total(np.ones(len(x)))
    slope, weight, to_slope = _york(held, x, y, start, unexplained, _SETTLED)
    whole = total(weight)
    centre, mean = total(weight * x) / whole, total(weight * y) / whole
    from_centre = x - centre[group]
    residual = y - mean[group] - slope[group] * from_centre
    residual[np.abs(residual) <= _ROUNDING * np.sqrt(total(y**2) / count)[group]] = 0.0
    first = total(weight * from_centre**2)
    beside, beside_square = _beside(shapes, weight, from_centre, first / whole, held)
    loadings = np.stack((weight / whole[group], to_slope, *(weight * beside / beside_square[:, group])))
    propagated = held.propagated(np.nan_to_num(loadings), slope)
    squares = np.stack([total(one**2) for one in loadings])
    # of a weighted residual sum of squares: the expectation is a trace, less the parts that the coefficients take away
    taken = np.stack((whole, first, *beside_square))
    square = total(weight * residual**2)
    of_points = held.points.every.take(held.rows).of_residuals(slope[group])
    stated = total(weight * of_points) - (taken * propagated)[:2].sum(axis=0)
    trace = whole - (taken * squares)[:2].sum(axis=0)
    scatter = Scatter.of(square, stated, trace, count - 2.0)
    if kind is not None:
        stated_by_own = total(held.points.own.yy[held.rows]) / count
        scatter = scatter.pooled(np.where(stated_by_own > 0, stated_by_own, mean**2), kind)
    estimates = []
    for number in range(2, len(loadings)):
        value = total(loadings[number] * residual)
        about = Scatter.of(
            np.maximum(square - taken[number] * value**2, 0.0),
            stated - taken[number] * propagated[number],
            trace - taken[number] * squares[number],
            count - 3.0,
        )
        known = (count > 3) | (propagated[number] > 0)
        about = about.believing_the_stated()
        estimates.append(about.estimate(np.where(known, value, np.nan), propagated[number], squares[number]))
    return Lines(
        scatter.estimate(slope, propagated[1], squares[1]),
        scatter.estimate(mean, propagated[0], squares[0]),
        tuple(estimates),
        centre,
        scatter,
        to_slope,
        loadings[0],
        held,
    )


def _york(
    held: _Held, x: FloatArray, y: FloatArray, slope: FloatArray, unexplained: FloatArray, settled: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Slope of each group, the weight of each point, and how far each y moves its slope."""
    group, total = held.group, held.total
    own = held.points.own.take(held.rows)
    scattered = own.yy + unexplained[group]
    own = Variances(own.xx, own.xy, scattered + _floor(own.xx + scattered, held))
    for _ in range(_TURNS):
        b = slope[group]
        weight = 1.0 / own.of_residuals(b)
        whole = total(weight)
        u, v = x - (total(weight * x) / whole)[group], y - (total(weight * y) / whole)[group]
        beta = weight * (u * own.yy + b * v * own.xx - (b * u + v) * own.xy)
        before, slope = slope, total(weight * beta * v) / total(weight * beta * u)
        # a group without two different x has no slope to wait for
        if not (np.abs(slope - before) > settled * np.abs(slope)).any():
            break
    lever = weight * (beta - (total(weight * beta) / whole)[group])
    return slope, weight, lever / total(lever * u)[group]


def _floor(variance: FloatArray, held: _Held) -> FloatArray:
    highest = np.zeros(held.groups)
    np.maximum.at(highest, held.group, variance)
    # series without any error weigh all their points alike
    floor: FloatArray = np.where(highest > 0, _FLOOR * highest, 1.0)[held.group]
    return floor


def _beside(
    shapes: FloatArray, weight: FloatArray, from_centre: FloatArray, mean_square: FloatArray, held: _Held
) -> tuple[FloatArray, FloatArray]:
    """What of each shape no line can follow, at each point; its weighted square by group, NaN where that is nothing."""
    group, total = held.group, held.total
    whole = total(weight)
    left, squares = np.empty_like(shapes), np.empty((len(shapes), held.groups))
    for number, shape in enumerate(shapes):
        level = shape - (total(weight * shape) / whole)[group]
        tilt = total(weight * from_centre * level) / (whole * mean_square)
        left[number] = level - tilt[group] * from_centre
        squares[number] = total(weight * left[number] ** 2)
        squares[number, ~(squares[number] > _ROUNDING * total(weight * level**2))] = np.nan
    return left, squares
