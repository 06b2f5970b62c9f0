"""The page of the example day: how long its tally takes with it, how long the page alone; prints JSON.

    python -m tests.benchmarks.page FOLDER REPEATS

A tally with workbook, figures and page stands against the script of the Faradaic efficiencies that draws the same
figures with matplotlib (`draw_by_hand.py`): once those that the page draws with matplotlib as well, once with the logs
of the runs, which the page draws in other ways. Both start cold, each in a process of its own.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

from tests.benchmarks.days import BENCH, CALIBRATIONS, copy_example
from tests.benchmarks.measure import in_turns, process, timed

import coulombook
from coulombook.report.page import page_html

DRAW = Path(__file__).with_name("draw_by_hand.py")


def main(folder: Path, repeats: int) -> dict[str, float]:
    """Seconds of each side, and the size of the page."""
    copy_example(folder)
    program, bytecode = Path(sys.executable).with_name("coulombook"), Path(f"{folder}-bytecode")
    told = ("--calibrations", CALIBRATIONS)
    figures = Path(f"{folder}-figures")
    process([program, "figures", folder, *told, "--out", figures, "--format", "svg"], bytecode)()

    def by_hand(logs: str) -> list[str | Path]:
        files = (BENCH.separator, BENCH.decimal, str(BENCH.head_lines), BENCH.encoding)
        return [
            sys.executable, DRAW, figures, f"{folder}-drawn", logs, folder, CALIBRATIONS, f"{folder}.csv", *files,
        ]  # fmt: skip

    costs = in_turns(
        {
            "whole": process(
                [program, "tally", folder, *told, "--out", f"{folder}-results", "--quiet"], bytecode
            ),
            "drawn": process(by_hand("no"), bytecode),
            "drawn with logs": process(by_hand("yes"), bytecode),
        },
        repeats,
    )
    book = coulombook.tally(folder, calibrations=[CALIBRATIONS])
    page = page_html(book)
    if page_html(book) != page:
        raise AssertionError("the same book gives two different pages")
    alone = in_turns({"page": timed(lambda: page_html(book))}, repeats)
    return {
        **{name: cost.second for name, cost in costs.items()},
        **{f"{name} processor": cost.processor_second for name, cost in costs.items()},
        "page": alone["page"].second,
        "bytes": len(page.encode("utf-8")),
    }


if __name__ == "__main__":
    print(json.dumps(main(Path(sys.argv[1]), int(sys.argv[2]))))
