"""What to do: the findings of a day by kind, the most severe first, each with its advice."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from coulombook.findings import KINDS, Finding, Severity
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.words import counted

FOLDED_BEYOND = 4  # places of one kind that stand open
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
    """Findings of one kind; equal texts at several places stand together, a common advice once."""
    first = same[0]
    texts: dict[tuple[str, str], list[Finding]] = {}
    for one in same:
        texts.setdefault((one.text, one.mend), []).append(one)
    advice = {one.mend for one in same}
    entries = [
        element(
            "li",
            element("span", _places(alike), class_="where"),
            join(" ", text) if text else None,
            _other_places(alike),
            _advice(mend) if len(advice) > 1 else None,
        )
        for (text, mend), alike in texts.items()
    ]
    return element(
        "section",
        element(
            "h3",
            element("span", _WORD[first.severity], class_=f"badge {first.severity}"),
            " ",
            _sentence(KINDS[first.kind][1] if first.kind in KINDS else first.kind),
            element("span", counted(len(same), "place"), class_="count") if len(same) > 1 else None,
        ),
        element("ul", entries[:FOLDED_BEYOND]),
        element(
            "details",
            element("summary", f"and {len(entries) - FOLDED_BEYOND} more"),
            element("ul", entries[FOLDED_BEYOND:]),
        )
        if len(entries) > FOLDED_BEYOND
        else None,
        _advice(first.mend) if len(advice) == 1 else None,
        class_=f"finding {first.severity}",
    )


def _places(alike: Sequence[Finding]) -> Html:
    shown = [one.where for one in alike]
    more = len(shown) - FOLDED_BEYOND
    return join("; ".join(shown[:FOLDED_BEYOND]), f"; and {more} more:" if more > 0 else ":")


def _other_places(alike: Sequence[Finding]) -> Html | None:
    rest = [one.where for one in alike[FOLDED_BEYOND:]]
    if not rest:
        return None
    return element("details", element("summary", f"the other {counted(len(rest), 'place')}"), "; ".join(rest))


def _advice(mend: str) -> Html | None:
    return (
        element("p", element("span", "What to do: ", class_="lead"), _sentence(mend), class_="mend")
        if mend
        else None
    )


def _sentence(text: str) -> str:
    text = text[:1].upper() + text[1:]
    return text if text.endswith((".", "?")) else f"{text}."
