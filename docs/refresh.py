"""Run what the documents show, and write what it printed back into them, with the picture of the README.

    python -m docs.refresh

The test of the documents uses the same functions and compares instead of writing. What runs, in the order
of a document, in a folder of its own that holds the example days and their calibrations:

- a block ``console``: each line that starts with ``$`` is a command of bash, what stands below is its output;
- a block ``python``: run in one namespace for the whole document; a block ``text`` that follows it
  directly is what it prints;
- a block with ``file=PATH`` behind its language: written to that file.

Every other block is left alone. The columns of the tables are described from the program's own words, and the
kinds of finding from their pages.
"""

from __future__ import annotations

import contextlib
import difflib
import html
import io
import os
import re
import shlex
import shutil
import subprocess
import sys
import tempfile
import textwrap
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from coulombook.book.columns import about_tables
from coulombook.findings import KINDS, Severity
from coulombook.why import Page, page_of

ROOT = Path(__file__).resolve().parents[1]
RESULTS = ROOT / "docs" / "results.md"
FINDINGS = ROOT / "docs" / "findings.md"
PICTURE = ROOT / "docs" / "images" / "tally.svg"
PICTURED = "coulombook tally example_experiments/2043-05-18-mesh-foil-foam"
WIDTH = 100

_BLOCK = re.compile(r"^```(?P<info>[^\n`]*)\n(?P<body>.*?)^```$", re.DOTALL | re.MULTILINE)
_DRAWN_TEXT = re.compile(
    r'<text class="(?P<style>[^"]*)" x="(?P<x>[^"]*)" y="(?P<y>[^"]*)" textLength="(?P<length>[^"]*)"[^>]*>'
    r"(?P<content>[^<]*)</text>"
)

# The picture is drawn without the frame of any system's window, in a font every reader has.
_FRAME = """\
<svg viewBox="0 0 {width} {height}" xmlns="http://www.w3.org/2000/svg" role="img">
<title>Faradaic efficiency against potential of three catalysts, as the command prints it (invented data)</title>
<style>
.{unique_id}-matrix {{ font-family: monospace; font-size: {char_height}px; line-height: {line_height}px; }}
{styles}
</style>
<rect width="{width}" height="{height}" fill="#ffffff" stroke="#c8c8c8" />
<g transform="translate({terminal_x}, 14)">
{backgrounds}
<g class="{unique_id}-matrix">
{matrix}
</g>
</g>
</svg>
"""


@dataclass(frozen=True, slots=True)
class Block:
    """One fenced block: its language, the words behind it, its text, and where the text stands."""

    language: str
    options: str
    body: str
    start: int
    end: int

    @property
    def file(self) -> str | None:
        """The file a block is to be written to."""
        return self.options.partition("file=")[2].strip() or None


@dataclass(frozen=True, slots=True)
class Shown:
    """The output a document shows and the one that came out.

    ``place`` frames it in the document; None where the document has no room for an output.
    """

    what: str
    shown: str
    printed: str
    place: tuple[int, int] | None


def documents() -> list[Path]:
    """Every document people read."""
    return sorted([*ROOT.glob("*.md"), *ROOT.glob("docs/**/*.md"), *ROOT.glob("example_experiments/*.md")])


def blocks(document: str) -> list[Block]:
    """The fenced blocks of a document, in order."""
    found = []
    for one in _BLOCK.finditer(document):
        language, _, options = one["info"].strip().partition(" ")
        found.append(Block(language, options, one["body"], one.start("body"), one.end("body")))
    return found


def runnable(document: str) -> bool:
    """Whether a document shows anything that can be run."""
    return any(one.language in ("console", "python") for one in blocks(document))


def prepare(folder: Path) -> None:
    """Copy what the commands of the documents work on."""
    for name in ("example_experiments", "calibrations"):
        shutil.copytree(ROOT / name, folder / name, ignore=shutil.ignore_patterns("results"))


