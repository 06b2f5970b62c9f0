"""Probabilities of a family of tests, adjusted for their number.

Apart from the tests themselves, for a plain tally needs these alone.
Source: Holm, Scand. J. Stat. 6 (1979) 65.
"""

from __future__ import annotations

import math
from collections.abc import Sequence


def holm(p: Sequence[float]) -> list[float]:
    """Holm's adjusted p values, in the order given; NaN stays NaN and does not count.

    >>> [round(one, 3) for one in holm([0.01, 0.04, 0.03])]
    [0.03, 0.06, 0.06]
    """
    known = [number for number, one in enumerate(p) if not math.isnan(one)]
    order = sorted(known, key=lambda number: p[number])
    adjusted = list(map(float, p))
    highest = 0.0
    for place, number in enumerate(order):
        highest = max(highest, min(1.0, (len(order) - place) * p[number]))
        adjusted[number] = highest
    return adjusted
