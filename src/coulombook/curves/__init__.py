"""Calibration curves: fit, inverse, drift."""
