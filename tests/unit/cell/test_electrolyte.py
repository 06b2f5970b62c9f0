"""pH of a hydrogencarbonate electrolyte."""

from __future__ import annotations

import pytest

from coulombook.cell.electrolyte import bicarbonate_ph, davies_log10_activity


def test_dilute_solution_follows_the_first_dissociation() -> None:
    # without activity, carbonate and hydroxide: [H+] = K1 K_H p / c = 10^-6.352 x 0.034 x 0.98156 / 0.001, pH 4.83;
    # the proton's own charge is then 1.5 % of c, so a second step: / (0.001 + 1.484e-5)
    first = 10**-6.352 * 0.034 * 0.98156 / 0.001
    proton = 10**-6.352 * 0.034 * 0.98156 / (0.001 + first)
    # the step left out moves [H+] by (1.5 %)^2 of itself
    assert 10 ** -bicarbonate_ph(0.001, activity=False) == pytest.approx(proton, rel=3e-4)


def test_less_co2_makes_the_solution_more_alkaline() -> None:
    # [H+] is proportional to the pressure as long as carbonate is small: a tenth of it is about one unit of pH
    assert bicarbonate_ph(0.1, 0.1) - bicarbonate_ph(0.1, 1.0) == pytest.approx(1.0, abs=0.05)


def test_activity_coefficient_falls_with_the_square_of_the_charge() -> None:
    assert davies_log10_activity(2, 0.1) == pytest.approx(4.0 * davies_log10_activity(1, 0.1), rel=1e-15)
    assert davies_log10_activity(1, 0.0) == 0.0


@pytest.mark.parametrize(
    ("concentration", "pressure"), [(0.0, 1.0), (-0.1, 1.0), (0.1, 0.0), (float("nan"), 1.0)]
)
def test_nothing_dissolved_is_refused(concentration: float, pressure: float) -> None:
    with pytest.raises(ValueError, match="must be above zero"):
        bicarbonate_ph(concentration, pressure)
