from __future__ import annotations

import importlib.metadata
import subprocess
import sys

import pytest

import coulombook


@pytest.mark.parametrize("name", coulombook.__all__)
def test_every_public_name_is_there(name: str) -> None:
    assert getattr(coulombook, name) is not None
    assert name in dir(coulombook)


def test_an_unknown_name_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="no attribute 'tallly'"):
        _ = coulombook.tallly  # type: ignore[attr-defined]


def test_every_public_name_is_known_to_type_checkers_as_well() -> None:
    import ast
    from pathlib import Path

    tree = ast.parse(Path(coulombook.__file__).read_text(encoding="utf-8"))
    guarded = next(node for node in tree.body if isinstance(node, ast.If))
    listed = {
        alias.asname for node in guarded.body if isinstance(node, ast.ImportFrom) for alias in node.names
    }
    assert listed == {*coulombook.__all__} - {"__version__"}


def run(code: str) -> str:
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60
    )
    return done.stdout.strip()


def test_tally_is_the_function_whatever_was_imported_first() -> None:
    for code in (
        "import coulombook.tally; import coulombook; print(callable(coulombook.tally))",
        "from coulombook.tally import check; import coulombook; print(callable(coulombook.tally))",
        "from coulombook import tally; import coulombook.tally; print(callable(tally), callable(coulombook.tally))",
    ):
        assert set(run(code).split()) == {"True"}


def test_importing_the_package_loads_nothing_else() -> None:
    loaded = run(
        "import sys; before = set(sys.modules); import coulombook; print(*set(sys.modules) - before)"
    )
    assert set(loaded.split()) == {"coulombook"}


def test_the_version_is_the_one_of_the_installed_package() -> None:
    assert importlib.metadata.version("coulombook") == coulombook.__version__
