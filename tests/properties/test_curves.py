"""What must not change, or must change in step, when the points of a curve are written down differently."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from coulombook.curves.fit import FORMS, Curve, fit_curve
from coulombook.curves.interval import inverse_with_uncertainty
from coulombook.curves.inverse import invert, response
from coulombook.curves.judgement import Judgement, judge
from coulombook.curves.limits import SCHEMES, limits

FloatArray = NDArray[np.float64]

# a curve takes some milliseconds with all its verdicts
CURVES = settings(
    max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True
)
# fits to 1e-13, limits and intervals found by iteration to 1e-12, fits with errors in both to 1e-10 of an
# uncertainty
SAME = 1e-7


@dataclass(frozen=True, slots=True)
class Points:
    """Standards and responses, with the options of their curve."""

    x: FloatArray
    y: FloatArray
    form: str
    weights: str
    u_x: FloatArray | None
    parent: tuple[str, ...] | None
    u_parent: FloatArray | None

    def stated(self) -> dict[str, object]:
        return {"u_x": self.u_x, "parent": self.parent, "u_parent": self.u_parent}

    def fit(self) -> Curve:
        return fit_curve(self.x, self.y, self.form, self.weights, **self.stated())  # type: ignore[arg-type] # keywords

    def judge(self) -> Judgement:
        return judge(self.fit(), self.x, self.y, **self.stated())  # type: ignore[arg-type] # keywords

    def scaled(self, of_x: float, of_y: float) -> Points:
        u_x = None if self.u_x is None else of_x * self.u_x
        return Points(of_x * self.x, of_y * self.y, self.form, self.weights, u_x, self.parent, self.u_parent)

    def taken(self, order: NDArray[np.intp]) -> Points:
        return Points(
            self.x[order],
            self.y[order],
            self.form,
            self.weights,
            None if self.u_x is None else self.u_x[order],
            None if self.parent is None else tuple(self.parent[place] for place in order),
            None if self.u_parent is None else self.u_parent[order],
        )


@st.composite
def points(draw: st.DrawFn) -> Points:
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    form = draw(st.sampled_from(sorted(FORMS)))
    weights = draw(st.sampled_from(["equal", "1/x", "1/x^2", "replicates", "both"]))
    levels = np.sort(rng.uniform(1.0, 50.0, draw(st.integers(4, 7))))
    assume(np.diff(levels).min() > 0.5)
    x = np.repeat(levels, 3 if weights == "replicates" else draw(st.integers(1, 3)))
    a0 = 0.0 if form == "line through zero" else 4.0
    a2 = -0.03 if form == "quadratic" else 0.0
    y = response(a0, 10.0, a2, x) * (1.0 + 0.02 * rng.standard_normal(x.size))
    assert isinstance(y, np.ndarray)
    stated = weights == "both" or draw(st.booleans())
    return Points(
        x,
        y,
        form,
        weights,
        0.01 * x if stated else None,
        tuple(rng.choice(["A", "B"], levels.size).repeat(x.size // levels.size)) if stated else None,
        np.full(x.size, 0.01) if stated else None,
    )


def same_curve(first: Curve, second: Curve, factors: FloatArray) -> None:
    """The second has the coefficients of the first times the factors, and all that goes with them."""
    u = np.sqrt(np.diag(first.covariance)) * factors
    np.testing.assert_allclose(
        second.coefficients,
        factors * first.coefficients,
        atol=SAME * float(u.max()) if u.any() else 0.0,
        rtol=SAME,
    )
    scale = np.outer(u, u) + np.outer(factors, factors) * 1e-300
    np.testing.assert_allclose(
        (second.covariance / scale)[np.ix_(first.free, first.free)],
        (np.outer(factors, factors) * first.covariance / scale)[np.ix_(first.free, first.free)],
        atol=1e-6,
    )
    assert second.r_squared == pytest.approx(first.r_squared, abs=1e-9)
    assert second.degrees_of_freedom == first.degrees_of_freedom
    assert second.scatter_freedom == pytest.approx(first.scatter_freedom, rel=1e-6)


def same_judgement(first: Judgement, second: Judgement, order: NDArray[np.intp] | None = None) -> None:
    chosen = np.arange(first.residual.size) if order is None else order
    for name in ("standardised", "studentised", "deleted", "leverage"):
        np.testing.assert_allclose(getattr(second, name), getattr(first, name)[chosen], rtol=1e-5, atol=1e-6)
    for name in ("lack_of_fit", "mandel", "homogeneity"):
        one, other = getattr(first, name), getattr(second, name)
        assert (one is None) == (other is None)
        if one is not None:
            assert other.p == pytest.approx(one.p, rel=1e-5, abs=1e-8)
    assert second.suggested_weights == first.suggested_weights
    assert second.rises == first.rises
    assert second.outlier_p == pytest.approx(first.outlier_p, rel=1e-4, nan_ok=True)


@CURVES
@given(points(), st.integers(-6, 6), st.integers(-3, 9))
def test_units_of_x_and_y_change_nothing_but_the_units(drawn: Points, of_x: int, of_y: int) -> None:
    fx, fy = 10.0**of_x, 10.0**of_y
    other = drawn.scaled(fx, fy)
    first, second = drawn.fit(), other.fit()
    same_curve(first, second, fy / np.array([1.0, fx, fx**2]))
    assert second.residual_sd == pytest.approx(fy * first.residual_sd, rel=SAME)
    same_judgement(drawn.judge(), other.judge())
    for scheme in SCHEMES[:2] + SCHEMES[3:5]:
        one, two = limits(first, scheme), limits(second, scheme)
        for name in ("decision", "detection", "quantification"):
            assert getattr(two, name) == pytest.approx(fx * getattr(one, name), rel=1e-6)
    reading = float(np.median(drawn.y))
    before, after = (inverse_with_uncertainty(c, k * reading) for c, k in ((first, 1.0), (second, fy)))
    for name in ("x", "u", "low", "high"):
        assert float(getattr(after, name)) == pytest.approx(fx * float(getattr(before, name)), rel=1e-6)


@CURVES
@given(points(), st.randoms(use_true_random=False))
def test_order_of_the_points_does_not_matter(drawn: Points, random: object) -> None:
    order = np.arange(drawn.x.size)
    random.shuffle(order)  # type: ignore[attr-defined] # hypothesis gives a Random
    other = drawn.taken(order)
    same_curve(drawn.fit(), other.fit(), np.ones(3))
    same_judgement(drawn.judge(), other.judge(), order)


@CURVES
@given(points())
def test_names_of_parents_do_not_matter(drawn: Points) -> None:
    assume(drawn.parent is not None)
    assert drawn.parent is not None
    renamed = Points(
        drawn.x,
        drawn.y,
        drawn.form,
        drawn.weights,
        drawn.u_x,
        tuple(f"{one}2" for one in drawn.parent),
        drawn.u_parent,
    )
    same_curve(drawn.fit(), renamed.fit(), np.ones(3))


@CURVES
@given(st.integers(0, 2**32 - 1), st.sampled_from(sorted(FORMS)))
def test_replicates_may_be_written_apart_or_as_their_mean(seed: int, form: str) -> None:
    # with a known scatter, three injections of one standard are their mean with a third of the variance
    rng = np.random.default_rng(seed)
    levels = np.array([1.0, 3.0, 8.0, 20.0, 40.0])
    x = np.repeat(levels, 3)
    y = np.asarray(response(4.0, 10.0, -0.03, x)) + 0.5 * rng.standard_normal(15)
    apart = fit_curve(x, y, form, "both", u_x=0.01 * x, u_y=np.full(15, 0.5))
    mean = y.reshape(5, 3).mean(axis=1)
    together = fit_curve(levels, mean, form, "both", u_x=0.01 * levels, u_y=np.full(5, 0.5 / np.sqrt(3.0)))
    u = np.sqrt(np.diag(apart.covariance))
    np.testing.assert_allclose(together.coefficients, apart.coefficients, atol=1e-7 * u.max(), rtol=1e-9)
    np.testing.assert_allclose(together.covariance, apart.covariance, rtol=1e-6, atol=1e-12 * u.max() ** 2)
    # and the ordinary fit goes through the means
    np.testing.assert_allclose(
        fit_curve(x, y, form).coefficients, fit_curve(levels, mean, form).coefficients, rtol=1e-9
    )


@CURVES
@given(points(), st.floats(0.0, 1.2))
def test_a_reading_comes_back_from_its_response(drawn: Points, share: float) -> None:
    curve = drawn.fit()
    x = curve.lowest + share * (curve.highest - curve.lowest)
    a0, a1, a2 = curve.coefficients
    assume(a1 + 2.0 * a2 * x > 0.0)
    y = float(np.asarray(response(a0, a1, a2, x)))
    assert float(np.asarray(invert(a0, a1, a2, np.asarray(y)))) == pytest.approx(x, rel=1e-9)
    found = inverse_with_uncertainty(curve, y)
    assert float(found.low) <= float(found.x) <= float(found.high)


@CURVES
@given(points(), st.integers(1, 10))
def test_more_repeats_never_widen_an_interval(drawn: Points, repeats: int) -> None:
    curve = drawn.fit()
    y = float(np.median(drawn.y))
    few, many = inverse_with_uncertainty(curve, y, repeats), inverse_with_uncertainty(curve, y, repeats + 1)
    assert float(many.u) <= float(few.u) * (1.0 + 1e-12)
    assert limits(curve, repeats=repeats + 1).decision <= limits(curve, repeats=repeats).decision * (
        1.0 + 1e-12
    )


@CURVES
@given(points())
def test_stating_a_parents_error_never_lowers_the_uncertainty(drawn: Points) -> None:
    # the ordinary fit: coefficients stay, the certificate adds
    if drawn.weights == "both":
        drawn = Points(drawn.x, drawn.y, drawn.form, "equal", None, None, None)
    silent = Points(drawn.x, drawn.y, drawn.form, drawn.weights, None, None, None).fit()
    stated = Points(
        drawn.x, drawn.y, drawn.form, drawn.weights, None, ("A",) * drawn.x.size, np.full(drawn.x.size, 0.02)
    ).fit()
    np.testing.assert_allclose(stated.coefficients, silent.coefficients, rtol=1e-14)
    slope = stated.coefficients[1]
    # a common relative error is one of the slope, which no form sees in its residuals but a quadratic's bend
    assert stated.covariance[1, 1] >= silent.covariance[1, 1]
    assert stated.covariance[1, 1] >= (0.02 * slope) ** 2 * (1.0 - 1e-9)
