"""The house has one direction: a room imports only from rooms above it (see docs on the layout of the code)."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from importlib.util import find_spec
from pathlib import Path

import pytest

PACKAGE = "coulombook"
_SPEC = find_spec(PACKAGE)
assert _SPEC is not None
assert _SPEC.origin is not None
SOURCE = Path(_SPEC.origin).parent

ROOMS = (
    "data",
    "constants",
    "prose",
    "units",
    "species",
    "findings",
    "why",
    "uncertainty",
    "curves",
    "cell",
    "amounts",
    "balance",
    "compare",
    "book",
    "intake",
    "library",
    "tally",
    "comparison",
    "figures",
    "report",
    "cli",
    "__main__",
)
CORE = ("uncertainty", "curves", "cell", "amounts", "balance", "compare")
UNKNOWN_TO_CORE = frozenset({"pint", "pandas", "rich", "openpyxl", "xlsxwriter", "matplotlib", "pathlib"})


def imported(code: str, module: str) -> Iterator[str]:
    """Every module that a module's code names in an import, wherever in it, by its full name."""
    package = module if module.endswith("__init__") else module.rpartition(".")[0]
    package = package.removesuffix(".__init__")
    for node in ast.walk(ast.parse(code)):
        if isinstance(node, ast.Import):
            yield from (one.name for one in node.names)
        elif isinstance(node, ast.ImportFrom):
            parents = package.split(".")[: len(package.split(".")) - node.level + 1] if node.level else []
            base = ".".join([*parents, *([node.module] if node.module else [])])
            # `from coulombook import tally` may name a room
            yield from (f"{base}.{one.name}" for one in node.names)


def room_of(module: str) -> str | None:
    """The room a module of ours belongs to; None for other packages and for the package's own list of names."""
    parts = module.split(".")
    return parts[1] if parts[0] == PACKAGE and len(parts) > 1 and parts[1] in ROOMS else None


def against_the_order(code: str, module: str) -> list[str]:
    own = ROOMS.index(room_of(module) or "")
    return [
        name
        for name in imported(code, module)
        if (room := room_of(name)) is not None and ROOMS.index(room) > own
    ]


def unknown_to_core(code: str, module: str) -> list[str]:
    return [name for name in imported(code, module) if name.split(".")[0] in UNKNOWN_TO_CORE]


def modules() -> dict[str, Path]:
    """Every module of the package but the list of public names itself."""
    found = {}
    for path in sorted(SOURCE.rglob("*.py")):
        name = ".".join((PACKAGE, *path.relative_to(SOURCE).with_suffix("").parts))
        if name != f"{PACKAGE}.__init__":
            found[name] = path
    return found


@pytest.mark.parametrize("module", modules())
def test_a_module_imports_only_from_its_own_room_and_those_above(module: str) -> None:
    assert room_of(module) is not None, "the room is not in the list"
    assert against_the_order(modules()[module].read_text(encoding="utf-8"), module) == []


@pytest.mark.parametrize("module", [one for one in modules() if room_of(one) in CORE])
def test_formulas_know_no_units_package_frames_workbooks_screens_or_paths(module: str) -> None:
    assert unknown_to_core(modules()[module].read_text(encoding="utf-8"), module) == []


def test_every_core_room_is_there() -> None:
    assert {room_of(one) for one in modules()} >= set(CORE)


@pytest.mark.parametrize(
    "code",
    [
        "import coulombook.report.numbers",
        "from coulombook.report import numbers",
        "from coulombook import report",
        "from ..report.numbers import plain",
        "from .. import report",
        "def f():\n    from coulombook.cli import main",
        "if TYPE_CHECKING:\n    import coulombook.tally as t",
    ],
)
def test_an_import_against_the_order_is_seen_however_it_is_written(code: str) -> None:
    assert len(against_the_order(code, "coulombook.cell.charge")) == 1
    assert len(against_the_order(code, "coulombook.cell.__init__")) == 1


@pytest.mark.parametrize(
    "code",
    [
        "import coulombook.findings",
        "from coulombook.curves.fit import Curve",
        "from .potential import find_reference",
        "from . import potential",
        "from ..species import Species",
        "import numpy.report",
        "import coulombook",
    ],
)
def test_an_import_in_the_order_is_let_pass(code: str) -> None:
    assert against_the_order(code, "coulombook.cell.charge") == []


@pytest.mark.parametrize(
    "code",
    [
        "import pint",
        "from pandas import DataFrame",
        "def f():\n    import rich.table",
        "from pathlib import Path",
    ],
)
def test_what_the_core_must_not_know_is_seen_however_it_is_written(code: str) -> None:
    assert len(unknown_to_core(code, "coulombook.cell.charge")) == 1
