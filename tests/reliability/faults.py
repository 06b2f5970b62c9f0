"""Make faults of some kinds and tell what became of them: `python -m tests.reliability.faults moments=20 full=10`."""

from __future__ import annotations

import argparse
import dataclasses
import json
import os
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path

from tests.reliability import disk, drive, inputs, kills, writers
from tests.reliability.bench import Bench, Tally

KINDS: dict[str, Callable[[Bench, int, int], Tally]] = {
    "moments": kills.at_any_moment,
    "calls": kills.between_calls,
    "gone": drive.goes_away,
    "flicker": drive.flickers,
    "looked-at": drive.looked_at,
    "room": drive.fills_up,
    "full": disk.full,
    "limited": disk.limited,
    "read-only": disk.read_only,
    "forbidden": disk.forbidden,
    "at-once": writers.at_once,
    "without-locks": writers.without_locks,
    "held": writers.held,
    "open": writers.open_elsewhere,
    "damages": inputs.random_damages,
}


def main() -> int:
    """Make the faults asked for; what became of them as JSON, and the number of those not survived."""
    parser = argparse.ArgumentParser(prog="python -m tests.reliability.faults", description=__doc__)
    parser.add_argument("kinds", nargs="+", metavar="KIND=NUMBER", help=f"of {', '.join(KINDS)}")
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    # in memory where that can be had: a killed process, unlike a cut mains, does not need the disk to be waited for
    memory = "/dev/shm" if os.access("/dev/shm", os.W_OK) else None
    with tempfile.TemporaryDirectory(dir=memory) as place:
        # others than root must be able to look in
        Path(place).chmod(0o755)
        bench = Bench(Path(place))
        asked = [one.split("=") for one in options.kinds]
        found = {kind: KINDS[kind](bench, int(number), options.seed) for kind, number in asked}
        os.chdir(Path(place).parent)  # a folder that somebody is in cannot be removed everywhere
    print(json.dumps({kind: dataclasses.asdict(one) for kind, one in found.items()}, indent=1))
    return sum(len(one.failures) for one in found.values())


if __name__ == "__main__":
    sys.exit(min(main(), 99))
