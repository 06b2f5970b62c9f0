"""The cell: potential scale, charge and current windows, headspace mixing, capacitance, electrolyte pH."""
