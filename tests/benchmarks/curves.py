"""Three hundred calibration lines of eight levels, weights 1/x^2, against a loop of `np.polyfit`; prints JSON.

    python -m tests.benchmarks.curves FOLDER REPEATS

Both give the coefficients with their covariance, and must agree. Nothing is written to FOLDER.
"""

from __future__ import annotations

import json
import sys

import numpy as np
from tests.benchmarks.measure import in_turns, timed

from coulombook.curves import fit_many

CURVES, LEVELS = 300, 8


def measure(repeats: int) -> dict[str, float]:
    """Seconds of both sides, after asserting that they agree."""
    generator = np.random.default_rng(20430418)
    x = np.tile(np.geomspace(1e-6, 1e-3, LEVELS), (CURVES, 1))
    slope = 10.0 ** generator.uniform(5.0, 7.0, (CURVES, 1))
    y = (1.0 + slope * x) * (1.0 + 0.01 * generator.standard_normal(x.shape))

    def ours() -> None:
        fit_many(x, y, "line", "1/x^2")

    def loop() -> list[tuple[np.ndarray, np.ndarray]]:
        return [np.polyfit(one, other, 1, w=1.0 / one, cov=True) for one, other in zip(x, y, strict=True)]

    found = fit_many(x, y, "line", "1/x^2")
    for number, (coefficients, covariance) in enumerate(loop()):
        np.testing.assert_allclose(found.coefficients[number, 1::-1], coefficients, rtol=1e-6)
        np.testing.assert_allclose(found.covariance[number, 1::-1, 1::-1], covariance, rtol=1e-6)
    costs = in_turns({"ours": timed(ours), "polyfit": timed(loop)}, repeats)
    return {side: cost.second for side, cost in costs.items()} | {"curves": CURVES}


if __name__ == "__main__":
    print(json.dumps(measure(int(sys.argv[2]))))
