"""What to do: the findings of a day by kind, the most severe first, each with its advice."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

from coulombook.findings import KINDS, Finding, Severity
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.words import counted

FOLDED_BEYOND = 4  # places of one kind that stand open
MOST = 200  # of one kind on the page at all
_WORD = {Severity.STOP: "fault", Severity.WARN: "warning", Severity.NOTE: "note"}
_RANK = {severity: place for place, severity in enumerate(_WORD)}
_KIND_RANK = {kind: place for place, kind in enumerate(KINDS)}


def show_findings(findings: Iterable[Finding]) -> Html:
    """One entry per kind, causes before consequences."""
    kinds: dict[tuple[int, int, str], list[Finding]] = {}
    for one in findings:
        key = (_RANK[one.severity], _KIND_RANK.get(one.kind, len(_KIND_RANK)), one.kind)
        kinds.setdefault(key, []).append(one)
    if not kinds:
        return element("p", "Nothing was assumed, left aside or out of place.")
    return join(_show_kind(same) for _, same in sorted(kinds.items(), key=lambda item: item[0]))


def _show_kind(same: Sequence[Finding]) -> Html:
    """Findings of one kind: equal texts at several places stand together, and below them the advice they share."""
    first = same[0]
    groups: dict[str, dict[str, list[Finding]]] = {}
    for one in same:
        groups.setdefault(one.mend, {}).setdefault(one.text, []).append(one)
    return element(
        "section",
        element(
            "h3",
            element("span", _WORD[first.severity], class_=f"badge {first.severity}"),
            " ",
            _sentence(KINDS[first.kind][1] if first.kind in KINDS else first.kind),
            element("span", counted(len(same), "place"), class_="count") if len(same) > 1 else None,
        ),
        (join(_entries(texts), _advice(mend)) for mend, texts in groups.items()),
        class_=f"finding {first.severity}",
    )


def _entries(texts: Mapping[str, Sequence[Finding]]) -> Html:
    """One entry per text; a long list is folded behind its first ones."""
    entries = [
        element(
            "li",
            element("span", _places(alike), class_="where"),
            f" {text}" if text else None,
            _other_places(alike),
        )
        for text, alike in texts.items()
    ]
    more = len(entries) - FOLDED_BEYOND
    return join(
        element("ul", entries[:FOLDED_BEYOND]),
        element(
            "details",
            element("summary", f"and {more} more"),
            element("ul", entries[FOLDED_BEYOND:MOST]),
            element("p", f"The other {len(entries) - MOST} stand in findings.csv.")
            if len(entries) > MOST
            else None,
        )
        if more > 0
        else None,
    )


def _places(alike: Sequence[Finding]) -> Html:
    shown = [one.where for one in alike]
    more = len(shown) - FOLDED_BEYOND
    return join("; ".join(shown[:FOLDED_BEYOND]), f"; and {more} more:" if more > 0 else ":")


def _other_places(alike: Sequence[Finding]) -> Html | None:
    rest = [one.where for one in alike[FOLDED_BEYOND:]]
    if not rest:
        return None
    more = "; ..." if len(rest) > MOST else ""
    return element(
        "details",
        element("summary", f"the other {counted(len(rest), 'place')}"),
        "; ".join(rest[:MOST]),
        more,
    )


def _advice(mend: str) -> Html | None:
    return (
        element("p", element("span", "What to do: ", class_="lead"), _sentence(mend), class_="mend")
        if mend
        else None
    )


def _sentence(text: str) -> str:
    text = text[:1].upper() + text[1:]
    return text if text.endswith((".", "?")) else f"{text}."
