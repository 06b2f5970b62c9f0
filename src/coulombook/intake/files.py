"""Where files may lie and how they are opened: nothing outside the day folder, nothing that could fill the memory."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from coulombook.findings import Findings
from coulombook.intake.limits import MOST_ADVICE
from coulombook.intake.lookalikes import lookalike, plain
from coulombook.units import nearest


@dataclass(slots=True)
class Folder:
    """A folder whose files may be read, the name it goes by in messages, and every file read so far."""

    root: Path
    label: str = ""  # "" for the day folder: its files are named relative to it
    read: list[Path] = field(default_factory=list)
    _true_root: Path | None = None  # the root with its links followed, once it is asked for

    def name_of(self, path: Path) -> str:
        """The name of a file in messages and origins, with forward slashes."""
        relative = path.relative_to(self.root).as_posix() if path.is_relative_to(self.root) else path.name
        return f"{self.label}/{relative}" if self.label else relative

    def inside(self, text: str) -> Path | None:
        """The path that ``text`` names, or None when it leads out of the folder, through a link or otherwise."""
        # tables are often written under Windows
        parts = text.strip().replace("\\", "/")
        if "\0" in parts or parts.startswith("/") or (len(parts) > 1 and parts[1] == ":"):
            return None
        path = self.root / parts
        return path if self.holds(path) else None

    def holds(self, path: Path) -> bool:
        """Whether a path, its links followed, still lies under the folder."""
        try:
            if self._true_root is None:
                self._true_root = self.root.resolve()
            return path.resolve().is_relative_to(self._true_root)
        except (OSError, RuntimeError):  # a loop of links
            return False


def is_file(path: Path) -> bool:
    """Whether a path is that of a file; a name that the file system refuses, as one too long, is none."""
    try:
        return path.is_file()
    except OSError:
        return False


def is_folder(path: Path) -> bool:
    """Whether a path is that of a folder; see `is_file`."""
    try:
        return path.is_dir()
    except OSError:
        return False


def report_outside(findings: Findings, where: object, found: str) -> None:
    """Fault: a path leads out of the folder."""
    findings.add(
        "outside-folder",
        where,
        "the path leads out of the folder",
        "copy the file into the folder and give its path relative to it",
        found=f"'{found}'",
        expected="a file inside the folder, reached without '..' or a link to the outside",
    )


def read_bytes(
    folder: Folder, path: Path, limit_byte: int, findings: Findings, mend: str = "add the file"
) -> bytes | None:
    """The content of a small file, or None after a fault; ``mend`` says what would do where it is not there."""
    name = folder.name_of(path)
    if not folder.holds(path):
        report_outside(findings, name, name)
        return None
    try:
        if not path.is_file():
            findings.add(
                "missing-file",
                name,
                "there is no such file",
                mend,
                found="nothing there" if not path.exists() else "something that is no file",
                expected=f"the file '{name}'",
            )
            return None
        size = path.stat().st_size
        if size > limit_byte:
            unreadable(findings, name, f"{size / 1e6:.0f} MB", f"a file of at most {limit_byte / 1e6:.0f} MB")
            return None
        data = path.read_bytes()
    except OSError as error:
        unreadable(findings, name, error.strerror or "an error of the file system", "a file that can be read")
        return None
    folder.read.append(path)
    return data


def unreadable(findings: Findings, where: object, found: str, expected: str, mend: str = "") -> None:
    """Fault: a file is not what it should be."""
    findings.add(
        "unreadable-file",
        where,
        "the file cannot be read",
        mend or "save the file again as a table of text (CSV) or as a workbook",
        found=found,
        expected=expected,
    )


def advice(findings: Findings, kind: str, text: str, known: Sequence[str]) -> str:
    """The last words of a mend line: what deceives in a name, or the nearest known one; for the first of a kind."""
    if findings.kept(kind) >= MOST_ADVICE:
        return ""
    deceit = lookalike(text) if plain(text) in known else None
    return f"; {deceit}" if deceit else did_you_mean(text, known)


def did_you_mean(text: str, known: Sequence[str]) -> str:
    """The last words of a mend line: the nearest known name, or nothing."""
    # half of a short name is a single letter
    near = nearest(text, known, cutoff=0.5 if len(text) < 4 else 0.6)
    return f"; did you mean '{near}'?" if near else ""