def run(document: str, folder: Path) -> Iterator[Shown]:
    """Run a document in a prepared folder, and yield each output it shows beside the one that came out."""
    namespace: dict[str, object] = {"__name__": "__document__"}
    found = blocks(document)
    for place, block in enumerate(found):
        if block.file is not None:
            target = folder / block.file
            target.parent.mkdir(parents=True, exist_ok=True)
            target.write_text(block.body, encoding="utf-8")
        elif block.language == "console":
            yield from _run_commands(block, folder)
        elif block.language == "python":
            printed = _run_python(block, folder, namespace)
            after = found[place + 1] if place + 1 < len(found) else None
            gap = document[block.end + len("```") : after.start] if after else ""
            if after is not None and after.language == "text" and gap.strip() == "```text":
                yield Shown(block.body, after.body, printed, (after.start, after.end))
            else:
                yield Shown(block.body, "", printed, None)


def _run_commands(block: Block, folder: Path) -> Iterator[Shown]:
    # a command, then what it printed up to the next one
    for part in re.finditer(
        r"^\$ (?P<command>[^\n]*)\n(?P<output>(?:(?!\$ )[^\n]*\n)*)", block.body, re.MULTILINE
    ):
        printed = run_command(part["command"], folder)
        place = block.start + part.start("output"), block.start + part.end("output")
        yield Shown(part["command"], part["output"], printed, place)


def run_command(command: str, folder: Path, **more: str) -> str:
    """What a command prints on a terminal of `WIDTH` columns; what goes to the error stream comes in order."""
    environment = {
        **{
            name: value for name, value in os.environ.items() if name not in ("FORCE_COLOR", "PYTHONWARNINGS")
        },
        "COLUMNS": str(WIDTH),
        "NO_COLOR": "1",
        "PYTHONIOENCODING": "utf-8",
        # the interpreter in use, whatever else is installed
        "PATH": os.pathsep.join([str(Path(sys.executable).parent), os.environ.get("PATH", "")]),
        **more,
    }
    done = subprocess.run(
        ["bash", "-c", command], cwd=folder, env=environment, stdin=subprocess.DEVNULL, stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT, encoding="utf-8", timeout=300,
    )  # fmt: skip
    return tidy(done.stdout, folder)


def _run_python(block: Block, folder: Path, namespace: dict[str, object]) -> str:
    printed = io.StringIO()
    with contextlib.chdir(folder), contextlib.redirect_stdout(printed):
        exec(compile(block.body, "<document>", "exec"), namespace)
    return tidy(printed.getvalue(), folder)


def tidy(text: str, folder: Path) -> str:
    """Output without the blanks a terminal pads lines with, and without the folder it came from."""
    lines = [line.rstrip() for line in text.replace(str(folder), ".").splitlines()]
    while lines and not lines[-1]:
        lines.pop()
    return "".join(f"{line}\n" for line in lines)


def refreshed(document: str, folder: Path) -> str:
    """The document with what came out in place of what it shows."""
    # from the end, so that the places found before still hold
    for one in reversed(list(run(document, folder))):
        if one.place is not None:
            document = document[: one.place[0]] + one.printed + document[one.place[1] :]
    return document


def with_columns(document: str) -> str:
    """The document of the results with the columns of every table as the program describes them."""
    for name, about in about_tables().items():
        rows = "".join(f"| `{one.head}` | {one.meaning} |\n" for one in about.columns)
        opening = (
            rf"(^## {name}\.csv\n(?:(?!^## ).*\n)*?\| column \| meaning \|\n\| --- \| --- \|\n)(?:\|.*\n)*"
        )
        document, found = re.subn(
            opening, lambda head, rows=rows: head[1] + rows, document, count=1, flags=re.MULTILINE
        )
        if not found:
            raise ValueError(f"the document of the results has no table of columns under '## {name}.csv'")
    return document


def with_kinds(document: str) -> str:
    """The document of the findings with the page of every kind, from its first heading of a severity on."""
    titles = {Severity.STOP: "Faults", Severity.WARN: "Warnings", Severity.NOTE: "Notes"}
    opening, found, _ = document.partition(f"## {titles[Severity.STOP]}\n")
    if not found:
        raise ValueError("the document of the findings has no heading '## Faults'")
    for severity, title in titles.items():
        opening += f"## {title}\n\n"
        opening += "".join(_kind(page_of(kind)) for kind, (rank, _) in KINDS.items() if rank is severity)
    return opening.rstrip("\n") + "\n"


