"""Faults of the machine, made on purpose: what is left of the results, and what the command says."""
