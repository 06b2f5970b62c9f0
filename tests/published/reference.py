"""Published and recomputed check values, read from ``reference_values.toml``.

Every case there names its source and how certain it is. ``published`` is a printed number with its
tolerance (half of the last printed digit, or the slack the case states); ``recomputed`` is a full-precision
value worked out apart from this package, held to ``rel_tol`` (1e-9 unless the case says otherwise).
"""

from __future__ import annotations

import math
import tomllib
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any


@dataclass(frozen=True, slots=True)
class Expected:
    """One number of a case."""

    case: str
    name: str
    published: float | None
    abs_tol: float
    recomputed: float | None
    rel_tol: float

    def check(self, found: float) -> None:
        """Hold a result against the printed and the recomputed value."""
        if self.published is not None:
            # the rounding of the subtraction itself, where the tolerance is a whole printed unit
            slack = 4e-16 * abs(self.published)
            assert abs(found - self.published) <= self.abs_tol + slack, (
                f"{self.case} {self.name}: {found!r}, {self}"
            )
        if self.recomputed is not None:
            assert math.isclose(found, self.recomputed, rel_tol=self.rel_tol), (
                f"{self.case} {self.name}: {found!r}, {self}"
            )


@dataclass(frozen=True, slots=True)
class Case:
    """Inputs and expected outputs of one source."""

    source: str
    inputs: dict[str, Any]
    expected: dict[str, Expected]


@cache
def _cases() -> dict[str, Case]:
    text = Path(__file__).with_name("reference_values.toml").read_text(encoding="utf-8")
    return {
        one["id"]: Case(
            one["source"],
            one["in"],
            {
                row["name"]: Expected(
                    one["id"],
                    row["name"],
                    row.get("published"),
                    row.get("abs_tol", 0.0),
                    row.get("recomputed"),
                    row.get("rel_tol", 1e-9),
                )
                for row in one["expect"]
            },
        )
        for one in tomllib.loads(text)["case"]
    }


def case(name: str) -> Case:
    """The case of that id."""
    return _cases()[name]
