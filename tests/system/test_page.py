"""The page in a real browser, opened from a folder as a reader opens it."""

from __future__ import annotations

import io
import json
import re
import shutil
from collections.abc import Iterator
from dataclasses import dataclass
from html.parser import HTMLParser
from itertools import pairwise
from pathlib import Path

import pytest
from tests.system.browser.chromium import Browser, chromium

from coulombook import Book, tally
from coulombook.prose.numbers import with_uncertainty
from coulombook.report.page import page_html

ROOT = Path(__file__).parents[2]
CALIBRATIONS = ROOT / "calibrations"
FLASK, CELL = "2043-05-18-mesh-foil-foam", "2043-06-02-gas-diffusion"
WIDTHS = (360, 390, 480, 600, 768, 1024, 1280, 1440, 1920)
MOST_BYTES = 1_500_000  # of the page of an example day
AXE = Path(__file__).parent / "browser" / "axe-core-4.14.1.min.js"
UNFOLD = "for (const one of document.querySelectorAll('details')) one.open = true"


def typeset(number: str) -> str:
    """A number as the page sets it, written again from the rule: a real minus, a raised power of ten."""
    mantissa, _, power = number.partition("e")
    raised = power.translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
    return mantissa.replace("-", "−") + (f"×10{raised}" if power else "")


@dataclass(frozen=True)
class Written:
    """A book and its page on the disk."""

    book: Book
    path: Path

    @property
    def text(self) -> str:
        return self.path.read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def pages(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Written]:
    folder = tmp_path_factory.mktemp("pages")
    found = {}
    for day in (FLASK, CELL):
        book = tally(ROOT / "example_experiments" / day, calibrations=[CALIBRATIONS])
        path = folder / f"{day}.html"
        path.write_text(page_html(book), encoding="utf-8")
        found[day] = Written(book, path)
    return found


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as one:
        yield one


@pytest.fixture
def opened(browser: Browser, pages: dict[str, Written]) -> Browser:
    """The page of the first example day in a window of usual size."""
    browser.scheme("light")
    browser.size(1400, 1000)
    browser.open(pages[FLASK].path)
    return browser


# --- whole in itself ---


@pytest.mark.parametrize("day", [FLASK, CELL])
def test_a_page_is_small_and_names_no_address(pages: dict[str, Written], day: str) -> None:
    text = pages[day].text
    assert len(text.encode("utf-8")) <= MOST_BYTES
    markup = text.partition("<script>")[0]
    assert re.findall(r"\s(?:src|href|action|srcset|poster)\s*=\s*[\"']?(?!#)[\w./:]+", markup) == []
    assert not re.search(r"https?://|//[a-z]+\.|@import|url\((?!#)", text)


def test_the_same_day_gives_the_same_page(pages: dict[str, Written]) -> None:
    again = tally(ROOT / "example_experiments" / CELL, calibrations=[CALIBRATIONS])
    assert page_html(again) == pages[CELL].text


@pytest.mark.parametrize("day", [FLASK, CELL])
def test_everything_unfolds_without_a_complaint_or_a_request(
    browser: Browser, pages: dict[str, Written], day: str
) -> None:
    browser.size(1400, 1000)
    browser.open(pages[day].path)
    browser.run(UNFOLD)
    runs = len(pages[day].book.tables["summary"])
    browser.wait_for(f"document.querySelectorAll('.trace canvas').length === {runs}")
    assert browser.complaints() == []
    assert browser.requests() == [pages[day].path.as_uri()]


def test_the_policy_lets_no_other_script_run(opened: Browser) -> None:
    opened.run(
        "(() => { const one = document.createElement('script'); one.textContent = 'window.ran = true';"
        "document.body.append(one); const bait = '<p onclick=\"window.ran = true\"></p>';"
        "document.body.insertAdjacentHTML('beforeend', bait);"
        "document.body.lastElementChild.click(); })()"
    )
    assert opened.run("window.ran") is None
    assert any("Content Security Policy" in one for one in opened.complaints())


# --- what it says ---


