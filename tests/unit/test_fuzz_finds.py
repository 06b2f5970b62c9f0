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


def test_nothing_that_was_found_breaks_a_target_any_more() -> None:
    for path in sorted(FINDS.glob("*/*")):
        TARGETS[path.parent.name](path.read_bytes())


def test_a_target_that_breaks_its_word_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(path: object) -> None:
        raise IndexError("beyond the end")

    monkeypatch.setattr("coulombook.check", broken)
    with pytest.raises(IndexError, match="beyond the end"):
        TARGETS["tables"](b"\0run")
