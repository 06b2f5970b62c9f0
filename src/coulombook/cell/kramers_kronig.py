"""Linear Kramers-Kronig check of an impedance spectrum.

A resistance, an inductance, a capacitance and a row of RC elements in series obey the Kramers-Kronig relations
whatever their sizes. With time constants fixed evenly in ln(t) over the measured frequencies the sizes follow from
linear least squares; what such a circuit cannot follow is no impedance of a linear system that stands still
(Boukamp, J. Electrochem. Soc. 142 (1995) 1885).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

FEWEST_POINTS = 10
# root mean square residual that a good spectrum stays below (common practice, no source)
SOUND = 0.01
_PER_DECADE = 4.0  # RC elements; sharper features than such a row can follow no electrode shows
_SHARE = 0.6  # of the points, that the elements may number at most
_BEYOND = (
    5.0  # how far the time constants go beyond the measured ones at either end, for what lies out of sight
)
_LARGEST = 3.0  # autocorrelation of residuals over its standard deviation that chance does not reach


@dataclass(frozen=True, slots=True, eq=False)
class KramersKronig:
    """Residuals of the check, relative to the modulus of the impedance."""

    real: FloatArray  # (n_points,) in the order given
    imaginary: FloatArray  # (n_points,)
    residual: float  # root mean square of the complex residual, freedom spent considered
    order: float  # how far neighbours agree, in standard deviations of chance
    elements: int

    @property
    def sound(self) -> bool:
        """Whether the spectrum passes: residuals small, or large by chance alone."""
        return self.residual <= SOUND or self.order <= _LARGEST


def kramers_kronig(frequency_hertz: FloatArray, impedance_ohm: ComplexArray) -> KramersKronig | None:
    """The check, each point weighed by its modulus; None with fewer than ten points.

    Parameters
    ----------
    frequency_hertz : (n_points,) float array
        In any order, above zero.
    impedance_ohm : (n_points,) complex array
        A capacitive imaginary part is negative. [ohm]
    """
    omega = 2.0 * math.pi * frequency_hertz
    n = omega.size
    decades = math.log10(float(omega.max() / omega.min())) if n else 0.0
    if n < FEWEST_POINTS or not decades > 0.0:
        return None
    modulus = np.abs(impedance_ohm)
    elements = min(round(_SHARE * n), max(2, round(_PER_DECADE * (decades + 2.0 * math.log10(_BEYOND)))))
    tau = np.geomspace(1.0 / (_BEYOND * float(omega.max())), _BEYOND / float(omega.min()), elements)
    columns = np.concatenate(
        (
            np.ones((n, 1)),
            (1j * omega / float(omega.max()))[:, None],
            (float(omega.min()) / (1j * omega))[:, None],
            1.0 / (1.0 + 1j * omega[:, None] * tau),
        ),
        axis=1,
    )
    design = np.concatenate((columns.real, columns.imag)) / np.tile(modulus, 2)[:, None]
    target = np.concatenate((impedance_ohm.real, impedance_ohm.imag)) / np.tile(modulus, 2)
    # columns of neighbouring time constants are almost alike; their sizes do not matter, the residuals do
    sizes = np.linalg.norm(design, axis=0)
    solution, *_ = np.linalg.lstsq(design / sizes, target, rcond=1e-10)
    left = target - (design / sizes) @ solution
    real, imaginary = left[:n], left[n:]
    freedom = max(2 * n - columns.shape[1], 1)
    along = np.argsort(omega)
    square = float(left @ left)
    pairs = sum(float(part[along][:-1] @ part[along][1:]) for part in (real, imaginary))
    order = pairs / square * math.sqrt(2.0 * n) if square > 0.0 else 0.0
    return KramersKronig(real, imaginary, math.sqrt(2.0 * square / freedom), order, elements)
