"""Inputs that once broke a target of the fuzzer break none any more; and each target takes its first inputs."""

from __future__ import annotations

from pathlib import Path

import pytest
from tests.fuzz.targets import TARGETS, seeds

FINDS = Path(__file__).resolve().parents[1] / "fuzz" / "finds"


@pytest.mark.parametrize("name", TARGETS)
def test_target_takes_its_seeds_and_nothing_at_all(name: str) -> None:
    for data in (b"", *seeds(name)):
        TARGETS[name](data)


@pytest.mark.parametrize("path", sorted(FINDS.glob("*/*")), ids=lambda path: f"{path.parent.name}-{path.name}")
def test_find_breaks_nothing_any_more(path: Path) -> None:
    TARGETS[path.parent.name](path.read_bytes())
