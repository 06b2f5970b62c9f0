"""How often intervals of comparisons hold, and how often equal catalysts are told apart: the table of the how-to.

    python -m tests.benchmarks.comparisons

draws 600 days of each kind and writes the table into docs/how_to_compare.md.
"""

from __future__ import annotations

import re
from pathlib import Path

from tests.unit.compare.test_pairs import World

from coulombook.compare.pairs import family

DOCUMENT = Path(__file__).parents[2] / "docs" / "how_to_compare.md"
DAYS, SEED = 600, 1
_TABLE = re.compile(r"^\| catalysts \| levels .*?(?=^$)", re.DOTALL | re.MULTILINE)

WORLDS = (
    ("six equal", World((0.5,) * 6, 1, 3, 0.01, 0.03, (0.0,) * 6)),
    ("six equal", World((0.5,) * 6, 1, 2, 0.01, 0.03, (0.01,) * 6)),
    ("six equal", World((0.5,) * 6, 1, 3, 0.01, 0.03, (0.03,) * 6)),
    ("six equal", World((0.5,) * 6, 3, 2, 0.01, 0.03, (0.0,) * 6)),
    ("six equal", World((0.5,) * 6, 3, 2, 0.01, 0.03, (0.03,) * 6)),
    ("six equal", World((0.5,) * 6, 3, 3, 0.01, 0.03, (0.02,) * 6)),
    ("four different", World((0.6, 0.5, 0.3, 0.1), 3, 3, 0.01, 0.03, (0.02,) * 4)),
    ("four different, flow 20 %", World((0.6, 0.5, 0.3, 0.1), 3, 3, 0.01, 0.2, (0.02,) * 4)),
    ("six equal, one scatters 10 %", World((0.5,) * 6, 3, 3, 0.01, 0.03, (0.01,) * 5 + (0.1,))),
    ("two equal, one scatters 10 %", World((0.5,) * 2, 3, 3, 0.01, 0.03, (0.01, 0.1))),
    ("two equal", World((0.5,) * 2, 3, 3, 0.01, 0.03, (0.03,) * 2)),
    ("two equal", World((0.5,) * 2, 3, 2, 0.01, 0.03, (0.03,) * 2)),
)


def row(name: str, world: World) -> str:
    """One line of the table."""
    covered = ratios = pairs = false = 0
    for contests in world.days(DAYS, SEED):
        for level, found in enumerate(contests):
            for pair in found.pairs:
                a, b = (world.truth(int(one), level) for one in (pair.one, pair.other))
                covered += pair.low <= a - b <= pair.high
                ratios += pair.ratio_low <= a / b <= pair.ratio_high
                pairs += 1
        judged = family([found.pairs for found in contests])
        false += any(pair.told_apart(0.95) for point in judged for pair in point)
    undeclared = f"{100 * world.undeclared[0]:g} %" if world.undeclared[0] else "none"
    verdict = f"{100 * false / DAYS:.1f} %" if len(set(world.means)) == 1 else ""
    cells = (
        name,
        f"{world.levels}",
        f"{world.replicates}",
        undeclared,
        f"{100 * covered / pairs:.1f} %",
        f"{100 * ratios / pairs:.1f} %",
        verdict,
    )
    return f"| {' | '.join(cells)} |".replace("|  |", "| |")


def main() -> None:
    """Draw all kinds of days and write the table."""
    head = (
        "| catalysts | levels | replicates | undeclared scatter | difference | ratio | false verdict |\n"
        "| --- | --- | --- | --- | --- | --- | --- |\n"
    )
    lines = "\n".join(row(*one) for one in WORLDS) + "\n"
    text = DOCUMENT.read_text(encoding="utf-8")
    DOCUMENT.write_text(_TABLE.sub(lambda _: head + lines, text, count=1), encoding="utf-8")
    print(head + lines, end="")


if __name__ == "__main__":
    main()
