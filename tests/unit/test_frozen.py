"""Data that travel between the core rooms are frozen, slotted dataclasses; arrays in them are not compared by value."""

from __future__ import annotations

import dataclasses
import importlib
import pkgutil

import pytest

import coulombook

ROOMS = ("uncertainty", "curves", "cell", "amounts", "balance", "compare")
# laid out step by step while a program is made, and never handed on
BUILT_IN_PLACE = {"_Slot", "_Plan"}


def _classes() -> list[type]:
    found: dict[str, type] = {}
    for room in ROOMS:
        package = importlib.import_module(f"coulombook.{room}")
        for module in pkgutil.iter_modules(package.__path__, f"coulombook.{room}."):
            for one in vars(importlib.import_module(module.name)).values():
                if isinstance(one, type) and dataclasses.is_dataclass(one) and one.__module__ == module.name:
                    found[f"{module.name}.{one.__qualname__}"] = one
    assert coulombook.__version__
    return [found[name] for name in sorted(found)]


@pytest.mark.parametrize("one", _classes(), ids=lambda one: f"{one.__module__}.{one.__name__}")
def test_data_that_travel_are_frozen_and_slotted(one: type) -> None:
    # what a class was made with; the standard library keeps it there for good
    made = one.__dataclass_params__  # type: ignore[attr-defined] # of every dataclass
    assert "__slots__" in vars(one)
    assert made.frozen or one.__name__ in BUILT_IN_PLACE
    if any("Array" in str(field.type) or "NDArray" in str(field.type) for field in dataclasses.fields(one)):
        assert not made.eq, "arrays have no truth value to compare by"