class _Tables(HTMLParser):
    """Tables of a page: heads as in the files, and cells as (shown, figure, uncertainty)."""

    def __init__(self) -> None:
        super().__init__()
        self.tables: dict[str, tuple[list[str], list[list[tuple[str, str | None, str | None]]]]] = {}
        self._name, self._heads, self._rows = "", [], []
        self._figures: tuple[str | None, str | None] | None = None
        self._shown = ""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        about = dict(attrs)
        if (about.get("aria-label") or "").startswith("table: "):
            self._name = (about["aria-label"] or "").removeprefix("table: ")
            self._heads, self._rows = [], []
            self.tables[self._name] = (self._heads, self._rows)
        elif "data-h" in about:
            self._heads.append(about["data-h"] or "")
        elif tag in ("td", "tr", "th"):
            self._end()
            if tag == "tr":
                self._rows.append([])
            else:
                self._figures, self._shown = (about.get("data-v"), about.get("data-u")), ""

    def handle_endtag(self, tag: str) -> None:
        if tag in ("tbody", "thead", "table"):
            self._end()

    def handle_data(self, data: str) -> None:
        self._shown += data

    def _end(self) -> None:
        if self._figures is not None and self._rows:
            self._rows[-1].append((self._shown, *self._figures))
        self._figures = None


@pytest.mark.parametrize("day", [FLASK, CELL])
@pytest.mark.parametrize(
    ("name", "table"),
    [
        ("One line per run", "summary"),
        ("Replicates pooled: one line per catalyst, level and product", "series"),
        ("Capacitance of each electrode", "surface"),
        ("Curves that were used", "calibrations"),
        ("Carbon: where the CO2 went", "carbon"),
        ("Carbon and energy efficiency of each product", "efficiencies"),
        ("Kinetics: Tafel slopes and onsets", "kinetics"),
        ("Change in the course of each run", "stability"),
    ],
)
def test_a_table_of_the_page_agrees_with_that_of_the_files(
    pages: dict[str, Written], day: str, name: str, table: str
) -> None:
    reader = _Tables()
    reader.feed(pages[day].text)
    heads, (_, *rows) = reader.tables[name]
    records = list(pages[day].book.tables[table].records())
    assert len(rows) == len(records) > 0
    compared = 0
    for record, row in zip(records, rows, strict=True):
        for head, (shown, figure, u) in zip(heads, row, strict=True):
            value = record[head]
            if isinstance(value, str) or value is None:
                assert shown == ("–" if value is None else value)
                continue
            # twelve digits are written
            assert float(figure or "nan") == pytest.approx(value, rel=1e-11)
            quantity, _, unit = head.partition(" / ")
            spread = record.get(f"u({quantity}){' / ' if unit else ''}{unit}")
            if isinstance(spread, float):
                assert float(u or "nan") == pytest.approx(spread, rel=1e-11)
                assert shown == typeset(with_uncertainty(value, spread))
                compared += 1
    assert compared > 0


@pytest.mark.parametrize("day", [FLASK, CELL])
def test_the_verdict_names_every_catalyst_and_the_best_run_that_closes(
    pages: dict[str, Written], day: str
) -> None:
    verdict = re.search(r"<ul class=verdicts>(.*?)</ul>", pages[day].text, re.DOTALL)
    assert verdict
    sentences = re.sub(r"<[^>]+>", "", verdict[1])
    rows = list(pages[day].book.tables["summary"].records())
    for catalyst in dict.fromkeys(row["catalyst"] for row in rows):
        assert str(catalyst) in sentences
        closed = [row for row in rows if row["catalyst"] == catalyst and row["closure"] == "closed"]
        best = max(closed, key=lambda row: row["C2+ FE / %"] or 0.0)  # type: ignore[return-value, operator] # numbers
        if best["C2+ FE / %"]:
            assert typeset(with_uncertainty(best["C2+ FE / %"], best["u(C2+ FE) / %"])) in sentences  # type: ignore[arg-type] # numbers
            assert f"run {best['run']}" in sentences
    for row in rows:
        if row["closure"] != "closed":
            assert f"{row['run']} is {row['closure']}" in sentences


def test_every_finding_and_every_run_is_on_the_page(pages: dict[str, Written]) -> None:
    text = pages[FLASK].text
    for one in pages[FLASK].book.findings:
        assert one.where.replace("'", "'") in text
    assert text.count("<details class=run>") == len(pages[FLASK].book.tables["summary"])


