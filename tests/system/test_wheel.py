"""What is given away: a wheel with the package, its data and nothing else, the same from every build."""

from __future__ import annotations

import re
import subprocess
import tomllib
import zipfile
from importlib import metadata
from pathlib import Path

import pytest
from hatchling.builders.wheel import WheelBuilder

ROOT = Path(__file__).resolve().parents[2]
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return build(tmp_path_factory.mktemp("first"))


def build(folder: Path) -> Path:
    (built,) = WheelBuilder(str(ROOT)).build(directory=str(folder), versions=["standard"])
    return Path(built)


def test_two_builds_are_the_same_to_the_bit(wheel: Path, tmp_path: Path) -> None:
    assert build(tmp_path).read_bytes() == wheel.read_bytes()


def test_wheel_holds_every_file_of_the_package_and_nothing_else(wheel: Path) -> None:
    names = {name for name in zipfile.ZipFile(wheel).namelist() if ".dist-info/" not in name}
    package = ROOT / "src" / "coulombook"
    files = {
        str(path.relative_to(package.parent).as_posix())
        for path in package.rglob("*")
        if path.is_file() and path.suffix not in (".pyc", ".pyo")
    }
    assert names == files


def test_nothing_that_git_does_not_know_would_be_given_away(wheel: Path) -> None:
    if not (ROOT / ".git").exists():
        pytest.skip("this is no clone, so that nothing tells which files belong to it")
    done = subprocess.run(
        ["git", "ls-files", "--others", "--exclude-standard", "src"],
        cwd=ROOT, capture_output=True, encoding="utf-8", check=True,
    )  # fmt: skip
    assert done.stdout == ""


def test_wheel_names_its_licence_and_its_command(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        said = {
            name.rpartition("/")[2]: archive.read(name).decode()
            for name in archive.namelist()
            if "dist-info" in name
        }
    assert "License-Expression: MIT" in said["METADATA"]
    assert said["LICENSE"] == (ROOT / "LICENSE").read_text(encoding="utf-8")
    assert "coulombook = coulombook.__main__:main" in said["entry_points.txt"]


def _names(requirements: list[str]) -> set[str]:
    return {re.split(r"[\[<>=!~ ;]", one)[0].casefold() for one in requirements}


def test_licences_of_all_that_is_installed_with_it_are_listed() -> None:
    document = (ROOT / "docs" / "licences.md").read_text(encoding="utf-8")
    listed = {
        row[0].casefold(): row[1]
        for row in re.findall(r"^\| (\S+) \| .* \| (.+) \|$", document, re.MULTILINE)
    }
    del listed["package"], listed["---"]
    assert listed.keys() == _names(PROJECT["dependencies"])
    families = ("BSD", "MIT", "MPL", "Matplotlib")
    for name, licence in listed.items():
        said = metadata.metadata(name)
        stated = " ".join(
            [
                said.get("License-Expression") or "",
                said.get("License") or "",
                *(said.get_all("Classifier") or []),
            ]
        )
        family = next(one for one in families if one in licence)
        assert re.search(family, stated, re.IGNORECASE), name


def test_versions_that_the_checks_run_with_are_written_down_for_each_dependency() -> None:
    text = (ROOT / ".ci" / "constraints.txt").read_text(encoding="utf-8")
    pinned = _names(re.findall(r"^([^#\s].*)$", text, re.MULTILINE))
    wanted = _names([*PROJECT["dependencies"], *PROJECT["optional-dependencies"]["test"]])
    assert wanted <= pinned, sorted(wanted - pinned)
