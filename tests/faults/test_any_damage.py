"""Damage nobody thought of: whatever it does to a day, the command answers, and writes nothing beside a fault."""

from __future__ import annotations

import random
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command
from tests.faults.day import GOOD

# what ends up in cells by slips of hands and of instruments
CELLS = (
    "", "-1", "0", "1e29", "-1e29", "2e-60", "1e300", "nan", "inf", "a1", "yes", "2043-05-18", "2043-05-18T09:00:00",
    "9" * 30, "ä", "=1+1", "FID", "CO", "N2", "formate", "DMSO", "3600", "-0", "blank", "x" * 300, "../x", "H2O",
)  # fmt: skip
VALUES = (
    "0", "-1", "1.5", "true", '"x"', "[]", "{}", '"0 s"', '"1e29 s"', '"1e300 s"', '"100 %"', "nan", "inf",
    "2043-05-18", '["a"]', '"tracer"', '"balance"', '"measured"', '"wet"', '"nitrogen"', '"CO"',
    '"quadratic"', '"replicates"',
)  # fmt: skip
UNITS = ("s", "V", "mL", "umol", "sccm", "mL/min", "degC", "%", "h^99", "", "1", "K K", "dB", "pH")
DAMAGES = 40
# found by `python -m tests.reliability`: areas of 1e30 in all standards, a potential of 1e29 V in a voltammogram
FOUND = (1_000_142, 1_000_154)


def damaged(text: str, chance: random.Random, *, settings: bool) -> str:
    """One file with one thing changed in it."""
    if settings:
        lines = text.splitlines()
        place = chance.choice([number for number, line in enumerate(lines) if "=" in line])
        key = lines[place].partition("=")[0]
        lines[place] = "" if chance.random() < 0.2 else f"{key}= {chance.choice(VALUES)}"
        return "\n".join(lines) + "\n"
    rows = [line.split(",") for line in text.splitlines()]
    row, column = chance.randrange(1, len(rows)), chance.randrange(len(rows[0]))
    match chance.randrange(7):
        case 0 | 1:
            rows[row][column] = chance.choice(CELLS)
        case 2:
            word = chance.choice(CELLS)
            rows[1:] = [[*one[:column], word, *one[column + 1 :]] for one in rows[1:]]
        case 3:
            rows[0][column] = f"{rows[0][column].partition(' / ')[0]} / {chance.choice(UNITS)}"
        case 4:
            rows = [one[:column] + one[column + 1 :] for one in rows]
        case 5:
            rows.append(rows[row])
        case 6:
            return text[: chance.randrange(len(text))]
    return "\n".join(map(",".join, rows)) + "\n"


@pytest.mark.parametrize("seed", [*range(DAMAGES), *FOUND])
def test_damaged_day_is_answered(seed: int, command: Command, broken_day: Callable[..., Path]) -> None:
    chance = random.Random(seed)
    changes = {}
    for name in chance.sample(sorted(GOOD), chance.choice([1, 1, 2, 3])):
        changes[name] = damaged(GOOD[name], chance, settings=name.endswith(".toml"))
    day = broken_day(changes)
    answer = command("tally", day)
    assert answer.status in (0, 1), f"{sorted(changes)}: {answer.err}"
    assert (day / "results").exists() == (answer.status == 0)
    # every fault says what, and what would do
    assert bool(answer.errors) == (answer.status == 1)
    for one in answer.errors:
        assert one.where
        assert one.text
        assert one.found
        assert one.expected
        assert one.mend
    assert command("check", day).status == answer.status