def test_cautions_defer_and_give_the_figures_of_the_day(pages: dict[str, Written]) -> None:
    text = pages[FLASK].text
    part = text[text.index("<section id=cautions") : text.index("<section id=provenance")]
    assert "local codes" in part
    assert "licensed professionals" in part
    row = next(
        one for one in pages[FLASK].book.tables["cautions"].records() if one["substance"] == "carbon monoxide"
    )
    assert f"run {row['run']}, injection {row['injection']}" in part
    assert "NIOSH" in part
    assert "NFPA" in part


def test_every_input_stands_there_with_its_fingerprint(pages: dict[str, Written]) -> None:
    text = pages[CELL].text
    assert all(one.sha256 in text for one in pages[CELL].book.inputs)


# --- figures ---


def test_a_mark_says_its_value_with_uncertainty_when_pointed_at(
    opened: Browser, pages: dict[str, Written]
) -> None:
    row = next(
        row
        for row in pages[FLASK].book.tables["series"].records()
        if row["catalyst"] == "annealed copper mesh"
        and row["level"] == "-1.84"
        and row["product"] == "ethylene"
    )
    expected = f"FE {typeset(with_uncertainty(row['FE / %'], row['u(FE) / %']))} %"  # type: ignore[arg-type] # numbers
    opened.run(
        "[...document.querySelectorAll('.figure.fe .mark')].find((one) => one.dataset.m.includes('ethylene')"
        f" && one.dataset.m.includes({json.dumps(expected)})).id = 'wanted'"
    )
    assert opened.run("document.querySelector('.tip').hidden")
    opened.mouse("Moved", *opened.middle_of("#wanted"))
    opened.wait_for("!document.querySelector('.tip').hidden")
    said = opened.run("document.querySelector('.tip').textContent")
    assert "ethylene" in said
    assert expected in said
    opened.mouse("Moved", 2, 2)
    opened.wait_for("document.querySelector('.tip').hidden")


def test_marks_are_reached_by_keys_and_say_the_same_to_a_screen_reader(opened: Browser) -> None:
    assert (
        opened.run(
            "document.querySelectorAll('.figure.fe .drawing')[0].querySelectorAll('[tabindex=\"0\"]').length"
        )
        == 1
    )
    opened.run("document.querySelector('.figure.fe .mark').focus()")
    first = opened.run("document.querySelector('.tip').textContent")
    opened.key("ArrowRight")
    second = opened.run("document.querySelector('.tip').textContent")
    assert first != second
    assert second == opened.run("document.activeElement.getAttribute('aria-label')")
    opened.key("Escape")
    assert opened.run("document.querySelector('.tip').hidden")


@pytest.mark.parametrize("day", [FLASK, CELL])
def test_without_a_script_every_bar_has_a_title_and_every_log_a_drawing(
    pages: dict[str, Written], day: str
) -> None:
    text = pages[day].text.partition("<script>")[0]
    products = len(pages[day].book.tables["series"])
    efficiencies = text[text.index("<section id=efficiencies") : text.index("<section id=currents")]
    assert len(re.findall(r'class="mark"><title>[^<]+FE [^<]+</title>', efficiencies)) >= products
    assert len(re.findall(r"<svg [^>]*class=still", text)) == len(pages[day].book.tables["summary"])
    assert "<button" not in text


def test_no_two_elements_share_an_id(opened: Browser) -> None:
    assert opened.run("(() => { const ids = [...document.querySelectorAll('[id]')].map((one) => one.id);"
                      "return ids.length - new Set(ids).size; })()") == 0  # fmt: skip
    assert opened.run(
        "[...document.querySelectorAll('[href^=\"#\"]')].filter((one) => !document.getElementById("
        "one.getAttribute('href').slice(1))).length"
    ) == 0  # fmt: skip


# --- logs ---


@pytest.fixture
def log(opened: Browser) -> Browser:
    opened.run("document.querySelector('details.run').open = true")
    opened.wait_for("document.querySelector('.trace canvas') !== null")
    return opened


def _reading(browser: Browser) -> str:
    return str(browser.run("document.querySelector('.reading').textContent"))


def _zoomed(browser: Browser) -> bool:
    return not browser.run("document.querySelector('.trace .tools button').disabled")


