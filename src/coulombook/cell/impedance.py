"""Impedance of an electrode: uncompensated resistance, and the capacitance of a constant-phase element.

The circuit is a resistance R_s in series with a constant-phase element Q (j w)^alpha that a charge-transfer
resistance R_ct bridges. Z = R_s + R_ct / (1 + R_ct Q (j w)^alpha).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

FEWEST_POINTS = 6
# relative misfit above which the circuit is not the electrode's (common practice, no source)
MISFIT = 0.03
# a charge-transfer resistance so many times the largest impedance seen is not told from a blocking electrode
_BLOCKING = 30.0
_HIGH_DECADES = 1.5  # from the highest frequency down, for a second opinion on the resistance


class ImpedanceError(ValueError):
    """A spectrum that gives no resistance; ``expected`` says what would do."""

    def __init__(self, message: str, expected: str) -> None:
        self.expected = expected
        super().__init__(message)


@dataclass(frozen=True, slots=True)
class CircuitFit:
    """R_s + (R_ct parallel to a constant-phase element), with standard uncertainties."""

    resistance_ohm: float  # R_s
    u_resistance_ohm: float  # of the fit, and of the choice of frequencies
    transfer_ohm: float  # R_ct; infinite where the electrode is blocking as far as the spectrum goes
    u_transfer_ohm: float
    admittance: float  # Q [F s^(alpha - 1)]
    u_admittance: float
    alpha: float
    u_alpha: float
    misfit: float  # root mean square of |Z - fit| / |Z|
    points: int  # used
    left_out: int  # inductive ones

    @property
    def fits(self) -> bool:
        """Whether the circuit describes the spectrum."""
        return self.misfit <= MISFIT

    @property
    def brug_farad(self) -> float:
        """Capacitance by Brug et al."""
        return brug_capacitance(self.admittance, self.alpha, self.resistance_ohm, self.transfer_ohm)

    @property
    def hsu_mansfeld_farad(self) -> float:
        """Capacitance by Hsu and Mansfeld; NaN for a blocking electrode."""
        return hsu_mansfeld_capacitance(self.admittance, self.alpha, self.transfer_ohm)


def brug_capacitance(
    admittance: float, alpha: float, resistance_ohm: float, transfer_ohm: float = math.inf
) -> float:
    """Capacitance of a constant-phase element whose time constants are spread along the surface. [F]

    C = Q^(1/alpha) (1/R_s + 1/R_ct)^((alpha - 1)/alpha) [1]_; without R_ct the limit of a blocking electrode.

    Parameters
    ----------
    admittance : float
        Q. [F s^(alpha - 1)]
    alpha : float
        Exponent, above 0, at most 1.
    resistance_ohm, transfer_ohm : float
        [ohm]

    Examples
    --------
    >>> round(brug_capacitance(5e-5, 0.9, 20.0, 1e4) * 1e6, 4)
    23.2028

    References
    ----------
    .. [1] Brug, van den Eeden, Sluyters-Rehbach & Sluyters, J. Electroanal. Chem. 176 (1984) 275.
    """
    conductance = 1.0 / resistance_ohm + 1.0 / transfer_ohm
    return float(admittance ** (1.0 / alpha) * conductance ** ((alpha - 1.0) / alpha))


def hsu_mansfeld_capacitance(admittance: float, alpha: float, transfer_ohm: float) -> float:
    """Capacitance of a constant-phase element whose time constants are spread normal to the surface. [F]

    C = Q^(1/alpha) R_ct^((1 - alpha)/alpha) [1]_, [2]_. NaN without a finite R_ct.

    Parameters as in `brug_capacitance`.

    Examples
    --------
    >>> round(hsu_mansfeld_capacitance(5e-5, 0.9, 1e4) * 1e6, 4)
    46.2937

    References
    ----------
    .. [1] Hsu & Mansfeld, Corrosion 57 (2001) 747.
    .. [2] Hirschorn et al., Electrochim. Acta 55 (2010) 6218.
    """
    if not math.isfinite(transfer_ohm):
        return math.nan
    return float(admittance ** (1.0 / alpha) * transfer_ohm ** ((1.0 - alpha) / alpha))


def circuit_impedance(
    angular_frequency: FloatArray, resistance_ohm: float, transfer_ohm: float, admittance: float, alpha: float
) -> ComplexArray:
    """Impedance of the circuit of this module, (n_points,). [ohm]"""
    element = admittance * (1j * angular_frequency) ** alpha
    result: ComplexArray = np.asarray(resistance_ohm + 1.0 / (1.0 / transfer_ohm + element), dtype=complex)
    return result


def fit_circuit(frequency_hertz: FloatArray, impedance_ohm: ComplexArray) -> CircuitFit:
    """Complex nonlinear least squares, each point weighed by its modulus.

    The resistance's uncertainty holds the covariance of the fit and, as a rectangular distribution, how far a
    fit to the highest frequencies alone moves it.

    Parameters
    ----------
    frequency_hertz : (n_points,) float array
    impedance_ohm : (n_points,) complex array
        A capacitive imaginary part is negative.

    Raises
    ------
    ImpedanceError
        Fewer than six points that are not inductive, or values that are no impedance.
    """
    if not (np.isfinite(frequency_hertz).all() and np.isfinite(impedance_ohm).all()):
        raise ImpedanceError("the spectrum holds a value that is not a finite number", "finite numbers")
    if not (frequency_hertz > 0.0).all() or (np.abs(impedance_ohm) == 0.0).any():
        raise ImpedanceError(
            "a frequency or an impedance of the spectrum is not above zero",
            "frequencies and impedances above zero",
        )
    if np.sum(impedance_ohm.imag < 0.0) < np.sum(impedance_ohm.imag > 0.0):
        raise ImpedanceError(
            "most imaginary parts of the spectrum are positive",
            "capacitive imaginary parts as negative numbers",
        )
    kept = (impedance_ohm.imag < 0.0) & (impedance_ohm.real > 0.0)
    omega, z = 2.0 * math.pi * frequency_hertz[kept], impedance_ohm[kept]
    left_out = int(kept.size - kept.sum())
    if omega.size < FEWEST_POINTS or len(np.unique(omega)) < FEWEST_POINTS:
        raise ImpedanceError(
            f"the spectrum has {omega.size} capacitive point(s)",
            f"{FEWEST_POINTS} frequencies or more with a negative imaginary part",
        )
    whole = _fit(omega, z, _starts(omega, z))
    upper = omega >= omega.max() * 10.0**-_HIGH_DECADES
    moved = 0.0
    if upper.sum() >= FEWEST_POINTS and upper.sum() < omega.size:
        part = _fit(omega[upper], z[upper], [whole.start, *_starts(omega[upper], z[upper])])
        # where one circuit does not hold over all frequencies, the high ones know the resistance
        if whole.misfit > MISFIT >= part.misfit:
            whole = _Fitted(
                np.concatenate((part.values[:1], whole.values[1:])),
                np.concatenate((part.u[:1], whole.u[1:])),
                whole.misfit,
                whole.start,
            )
        moved = part.values[0] - whole.values[0]
    resistance, transfer, admittance, alpha = whole.values.tolist()
    u = whole.u.tolist()
    blocking = transfer > _BLOCKING * float(np.abs(z).max())
    return CircuitFit(
        resistance,
        math.hypot(u[0], moved / math.sqrt(3.0)),
        math.inf if blocking else transfer,
        math.nan if blocking else u[1],
        admittance,
        u[2],
        alpha,
        u[3],
        whole.misfit,
        omega.size,
        left_out,
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Fitted:
    values: FloatArray  # R_s, R_ct, Q, alpha
    u: FloatArray  # (4,)
    misfit: float
    start: FloatArray  # (4,) where a fit to a part of the points may start


def _fit(omega: FloatArray, z: ComplexArray, starts: Sequence[FloatArray]) -> _Fitted:
    """The best fit found; starting points are tried from the nearest on until one leads to a fit."""
    from scipy.optimize import least_squares

    modulus = np.abs(z)

    def residuals(p: FloatArray) -> FloatArray:
        with np.errstate(over="ignore", under="ignore"):
            r, transfer, admittance = np.exp(p[:3])
            difference = (circuit_impedance(omega, r, transfer, admittance, p[3]) - z) / modulus
        return np.concatenate((difference.real, difference.imag))

    highest = float(modulus.max())
    # what the logarithms may be: nine decades about what the spectrum shows
    low = np.array([math.log(float(modulus.min()) * 1e-6), math.log(highest * 1e-3), -60.0, 0.3])
    high = np.array([math.log(highest), math.log(highest * 1e5), 20.0, 1.0])
    best = None
    inside = [np.clip(start, low + 1e-9, high - 1e-9) for start in starts]
    for start in sorted(inside, key=lambda one: float(np.sum(residuals(one) ** 2))):
        found = least_squares(residuals, start, bounds=(low, high), x_scale="jac", max_nfev=100)
        if best is None or found.cost < best.cost:
            best = found
        if math.sqrt(2.0 * float(best.cost) / omega.size) <= MISFIT:
            break
    assert best is not None
    values = np.concatenate((np.exp(best.x[:3]), best.x[3:]))
    square = 2.0 * float(best.cost)
    freedom = 2 * omega.size - 4
    # a parameter the data say nothing about (R_ct of a blocking electrode) must not spoil those of the others
    _, singular, right = np.linalg.svd(best.jac, full_matrices=False)
    held = singular > singular.max() * 1e-10
    covariance = (right[held].T / singular[held] ** 2) @ right[held] * square / freedom
    u = np.sqrt(np.diag(covariance)) * np.concatenate((values[:3], [1.0]))
    return _Fitted(values, u, math.sqrt(square / omega.size), best.x)


def _starts(omega: FloatArray, z: ComplexArray) -> list[FloatArray]:
    """Starting points: R_s from the high end, Q and alpha from the slope of the imaginary part."""
    order = np.argsort(omega)
    w, x = omega[order], z[order]
    r = max(float(x.real.min()), 1e-6 * float(np.abs(x).max()))
    span = max(float(x.real.max()) - r, 1e-3 * r)
    slope = np.polyfit(np.log(w), np.log(-x.imag), 1)[0]
    starts = []
    for alpha in (min(max(-float(slope), 0.5), 0.99), 0.9):
        middle = w.size // 2
        admittance = math.sin(0.5 * math.pi * alpha) / (-float(x.imag[middle]) * float(w[middle]) ** alpha)
        starts += [
            np.array([math.log(0.95 * r), math.log(transfer), math.log(admittance), alpha])
            for transfer in (span, 20.0 * float(np.abs(x).max()))
        ]
    # the top of the arc: w (R Q)^(1/alpha) = 1
    top = int(np.argmax(-x.imag))
    starts.append(
        np.array([math.log(0.95 * r), math.log(span), -math.log(span) - 0.9 * math.log(w[top]), 0.9])
    )
    return starts
