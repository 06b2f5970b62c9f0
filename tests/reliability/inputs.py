"""Bad inputs: how many are tried, and whether each is answered clearly."""

from __future__ import annotations

import random
import shutil
import subprocess
import sys
import tempfile
import xml.etree.ElementTree as ET
from pathlib import Path

from tests.faults.answer import said
from tests.faults.day import GOOD, write_day
from tests.faults.test_any_damage import damaged
from tests.reliability.bench import Bench, Tally, child, command

ROOT = Path(__file__).parents[2]


def known(*_: object) -> Tally:
    """The broken days of tests/faults, each with the place and the words it must be answered with."""
    told = Tally("broken days of tests/faults, with place and words of the answer")
    with tempfile.TemporaryDirectory() as place:
        report = Path(place) / "report.xml"
        subprocess.run(
            [sys.executable, "-m", "pytest", "-q", "-p", "no:cacheprovider", "tests/faults", f"--junitxml={report}"],
            cwd=ROOT, capture_output=True, check=False,
        )  # fmt: skip
        for case in ET.parse(report).iter("testcase"):
            if case.find("skipped") is None:
                broken = [one.tag for one in case if one.tag in ("failure", "error")]
                told.note(f"{case.get('classname')}.{case.get('name')}", broken)
    return told


def random_damages(bench: Bench, number: int, seed: int) -> Tally:
    """Files of a good day damaged at random, one to three at once; beyond those that the suite tries."""
    told = Tally("files damaged at random")
    place = bench.day.parent / "damaged"
    for one in range(number):
        chance = random.Random(1_000_000 * seed + one)
        changes = {
            name: damaged(GOOD[name], chance, settings=name.endswith(".toml"))
            for name in chance.sample(sorted(GOOD), chance.choice([1, 1, 2, 3]))
        }
        day = write_day(place / "day", changes)
        # workbook and page take most of the time
        ended = child(command("tally", day, *(["--tables-only"] if one % 10 else [])))
        errors = [found for found in said(ended.said) if found.word == "error"]
        problems = [] if ended.status in (0, 1) else [f"ended with {ended.status}: {ended.said}"]
        if (day / "results").exists() != (ended.status == 0) or bool(errors) != (ended.status == 1):
            problems.append(f"status {ended.status} with {len(errors)} faults said")
        problems += [
            f"half an answer: {found}"
            for found in errors
            if not (found.found and found.expected and found.mend)
        ]
        told.note(f"damage {one} of {', '.join(changes)}", problems)
        shutil.rmtree(place)
    return told
