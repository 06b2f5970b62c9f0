"""Benchmarks: how long the work takes and how much memory it needs, as ratios against something plain.

    python -m tests.benchmarks            measure everything and rewrite docs/benchmarks.md
    python -m tests.benchmarks help one   measure some of it and print the table only

Not part of the tests: a slow machine is no fault of the code. Both sides of a ratio run in turns, so that whatever
else the machine does falls on both, and the medians are compared.
"""