def _kind(page: Page) -> str:
    texts = (page.means, f"**Why it matters.** {page.matters}", f"**What to do.** {page.mend}")
    paragraphs = [textwrap.fill(text, 110, break_on_hyphens=False) for text in texts]
    examples = []
    for name in dict.fromkeys([*page.bad, *page.mended]):
        bad, mended = (
            (side.get(name) or "(not there)").splitlines() if name in side else []
            for side in (page.bad, page.mended)
        )
        lines = [line.rstrip() for line in difflib.ndiff(bad, mended) if not line.startswith("?")]
        examples.append(f"`{name}`\n\n```diff\n" + "\n".join(lines) + "\n```")
    more = [f"Told of by `coulombook {page.command}`."] if page.command != "tally DAY" else []
    if page.beside:
        more.append(
            "The same mistake also brings " + ", ".join(f"[{one}](#{one})" for one in page.beside) + "."
        )
    return "\n\n".join([f"### {page.kind}", *paragraphs, *examples, *more]) + "\n\n"


def picture(folder: Path) -> str:
    """The tables of the example day as an SVG drawing."""
    from rich.console import Console
    from rich.terminal_theme import TerminalTheme
    from rich.text import Text

    # dark colours on white, strong enough to be read in grey
    theme = TerminalTheme(
        (255, 255, 255),
        (32, 32, 32),
        [(32, 32, 32), (160, 30, 30), (20, 100, 40), (140, 90, 0), (30, 70, 150), (110, 50, 120), (0, 100, 110),
         (90, 90, 90)],
    )  # fmt: skip
    coloured = run_command(PICTURED, folder, FORCE_COLOR="1", TERM="xterm-256color", NO_COLOR="")
    tables = Text.from_ansi(coloured)
    plain = tables.plain.splitlines()
    console = Console(
        record=True, width=WIDTH, file=io.StringIO(), color_system="standard", force_terminal=True
    )
    console.print(Text(f"$ {PICTURED}", style="bold"))
    for line in tables.split("\n")[: plain.index("runs") - 1]:
        console.print(line)
    drawn = console.export_svg(title="", theme=theme, code_format=_FRAME, unique_id="tally")
    drawn = _DRAWN_TEXT.sub(_by_words, drawn)
    return "".join(f"{line.strip()}\n" for line in drawn.splitlines() if line.strip())


def _by_words(text: re.Match[str]) -> str:
    """One drawn text as one for each stretch between two blanks or more.

    Columns then stand where they should in every font, and with viewers that drop blanks.
    """
    content = html.unescape(text["content"])
    column = float(text["length"]) / len(content)
    return "".join(
        f'<text class="{text["style"]}" x="{float(text["x"]) + word.start() * column:.1f}" y="{text["y"]}" '
        f'textLength="{len(word[0]) * column:.1f}">{html.escape(word[0])}</text>\n'
        for word in re.finditer(r"[^\s](?:\s?[^\s])*", content)
    )


def main() -> None:
    """Refresh every document and the picture."""
    RESULTS.write_text(with_columns(RESULTS.read_text(encoding="utf-8")), encoding="utf-8")
    FINDINGS.write_text(with_kinds(FINDINGS.read_text(encoding="utf-8")), encoding="utf-8")
    for path in documents():
        document = path.read_text(encoding="utf-8")
        if not runnable(document):
            continue
        with tempfile.TemporaryDirectory() as place:
            prepare(Path(place))
            fresh = refreshed(document, Path(place))
        if fresh != document:
            path.write_text(fresh, encoding="utf-8")
            print(f"refreshed {shlex.quote(str(path.relative_to(ROOT)))}")
    with tempfile.TemporaryDirectory() as place:
        prepare(Path(place))
        PICTURE.parent.mkdir(parents=True, exist_ok=True)
        PICTURE.write_text(picture(Path(place)), encoding="utf-8")


if __name__ == "__main__":
    main()