def _drag_over_the_middle(browser: Browser) -> None:
    x, y = browser.middle_of(".trace .u-over")
    browser.drag((x - 60, y), (x + 60, y))


def test_a_log_says_what_was_logged_where_it_is_pointed_at(log: Browser, pages: dict[str, Written]) -> None:
    x, y = log.middle_of(".trace .u-over")
    log.mouse("Moved", x, y)
    log.wait_for("document.querySelector('.reading').textContent !== ''")
    found = re.fullmatch(
        r"t ([\d.]+) s, I ([−\d.]+)(?: to ([−\d.]+))? mA, E ([−\d.]+)(?: to ([−\d.]+))? V", _reading(log)
    )
    assert found
    second, low, high, *_ = (None if one is None else float(one.replace("−", "-")) for one in found.groups())
    picture = pages[FLASK].book.pictures[0]
    at = abs(picture.time_second - second).argmin()
    # five digits are shown, of figures laid over 16 bits of their range
    tolerance = 1e-4 * abs(low or 0.0)
    assert low == pytest.approx(1e3 * picture.lowest_current_ampere[at], abs=tolerance)
    assert (low if high is None else high) == pytest.approx(
        1e3 * picture.highest_current_ampere[at], abs=tolerance
    )


def test_a_log_is_looked_into_by_dragging_and_seen_whole_again(log: Browser) -> None:
    assert not _zoomed(log)
    _drag_over_the_middle(log)
    assert _zoomed(log)
    log.click(*log.middle_of(".trace .u-over"), times=2)
    log.wait_for("document.querySelector('.trace .tools button').disabled")
    _drag_over_the_middle(log)
    assert _zoomed(log)
    log.click(*log.middle_of(".trace .tools button"))
    assert not _zoomed(log)


def test_a_log_is_looked_into_by_keys(log: Browser) -> None:
    log.run("document.querySelector('.trace .live').focus()")
    log.key("ArrowRight")
    log.wait_for("document.querySelector('.reading').textContent !== ''")
    first = _reading(log)
    log.key("ArrowRight")
    assert _reading(log) != first
    log.key("+", "+")
    assert _zoomed(log)
    log.key("0", "0")
    assert not _zoomed(log)


# --- tables ---

REGION = '[aria-label="table: One line per run"]'
SUMMARY = f"{REGION} table"


def _column(browser: Browser, head: str) -> list[float]:
    place = browser.run(
        f"[...document.querySelectorAll({json.dumps(SUMMARY + ' th[data-h]')})].findIndex("
        f"(one) => one.dataset.h === {json.dumps(head)})"
    )
    values = browser.run(
        f"[...document.querySelector({json.dumps(SUMMARY)}).tBodies[0].rows].map((row) => row.cells[{place}].dataset.v)"
    )
    return [float(one) for one in values]


def test_a_table_sorts_by_click_and_by_key_and_says_so(opened: Browser) -> None:
    head = f'{SUMMARY} th[data-h="total FE / %"]'
    as_written = _column(opened, "total FE / %")
    assert as_written != sorted(as_written)
    opened.click(*opened.middle_of(f"{head} button"))
    assert _column(opened, "total FE / %") == sorted(as_written)
    assert opened.run(f"document.querySelector({json.dumps(head)}).getAttribute('aria-sort')") == "ascending"
    opened.run(f"document.querySelector({json.dumps(head)} + ' button').focus()")
    opened.key("Enter", "\r")
    assert _column(opened, "total FE / %") == sorted(as_written, reverse=True)
    assert opened.run(f"document.querySelector({json.dumps(head)}).getAttribute('aria-sort')") == "descending"
    opened.key("Enter", "\r")
    assert _column(opened, "total FE / %") == as_written
    assert opened.run(f"document.querySelectorAll({json.dumps(SUMMARY + ' [aria-sort]')}).length") == 0


