"""Marks of the whole-day tests."""

import pytest


def pytest_configure(config: pytest.Config) -> None:
    config.addinivalue_line(
        "markers", "slow: takes more than a minute; part of the normal run, left out by -m 'not slow'"
    )
