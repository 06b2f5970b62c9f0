"""Intervals, limits and tests of curves keep what they promise, by simulation with fixed seeds.

Each curve is drawn, fitted and read many times. Readings of one curve share its errors, so that what counts for the
precision of a rate is the number of curves, and within it the number of readings.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pytest
from numpy.typing import NDArray

from coulombook.curves.adequacy import homogeneity, lack_of_fit, mandel
from coulombook.curves.certificates import standard_errors
from coulombook.curves.fit import FORMS, Curve, fit_curve
from coulombook.curves.interval import inverse_with_uncertainty
from coulombook.curves.inverse import response
from coulombook.curves.limits import limits

FloatArray = NDArray[np.float64]

LEVELS = np.array([1.0, 2.0, 5.0, 10.0, 20.0, 50.0])
TRUTH = {"line": (3.0, 10.0, 0.0), "line through zero": (0.0, 10.0, 0.0), "quadratic": (3.0, 10.0, -0.02)}
REPLICATES = {"equal": 2, "1/x": 2, "1/x^2": 2, "replicates": 5, "both": 5}
CURVES, READINGS = 200, 30
CASES = [(form, weights) for form in FORMS for weights in REPLICATES]


@dataclass(frozen=True, slots=True)
class World:
    """A detector, its standards and their errors."""

    form: str
    weights: str
    certificate: float = 0.0  # relative standard uncertainty of each standard
    parent: float = 0.0  # and of the cylinder they all come from

    def mean(self, x: FloatArray) -> FloatArray:
        result: FloatArray = np.asarray(response(*TRUTH[self.form], x))
        return result

    def sd(self, x: FloatArray) -> FloatArray:
        """Standard deviation of a reading; below the lowest standard that of the lowest."""
        held = np.maximum(x, LEVELS[0])
        if self.weights == "equal":
            return np.full(np.shape(x), 1.0)
        if self.weights == "1/x":
            return np.asarray(0.4 * np.sqrt(held))
        if self.weights == "1/x^2":
            return np.asarray(0.2 * held)
        return np.hypot(0.5, 0.02 * self.mean(held))

    def curves(self, count: int, seed: int) -> Iterator[tuple[np.random.Generator, Curve]]:
        """So many curves, each from injections of its own."""
        rng = np.random.default_rng(seed)
        x = np.repeat(LEVELS, REPLICATES[self.weights])
        stated = (
            {"u_x": self.certificate * x, "parent": ["A"] * x.size, "u_parent": [self.parent] * x.size}
            if self.certificate
            else {}
        )
        errors = standard_errors(x, **stated)  # type: ignore[arg-type] # keywords
        for _ in range(count):
            true_x = x + errors @ rng.standard_normal(errors.shape[1])
            y = self.mean(true_x) + self.sd(true_x) * rng.standard_normal(x.size)
            yield rng, fit_curve(x, y, self.form, self.weights, **stated)  # type: ignore[arg-type] # keywords


def world(form: str, weights: str) -> World:
    return World(form, weights, 0.01, 0.01) if weights == "both" else World(form, weights)


def coverage(where: World, seed: int) -> FloatArray:
    """Share of 95 % intervals that hold the true x, at a low, a middle and a high reading."""
    at = np.array([LEVELS[0], LEVELS[3], LEVELS[-1]])
    held = np.zeros(3)
    for rng, curve in where.curves(CURVES, seed):
        y = where.mean(at) + where.sd(at) * rng.standard_normal((READINGS, 3))
        found = inverse_with_uncertainty(curve, y)
        held += ((found.low <= at) & (at <= found.high)).mean(axis=0)
    return held / CURVES


@pytest.mark.parametrize(("form", "weights"), CASES)
def test_intervals_of_the_inverse_cover_what_they_say(form: str, weights: str) -> None:
    # 200 curves of 30 readings know 95 % to about 0.45 %
    found = coverage(world(form, weights), 200)
    assert (found > 0.93).all(), found
    assert (found < 0.97).all(), found


@pytest.mark.parametrize("form", FORMS)
def test_errors_of_the_standards_are_covered_with_any_weights(form: str) -> None:
    # certificates as large as the scatter of the areas, all of one cylinder: without them coverage falls to two thirds
    found = coverage(World(form, "1/x^2", 0.02, 0.02), 201)
    assert (found > 0.93).all(), found
    assert (found < 0.985).all(), found


@pytest.mark.parametrize(("form", "weights"), CASES)
def test_blanks_pass_the_decision_limit_as_often_as_alpha_says(form: str, weights: str) -> None:
    # 300 curves of 100 blanks; blanks of one curve share its intercept: 5 % is known to about 0.3 %
    where = world(form, weights)
    zero = np.zeros(100)
    passed = []
    for rng, curve in where.curves(300, 202):
        threshold = float(response(*curve.coefficients, limits(curve).decision))
        passed.append(np.mean(where.mean(zero) + where.sd(zero) * rng.standard_normal(100) > threshold))
    assert 0.04 < np.mean(passed) < 0.06


@pytest.mark.parametrize("weights", ["equal", "1/x", "1/x^2"])
def test_amounts_at_the_detection_limit_are_missed_as_often_as_beta_says(weights: str) -> None:
    # the limit each curve states scales with its s; s^2 is right in the mean, so the root mean square of all limits is
    # that of the true scatter
    where = World("line", weights)
    curves = list(where.curves(300, 203))
    x = np.full(100, np.sqrt(np.mean([limits(curve).detection ** 2 for _, curve in curves])))
    missed = []
    for rng, curve in curves:
        threshold = float(response(*curve.coefficients, limits(curve).decision))
        missed.append(np.mean(where.mean(x) + where.sd(x) * rng.standard_normal(100) <= threshold))
    assert 0.04 < np.mean(missed) < 0.06


def sizes(p: list[float]) -> None:
    """Rates of rejection of 2000 true hypotheses: 5 % known to 0.5 %, 1 % to 0.22 %."""
    rejected = np.array(p)
    assert 0.035 < np.mean(rejected < 0.05) < 0.065
    assert 0.003 < np.mean(rejected < 0.01) < 0.017


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("power", [0.0, 2.0])
def test_mandels_test_has_its_nominal_size(form: str, power: float) -> None:
    rng = np.random.default_rng(204)
    x = np.array([1.0, 2.0, 4.0, 6.0, 8.0, 10.0, 12.0])
    variance = x**power
    # a quadratic is tested for a square term that is not needed
    truth = response(*TRUTH["line" if form == "quadratic" else form], x)
    p = []
    for _ in range(2000):
        found = mandel(x, truth + np.sqrt(variance) * rng.standard_normal(7), FORMS[form], np.diag(variance))
        assert found is not None
        p.append(found.p)
    sizes(p)


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("power", [0.0, 2.0])
def test_lack_of_fit_has_its_nominal_size(form: str, power: float) -> None:
    rng = np.random.default_rng(205)
    x = np.repeat([1.0, 2.0, 5.0, 8.0, 10.0], [2, 3, 3, 2, 3])
    variance, none = x**power, np.zeros((13, 0))
    truth = response(*TRUTH[form], x)
    p = []
    for _ in range(2000):
        y = truth + np.sqrt(variance) * rng.standard_normal(13)
        found = lack_of_fit(x, y, FORMS[form], variance, none)
        assert found is not None
        p.append(found.p)
    sizes(p)


def test_lack_of_fit_is_cautious_where_certificates_move_the_levels() -> None:
    rng = np.random.default_rng(206)
    x = np.repeat([1.0, 2.0, 5.0, 8.0, 10.0], 3)
    errors = 10.0 * standard_errors(x, 0.03 * x)
    p, blind = [], []
    for _ in range(1000):
        y = 3.0 + 10.0 * x + errors @ rng.standard_normal(5) + rng.standard_normal(15)
        for moved, kept in ((errors, p), (np.zeros((15, 0)), blind)):
            found = lack_of_fit(x, y, (0, 1), np.ones(15), moved)
            assert found is not None
            kept.append(found.p)
    assert np.mean(np.array(p) < 0.05) < 0.06
    # a test that knows nothing of the certificates cries wolf
    assert np.mean(np.array(blind) < 0.05) > 0.3


def test_homogeneity_is_rejected_as_often_as_the_level_says() -> None:
    rng = np.random.default_rng(207)
    x = np.repeat([1.0, 2.0, 5.0, 8.0, 10.0], 3)
    p, ranks = [], []
    for _ in range(2000):
        bartlett = homogeneity(x, rng.standard_normal(15), np.ones(15), np.zeros(15))
        spearman = homogeneity(np.arange(10.0), np.zeros(10), np.ones(10), rng.standard_normal(10))
        assert bartlett is not None
        assert spearman is not None
        p.append(bartlett.p)
        ranks.append(spearman.p)
    sizes(p)
    # t for a rank correlation of ten is an approximation, good to a fifth of the rate
    assert 0.035 < np.mean(np.array(ranks) < 0.05) < 0.065
