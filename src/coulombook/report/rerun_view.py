"""What came of making results again, for a terminal."""

from __future__ import annotations

import math
import sys
from collections.abc import Sequence

from rich.console import Console
from rich.text import Text

import coulombook
from coulombook.prose.numbers import plain
from coulombook.prose.text import visible
from coulombook.report.rerun import Difference, Rerun
from coulombook.report.stored import Stored
from coulombook.report.terminal import hanging

AT_MOST = 10


def show_rerun(stored: Stored, rerun: Rerun, console: Console) -> None:
    """Print what is as it was and what is not: the folder, what went in, what came out, and by what."""
    written = f"written {stored.manifest.created} by version {stored.manifest.version}"
    console.print(
        Text(f"{visible(stored.manifest.day, 100)}, {visible(written, 100)}", style="bold"), soft_wrap=True
    )
    _show_names("results", "as written", "changed since", (*stored.changed, *stored.missing), console)
    _show_names("inputs", "the same files", "not the same", rerun.changed_inputs, console)
    same = f"made again, the same to the bit ({len(rerun.identical)} files)"
    _show_names("outputs", same, "come out otherwise", rerun.different, console)
    for one in rerun.differences:
        _show_difference(one, console)
    others = _other_versions(stored)
    if rerun.different and others:
        hanging("", f"Other versions than then: {', '.join(others)}.", console)
    good = rerun.same and not stored.changed and not stored.missing
    verdict = "These results stand." if good else "These results do not stand as they are."
    console.print(Text(verdict, style="bold green" if good else "bold yellow"))


def _show_names(what: str, good: str, bad: str, names: Sequence[str], console: Console) -> None:
    if not names:
        console.print(Text(f"{what:9}{good}"))
        return
    shown = ", ".join(visible(name, 100) for name in names[:AT_MOST])
    more = f" and {len(names) - AT_MOST} more" if len(names) > AT_MOST else ""
    hanging(f"{what:9}", f"{bad}: {shown}{more}", console)


def _show_difference(one: Difference, console: Console) -> None:
    size = "" if math.isinf(one.size) else f", {plain(one.size, 2)} apart relatively"
    cells = "1 cell" if one.cells == 1 else f"{one.cells} cells, most of all"
    text = f"{cells} {one.where}, '{one.head}': {one.written} written, {one.again} now{size}"
    hanging(f"         {one.table}.csv: ", text, console)


def _other_versions(stored: Stored) -> list[str]:
    """Versions that are not those of the manifest, of what is loaded now."""
    now = {"coulombook": coulombook.__version__}
    now |= {
        name: str(getattr(sys.modules[name], "__version__", ""))
        for name in stored.manifest.libraries
        if name in sys.modules
    }
    then = {"coulombook": stored.manifest.version, **stored.manifest.libraries}
    return [f"{name} {then[name]} then, {now[name]} now" for name in now if now[name] != then[name]]
