"""Broken days: each has one thing wrong, and the command must say what, where, and what would do.

The days are invented.
"""