def test_a_table_is_copied_in_full_with_the_heads_of_the_files(
    opened: Browser, pages: dict[str, Written]
) -> None:
    opened.ask("Browser.grantPermissions", permissions=["clipboardReadWrite", "clipboardSanitizedWrite"])
    opened.click(*opened.middle_of(f"{REGION} + .tools button"))
    opened.wait_for(
        "[...document.querySelectorAll('[role=status]')].some((one) => one.textContent.startsWith('Copied'))"
    )
    lines = str(opened.run("navigator.clipboard.readText()")).rstrip("\n").split("\n")
    heads, *rows = (line.split("\t") for line in lines)
    records = list(pages[FLASK].book.tables["summary"].records())
    assert len(rows) == len(records)
    assert "u(total FE) / %" in heads
    for record, row in zip(records, rows, strict=True):
        copied = dict(zip(heads, row, strict=True))
        assert copied["run"] == record["run"]
        for head in ("total FE / %", "u(total FE) / %", "C2+/C1", "u(C2+/C1)", "charge / C"):
            if record[head] is None:
                assert copied[head] == ""
            else:
                assert float(copied[head]) == pytest.approx(record[head], rel=1e-11)


# --- every screen, every reader, paper ---


@pytest.mark.parametrize("day", [FLASK, CELL])
def test_a_page_fits_every_width(browser: Browser, pages: dict[str, Written], day: str) -> None:
    browser.size(1280)
    browser.open(pages[day].path)
    browser.run(UNFOLD)
    browser.wait_for(
        f"document.querySelectorAll('.trace canvas').length === {len(pages[day].book.tables['summary'])}"
    )
    for width in WIDTHS:
        browser.size(width)
        browser.run("new Promise((done) => setTimeout(done, 150))")
        beyond = browser.run(
            "[document.documentElement.scrollWidth - document.documentElement.clientWidth,"
            " document.body.scrollWidth - innerWidth]"
        )
        assert max(beyond) <= 0, f"at {width} px the page is {max(beyond)} px too wide"


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("day", [FLASK, CELL])
def test_nothing_keeps_a_reader_out(
    browser: Browser, pages: dict[str, Written], day: str, scheme: str
) -> None:
    browser.size(1280)
    browser.scheme(scheme)
    browser.open(pages[day].path)
    browser.run(UNFOLD)
    ground = browser.run("getComputedStyle(document.body).backgroundColor")
    assert (min(map(int, re.findall(r"\d+", ground))) > 128) is (scheme == "light")
    # contrast of everything on the page but canvases, which hold no text that is not beside them as well
    browser.run(f"{AXE.read_text(encoding='utf-8')};0")
    found = browser.run(
        "axe.run(document).then((all) => all.violations.filter((one) => ['serious', 'critical'].includes(one.impact))"
        ".map((one) => [one.id, one.nodes.slice(0, 3).map((node) => node.html)]))"
    )
    assert found == []
    browser.scheme("light")


def test_the_checker_of_contrast_sees_a_fault_when_there_is_one(opened: Browser) -> None:
    opened.run("document.querySelector('.verdict').style.color = '#ddd'")
    opened.run(f"{AXE.read_text(encoding='utf-8')};0")
    found = opened.run("axe.run('.verdicts').then((all) => all.violations.map((one) => one.id))")
    assert "color-contrast" in found


def test_headings_go_down_step_by_step_and_every_table_has_its_caption(opened: Browser) -> None:
    levels = opened.run(
        "[...document.querySelectorAll('h1,h2,h3,h4,h5,h6')].map((one) => Number(one.tagName[1]))"
    )
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(after - before <= 1 for before, after in pairwise(levels))
    assert opened.run("[...document.querySelectorAll('table')].every((one) => one.caption !== null)")
    assert opened.run("[...document.querySelectorAll('th')].every((one) => one.scope)")
    assert opened.run("document.querySelectorAll('main').length") == 1


def test_on_paper_no_figure_is_cut_and_everything_is_unfolded(
    browser: Browser, pages: dict[str, Written]
) -> None:
    import pypdf

    browser.size(1280)
    browser.scheme("dark")  # paper is white whatever the screen is
    browser.open(pages[CELL].path)
    # a word at the head and at the foot of every figure tells on which sheet each lies
    browser.run(
        "document.querySelectorAll('main figure').forEach((one, place) => { for (const end of ['head', 'foot']) {"
        "const word = document.createElement('span'); word.textContent = `Q${end}${place}Q`;"
        "word.style.fontSize = '6px'; if (end === 'head') one.prepend(word); else one.append(word); } })"
    )
    figures = browser.run("document.querySelectorAll('main figure').length")
    reader = pypdf.PdfReader(io.BytesIO(browser.pdf()))
    sheets = [sheet.extract_text() for sheet in reader.pages]
    place = {
        word: number for number, text in enumerate(sheets) for word in re.findall(r"Q(?:head|foot)\d+Q", text)
    }
    assert len(place) == 2 * figures
    cut = [number for number in range(figures) if place[f"Qhead{number}Q"] != place[f"Qfoot{number}Q"]]
    assert cut == []
    whole = "\n".join(sheets)
    assert all(one.sha256[:20] in whole.replace("\n", "") for one in pages[CELL].book.inputs)
    assert browser.run("document.querySelectorAll('details[open]').length") == 0  # folded again
    browser.scheme("light")


