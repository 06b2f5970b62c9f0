"""NMR signals: saturation by fast repetition, and whether the signals of one analyte agree."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coulombook.curves.quantiles import chi2_tail
from coulombook.uncertainty.linearised import Number

FloatArray = NDArray[np.float64]


def saturation_factor(repetition_time: Number, t1: Number, flip_angle: FloatArray | float) -> Number:
    """Steady-state signal over that of one pulse of 90 degrees on relaxed spins. [1]

    f = sin(a) (1 - E)/(1 - E cos(a)), E = exp(-TR/T1), transverse magnetisation gone before each pulse [1]_. An
    integral divided by f is what full relaxation would have given; sin(a), common to all signals of a spectrum,
    cancels in their ratios.

    Parameters
    ----------
    repetition_time : float, array or `Linearised`
        Time from pulse to pulse, acquisition included. [s]
    t1 : float, array or `Linearised`
        Longitudinal relaxation time of the signal. [s]
    flip_angle : float or array
        Flip angle of the pulse. [rad]

    Examples
    --------
    >>> round(float(saturation_factor(np.array(15.0), np.array(3.0), np.pi / 2)), 4)
    0.9933

    References
    ----------
    .. [1] Ernst & Anderson, Rev. Sci. Instrum. 37 (1966) 93.
    """
    decay = np.exp(-(repetition_time / t1))
    return np.sin(flip_angle) * (1.0 - decay) / (1.0 - decay * np.cos(flip_angle))


@dataclass(frozen=True, slots=True, eq=False)
class SignalAgreement:
    """Agreement of several estimates of one quantity.

    ``deviation`` (n_signals,) is each estimate less the mean of the others, in its standard uncertainty; ``odd`` is the
    one that deviates most, None with fewer than three, for of two that differ neither is the odd one. Whether
    they differ at all says ``p``.
    """

    mean: float
    u_mean: float
    chi_square: float
    degrees_of_freedom: int
    p: float
    deviation: FloatArray
    odd: int | None


def signal_agreement(values: ArrayLike, u: ArrayLike) -> SignalAgreement:
    """Do the signals of one analyte give the same amount?

    The weighted mean minimises chi^2 = sum (value - mean)^2/u^2, which with n - 1 degrees of freedom tells whether
    the uncertainties explain the differences (Birge, Phys. Rev. 40 (1932) 207; Cox, Metrologia 39 (2002) 589). A
    signal that overlaps another or lies near a suppressed solvent shows as the odd one.

    Parameters
    ----------
    values : (n_signals,) array_like
        Estimates of the same quantity.
    u : (n_signals,) or (n_signals, n_signals) array_like
        Their standard uncertainties, without what they share (internal standard, volumes); or their covariance.

    Raises
    ------
    ValueError
        No values, an uncertainty that is not above zero, or numbers that are not finite.

    Examples
    --------
    >>> found = signal_agreement([1.00, 1.02, 1.50], [0.02, 0.02, 0.02])
    >>> found.p < 1e-6, found.odd
    (True, 2)
    """
    values, u = np.asarray(values, dtype=float), np.asarray(u, dtype=float)
    if values.size == 0:
        raise ValueError("there are no signals to compare")
    covariance = np.diag(np.square(u)) if u.ndim == 1 else u
    if not (
        np.isfinite(values).all() and np.isfinite(covariance).all() and (np.diag(covariance) > 0.0).all()
    ):
        raise ValueError("every signal needs a finite value and an uncertainty above zero")
    inverse = np.linalg.inv(covariance)
    weight = inverse.sum(axis=0)
    mean = float(weight @ values / weight.sum())
    residual = values - mean
    pulled = inverse @ residual
    chi_square = float(residual @ pulled)
    freedom = values.size - 1
    # a shift of one value alone: the estimate of the shift over its standard uncertainty
    own = np.diag(inverse) - np.square(weight) / weight.sum()
    deviation = np.divide(pulled, np.sqrt(np.maximum(own, 0.0)), out=np.zeros_like(pulled), where=own > 0.0)
    return SignalAgreement(
        mean=mean,
        u_mean=float(weight.sum() ** -0.5),
        chi_square=chi_square,
        degrees_of_freedom=freedom,
        p=chi2_tail(chi_square, freedom) if freedom else 1.0,
        deviation=deviation if freedom else np.zeros(1),
        odd=int(np.argmax(np.abs(deviation))) if freedom > 1 else None,
    )
