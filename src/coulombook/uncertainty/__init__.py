"""Inputs with standard uncertainty and sharing, and how they travel through a measurement function."""