# --- hostile names ---

HOSTILE = (
    "<script>window.ran = 1</script>",
    "</title></style></script><img src=x onerror='window.ran = 2'>",
    "=cmd|' /C calc'!A0",
    "\N{RIGHT-TO-LEFT OVERRIDE}evil\N{RIGHT-TO-LEFT ISOLATE}",
    "{{7*7}}${7*7}`${window.ran = 3}`",
)


def _names_of_traces() -> list[str]:
    text = (ROOT / "example_experiments" / FLASK / "runs.csv").read_text(encoding="utf-8")
    return [line.partition(";")[0] for line in text.splitlines()[1:]]


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> Written:
    """An example day whose catalysts, title, notes and runs were named by somebody who means harm."""
    folder = tmp_path_factory.mktemp("hostile")
    day = folder / "day"
    shutil.copytree(ROOT / "example_experiments" / FLASK, day, ignore=shutil.ignore_patterns("results"))
    names = dict(
        zip(
            ("annealed copper mesh", "polished copper foil", "silver foam", "m1-1", "m1"),
            HOSTILE,
            strict=True,
        )
    )
    for table in day.glob("*.csv"):
        lines = table.read_text(encoding="utf-8").splitlines()
        cells = [line.split(";") for line in lines]
        text = "\n".join(
            ";".join('"' + names[one].replace('"', '""') + '"' if one in names else one for one in row)
            for row in cells
        )
        table.write_text(text + "\n", encoding="utf-8")
    runs = (day / "runs.csv").read_text(encoding="utf-8").splitlines()
    traces = ["trace", *(f"traces/{run}.csv" for run in _names_of_traces())]
    (day / "runs.csv").write_text(
        "\n".join(f"{line};{trace}" for line, trace in zip(runs, traces, strict=True)) + "\n",
        encoding="utf-8",
    )
    settings = day / "day.toml"
    title = re.sub(
        r'^title = ".*"$', f"title = '''{HOSTILE[1]}'''", settings.read_text(encoding="utf-8"), flags=re.M
    )
    settings.write_text(title, encoding="utf-8")
    book = tally(day, calibrations=[CALIBRATIONS])
    path = folder / "page.html"
    path.write_text(page_html(book), encoding="utf-8")
    return Written(book, path)


def test_hostile_names_are_words_and_nothing_else(browser: Browser, hostile: Written) -> None:
    assert {row["catalyst"] for row in hostile.book.tables["summary"].records()} == set(HOSTILE[:3])
    browser.size(1400, 1000)
    browser.open(hostile.path)
    browser.run(UNFOLD)
    browser.wait_for(
        f"document.querySelectorAll('.trace canvas').length === {len(hostile.book.tables['summary'])}"
    )
    assert browser.complaints() == []
    assert browser.requests() == [hostile.path.as_uri()]
    assert browser.run("window.ran") is None
    assert browser.run("document.querySelectorAll('script').length") == 1
    assert browser.run("document.querySelectorAll('img, iframe, object, embed, link, base').length") == 0
    assert HOSTILE[0] in browser.run("document.querySelector('main').textContent")
    assert "\N{RIGHT-TO-LEFT OVERRIDE}" not in browser.run("document.documentElement.outerHTML")


def test_a_copied_cell_becomes_no_formula(browser: Browser, hostile: Written) -> None:
    browser.open(hostile.path)
    cells = browser.run(
        "[...document.querySelectorAll('td, th')].filter((one) => one.textContent.startsWith('='))"
        ".map((one) => one.dataset.c)"
    )
    assert cells
    assert all(one.startswith("'=") for one in cells)
