"""The constants of nature that the formulas use.

Since 2019 the elementary charge, the Avogadro constant and the Boltzmann constant define the units of the SI and
have the values below exactly (BIPM, The International System of Units (SI Brochure), 9th ed., 2019, sect. 2.2);
the Faraday and the gas constant are products of them. Written here, and tested against `scipy.constants`, because
importing that package takes longer than the sums of a small day.
"""

from __future__ import annotations

ELEMENTARY_CHARGE = 1.602176634e-19  # C
AVOGADRO_CONSTANT = 6.02214076e23  # 1/mol
BOLTZMANN_CONSTANT = 1.380649e-23  # J/K

FARADAY_CONSTANT = AVOGADRO_CONSTANT * ELEMENTARY_CHARGE  # C/mol, F = N_A e
GAS_CONSTANT = AVOGADRO_CONSTANT * BOLTZMANN_CONSTANT  # J/(mol K), R = N_A k
