"""Calibration curves: fit, weights, inverse, judgement, limits, drift, control."""

from coulombook.curves.carbon_number import effective_carbon_number, relative_response, scale_curve
from coulombook.curves.control import ControlChart, control_chart
from coulombook.curves.drift import interpolation_weights
from coulombook.curves.fit import FORMS, Curve, fit_curve, fit_polynomial
from coulombook.curves.interval import InverseEstimate, inverse_with_uncertainty
from coulombook.curves.inverse import invert, invertible, response
from coulombook.curves.judgement import Judgement, judge
from coulombook.curves.limits import SCHEMES, Limits
from coulombook.curves.many import ManyCurves, fit_many
from coulombook.curves.nmr import SignalAgreement, saturation_factor, signal_agreement
from coulombook.curves.prediction import curve_response, curve_variance, range_distance, reading_variance
from coulombook.curves.weights import WEIGHTS, point_weights

__all__ = [
    "FORMS",
    "SCHEMES",
    "WEIGHTS",
    "ControlChart",
    "Curve",
    "InverseEstimate",
    "Judgement",
    "Limits",
    "ManyCurves",
    "SignalAgreement",
    "control_chart",
    "curve_response",
    "curve_variance",
    "effective_carbon_number",
    "fit_curve",
    "fit_many",
    "fit_polynomial",
    "interpolation_weights",
    "inverse_with_uncertainty",
    "invert",
    "invertible",
    "judge",
    "point_weights",
    "range_distance",
    "reading_variance",
    "relative_response",
    "response",
    "saturation_factor",
    "scale_curve",
    "signal_agreement",
]
