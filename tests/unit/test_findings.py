"""Gathering findings: each once, and no more of a kind than anybody reads."""

from __future__ import annotations

from coulombook.findings import MOST_OF_A_KIND, Findings, finding


def test_equal_findings_are_kept_once_in_the_order_they_were_seen() -> None:
    findings = Findings()
    for where in ("b", "a", "b"):
        findings.add("duplicate", where, "entered twice")
    assert [one.where for one in findings] == ["b", "a"]
    assert len(findings) == 2


def test_a_million_findings_are_counted_and_the_first_of_each_kind_kept() -> None:
    findings = Findings()
    for row in range(1_000_000):
        findings.add("not-a-number", f"gas.csv, row {row}", "the cell must hold a number", found="'x'")
    findings.add("duplicate", "row 2", "entered twice")
    *kept, duplicate, counted = findings
    assert len(kept) == MOST_OF_A_KIND
    assert len(findings) == MOST_OF_A_KIND + 2
    assert duplicate.kind == "duplicate"
    assert (counted.kind, counted.found) == ("not-a-number", f"{1_000_000 - MOST_OF_A_KIND} more")
    assert counted in findings.stops


def test_what_is_full_says_so() -> None:
    findings = Findings(finding("duplicate", f"row {row}", "twice") for row in range(MOST_OF_A_KIND - 1))
    assert not findings.is_full("duplicate")
    findings.add("duplicate", "one more", "twice")
    assert findings.is_full("duplicate")
    assert not findings.is_full("not-a-number")
