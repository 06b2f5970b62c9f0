"""Decision, detection and quantification limits of a calibration curve.

Every scheme but those that take a standard deviation alone rests on the same picture: a reading of m repeats at x
lies about the curve with variance v(x)/m + c(x), v being the variance of a single reading
(`coulombook.curves.prediction.reading_variance`) and c that of the curve. For an equally weighted line at x = 0 that is
s^2 (1/m + 1/n + xmean^2/Sxx), the expression of ISO 11843-2 and DIN 32645; weighted lines, lines through zero
(where the curve itself adds nothing at x = 0) and quadratics come from the same picture, the response being
turned into x by the curve itself. Where a formula divides by the slope, that is the slope at x = 0.

| scheme | decision | detection | quantification |
| --- | --- | --- | --- |
| ISO 11843-2 | one-sided t | noncentral t: missed with probability beta | as DIN 32645 |
| DIN 32645 | one-sided t | twice the decision limit | relative half-width 1/k of the two-sided interval |
| DIN 32645 blank | one-sided t of the blanks | twice that | as DIN 32645 |
| Hubaux-Vos | one-sided t | lower prediction limit reaches the decision response | as DIN 32645 |
| ICH residual | half of detection | 3.3 s/slope | 10 s/slope |
| ICH blank | half of detection | 3.3 s(blank)/slope | 10 s(blank)/slope |

ICH names no decision limit; its 3.3 is 1.645 against a false alarm and 1.645 against a miss (Currie), hence half.

Sources: ISO 11843-2:2000; DIN 32645:2008-11; Hubaux & Vos, Anal. Chem. 42 (1970) 849; ICH Q2(R2); Currie, Pure
Appl. Chem. 67 (1995) 1699. Formulas from memory, held against worked numbers.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from coulombook.curves.fit import Curve
from coulombook.curves.inverse import invert, invertible
from coulombook.curves.prediction import curve_response, curve_variance, prediction, reading_variance, slope
from coulombook.curves.quantiles import power_of_t, student_quantile

SCHEMES = ("ISO 11843-2", "DIN 32645", "DIN 32645 blank", "Hubaux-Vos", "ICH residual", "ICH blank")
DETECTION_FACTOR, QUANTIFICATION_FACTOR = 3.3, 10.0  # ICH Q2
K = 3.0  # DIN 32645: relative half-width 1/3 at the quantification limit
FEWEST_BLANKS = 3

_DOUBLINGS, _STEPS, _CLOSE = 60, 100, 1e-13


@dataclass(frozen=True, slots=True)
class Limits:
    """Limits of one curve in units of x.

    Above ``decision`` a reading is taken for the analyte (false alarm alpha); at ``detection`` it is missed with
    probability beta. Infinite: no x reaches it. NaN: it cannot be told, for the scatter is unknown (no degree
    of freedom) or the curve does not rise from x = 0.
    """

    decision: float
    detection: float
    quantification: float
    scheme: str


def limits(
    curve: Curve,
    scheme: str = "ISO 11843-2",
    alpha: float = 0.05,
    beta: float = 0.05,
    repeats: int = 1,
    blank_responses: ArrayLike | None = None,
) -> Limits:
    """Decision, detection and quantification limits of a curve.

    Parameters
    ----------
    curve : Curve
    scheme : str
        One of `SCHEMES`.
    alpha, beta : float
        Probabilities of a false alarm and of a miss; the ICH schemes have theirs built in.
    repeats : int
        Readings averaged for the decision; the ICH schemes count one.
    blank_responses : (n_blanks,) array_like, optional
        Responses of blanks (standards of x = 0), for the schemes "ICH blank" and "DIN 32645 blank".

    Raises
    ------
    ValueError
        An unknown scheme, a probability not between 0 and 0.5, repeats below 1, or a blank scheme with fewer than
        three blanks.

    Examples
    --------
    >>> from coulombook.curves.fit import fit_curve
    >>> curve = fit_curve([0, 2, 4, 6, 8, 10, 12], [2.1, 5.0, 9.0, 12.6, 17.3, 21.0, 24.7])
    >>> round(limits(curve, "ICH residual").detection, 3)
    0.74
    """
    if scheme not in SCHEMES:
        raise ValueError(f"limits '{scheme}' are not available; choose from {', '.join(SCHEMES)}")
    if not (0.0 < alpha < 0.5 and 0.0 < beta < 0.5):
        raise ValueError(f"alpha and beta must lie between 0 and 0.5; they are {alpha:g} and {beta:g}")
    if repeats < 1:
        raise ValueError(f"a decision needs one reading at least, not {repeats}")
    blanks = None
    if scheme.endswith("blank"):
        blanks = np.zeros(0) if blank_responses is None else np.asarray(blank_responses, dtype=float)
        if blanks.size < FEWEST_BLANKS:
            raise ValueError(
                f"limits '{scheme}' need at least {FEWEST_BLANKS} standards of x = 0 (blanks); there are {blanks.size}"
            )
    rise = float(slope(curve, 0.0))
    if not rise > 0.0 or (curve.degrees_of_freedom < 1 and scheme != "ICH blank"):
        return Limits(math.nan, math.nan, math.nan, scheme)
    if scheme.startswith("ICH"):
        sd = math.sqrt(float(reading_variance(curve, 0.0))) if blanks is None else float(blanks.std(ddof=1))
        detection = DETECTION_FACTOR * sd / rise
        return Limits(0.5 * detection, detection, QUANTIFICATION_FACTOR * sd / rise, scheme)
    at_zero = _Zero(curve, alpha, repeats)
    if blanks is not None:
        decision = blank_decision_limit(blanks, rise, alpha, repeats)
        detection = 2.0 * decision
    else:
        decision = at_zero.decision()
        if scheme == "DIN 32645":
            detection = 2.0 * decision
        elif scheme == "Hubaux-Vos":
            detection = at_zero.where_the_band_clears(beta)
        else:
            detection = at_zero.where_few_are_missed(beta)
    return Limits(decision, detection, _quantification(curve, alpha, repeats), scheme)


def blank_decision_limit(blank_responses: ArrayLike, slope: float, alpha: float, repeats: int = 1) -> float:
    """Decision limit from blanks alone, s t(1 - alpha; n - 1) sqrt(1/m + 1/n) / slope. [unit of x]

    DIN 32645:2008-11, blank method.
    """
    blanks = np.asarray(blank_responses, dtype=float)
    t = float(student_quantile(1.0 - alpha, blanks.size - 1.0))
    return t * float(blanks.std(ddof=1)) * math.sqrt(1.0 / repeats + 1.0 / blanks.size) / slope


class _Zero:
    """The test of a reading against x = 0."""

    def __init__(self, curve: Curve, alpha: float, repeats: int) -> None:
        self.curve = curve
        self.repeats = repeats
        variance, freedom = prediction(curve, 0.0, repeats)
        self.freedom = float(freedom)
        self.t = float(student_quantile(1.0 - alpha, freedom))
        self.intercept_variance = float(curve_variance(curve, 0.0))
        self.sd = math.sqrt(float(variance))
        self.threshold = float(curve.coefficients[0]) + self.t * self.sd

    def decision(self) -> float:
        """The x whose response is the threshold."""
        a0, a1, a2 = (np.asarray(one) for one in self.curve.coefficients)
        y = np.asarray(self.threshold)
        return float(np.asarray(invert(a0, a1, a2, y))) if bool(invertible(a0, a1, a2, y)) else math.inf

    def where_few_are_missed(self, beta: float) -> float:
        """The x that passes the threshold with probability 1 - beta.

        The threshold moves with the intercept and scales with s. A reading at x less the intercept has the mean
        f(x) - a0 and R times the standard deviation it has at zero, both known up to the same s: over s it
        follows a noncentral t, to be compared with t/R.
        """
        if self.sd == 0.0:
            return 0.0
        a0 = float(self.curve.coefficients[0])

        def excess(x: float) -> float:
            variance = float(reading_variance(self.curve, x)) / self.repeats + self.intercept_variance
            ratio = math.sqrt(variance) / self.sd
            shift = (float(curve_response(self.curve, x)) - a0) / (self.sd * ratio)
            return power_of_t(shift, self.t / ratio, self.freedom) - (1.0 - beta)

        return _first_above(self.curve, excess, self.decision())

    def where_the_band_clears(self, beta: float) -> float:
        """The x whose lower one-sided prediction limit is the threshold."""
        t = float(student_quantile(1.0 - beta, self.freedom))

        def excess(x: float) -> float:
            variance = float(reading_variance(self.curve, x)) / self.repeats + float(
                curve_variance(self.curve, x)
            )
            return float(curve_response(self.curve, x)) - t * math.sqrt(variance) - self.threshold

        return _first_above(self.curve, excess, self.decision())


def _quantification(curve: Curve, alpha: float, repeats: int) -> float:
    """The least x whose two-sided interval of level 1 - alpha has the half-width x/k (DIN 32645, k = 3)."""

    def half_width(x: float) -> float:
        variance, freedom = prediction(curve, x, repeats)
        return float(student_quantile(1.0 - 0.5 * alpha, freedom)) * math.sqrt(float(variance))

    def excess(x: float) -> float:
        return x * float(slope(curve, x)) - K * half_width(x)

    return _first_above(curve, excess, half_width(0.0) / float(slope(curve, 0.0)))


def _first_above(curve: Curve, excess: Callable[[float], float], start: float) -> float:
    """The x above ``start`` at which ``excess`` turns positive, on the rising branch; infinite when there is none."""
    if start == 0.0 or not math.isfinite(start):
        return start
    _, a1, a2 = (float(one) for one in curve.coefficients)
    turn = -0.5 * a1 / a2 if a2 < 0.0 else math.inf
    low, high = 0.0, start
    under = excess(low)
    for _ in range(_DOUBLINGS):
        high = min(high, turn)
        over = excess(high)
        if over > 0.0:
            break
        if high == turn:
            return math.inf
        low, under, high = high, over, 2.0 * high
    else:
        return math.inf
    # false position, the value kept at one end twice running halved (the Illinois rule)
    side = 0
    for _ in range(_STEPS):
        middle = high - over * (high - low) / (over - under)
        found = excess(middle)
        if found == 0.0 or not low < middle < high or high - low <= _CLOSE * high:
            return middle
        if found > 0.0:
            high, over = middle, found
            under, side = (0.5 * under if side == 1 else under), 1
        else:
            low, under = middle, found
            over, side = (0.5 * over if side == -1 else over), -1
    return high
