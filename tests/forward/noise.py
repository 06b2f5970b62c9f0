"""Errors that are drawn as they are declared: one for the day, one for each run, or one for each reading."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from tests.forward.truth import Error


class Draws:
    """Turns true values into entered ones.

    Without a random generator every value is entered as it is.
    """

    def __init__(self, errors: Iterable[Error] = (), generator: np.random.Generator | None = None) -> None:
        self._errors: dict[str, list[Error]] = {}
        for error in errors:
            self._errors.setdefault(error.quantity, []).append(error)
        self._generator = generator
        self._kept: dict[tuple[int, str], float] = {}

    def _normal(self, error: Error, run: str) -> float:
        assert self._generator is not None
        if error.shared == "reading":
            return float(self._generator.standard_normal())
        key = (id(error), run if error.shared == "run" else "")
        if key not in self._kept:
            self._kept[key] = float(self._generator.standard_normal())
        return self._kept[key]

    def entered(self, quantity: str, true: float, run: str) -> float:
        """The value a bench would enter for a true one."""
        if self._generator is None:
            return true
        value = true
        for error in self._errors.get(quantity, ()):
            z = self._normal(error, run)
            if error.relative is not None:
                value += true * error.relative * z
            if error.absolute is not None:
                value += error.absolute * z
        return value

    def scatter(self, sd: float) -> float:
        """One normal deviate of standard deviation ``sd``; 0 without a generator."""
        if self._generator is None or sd == 0:
            return 0.0
        return sd * float(self._generator.standard_normal())

    def many(self, sd: float, size: int) -> np.ndarray:
        """Several independent deviates of standard deviation ``sd``; zeros without a generator."""
        if self._generator is None or sd == 0:
            return np.zeros(size)
        return sd * self._generator.standard_normal(size)
