"""Calibration curves: fit, weights, inverse, drift."""

from coulombook.curves.drift import interpolation_weights
from coulombook.curves.fit import FORMS, Curve, fit_curve, fit_polynomial
from coulombook.curves.inverse import invert, invertible, response
from coulombook.curves.weights import WEIGHTS, point_weights

__all__ = [
    "FORMS",
    "WEIGHTS",
    "Curve",
    "fit_curve",
    "fit_polynomial",
    "interpolation_weights",
    "invert",
    "invertible",
    "point_weights",
    "response",
]
