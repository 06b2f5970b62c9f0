"""Rankings: who leads, where the data cannot tell, and what turns round on another area."""

from __future__ import annotations

import numpy as np

from coulombook.compare.pairs import Contest, Pair
from coulombook.compare.ranking import flips, rank

NAN = float("nan")


def _contest(order: str, apart: set[str]) -> Contest:
    """Catalysts by their letters, largest mean first; ``apart`` are the pairs told apart, larger one first."""

    pairs = tuple(
        Pair(
            a, b, 1.0, 0.1, 0.8, 1.2, NAN, NAN, NAN, 9.0, 0.001, 0.001 if f"{a}{b}" in apart else 0.5,
        )
        for place, a in enumerate(order)
        for b in order[place + 1 :]
    )  # fmt: skip
    n = len(order)
    return Contest(tuple(order), np.arange(n, 0.0, -1.0), np.full(n, 0.1), pairs)


def test_a_leader_is_settled_only_if_told_apart_from_every_other() -> None:
    assert rank(_contest("abc", {"ab", "ac"}), 0.95).settled
    found = rank(_contest("abc", {"ac"}), 0.95)
    assert not found.settled
    assert found.leaders == ("a", "b")


def test_who_is_told_to_follow_anybody_cannot_lead() -> None:
    # the first is known too badly to be told from anybody; the second is told to be ahead of the third
    assert rank(_contest("abc", {"bc"}), 0.95).leaders == ("a", "b")


def test_steps_are_between_neighbours_and_pairs_further_apart_are_named() -> None:
    found = rank(_contest("abcd", {"ac", "bd", "ad"}), 0.95)
    assert found.steps == (False, False, False)
    assert found.beyond == (("a", "c"), ("a", "d"), ("b", "d"))
    # a > b ~ c says already that a is above c
    assert rank(_contest("abc", {"ab", "ac"}), 0.95).beyond == ()


def test_the_lowest_may_be_the_best() -> None:
    found = rank(_contest("abc", {"ac", "bc"}), 0.95, lowest_first=True)
    assert found.catalysts == ("c", "b", "a")
    assert found.steps == (True, False)
    assert found.leaders == ("c",)


def test_a_pair_flips_only_if_both_bases_tell_it_apart() -> None:
    geometric = _contest("abc", {"ab", "ac", "bc"})
    assert flips(geometric, _contest("bac", {"ba"}), 0.95) == (("a", "b"),)
    assert flips(geometric, _contest("bac", set()), 0.95) == ()
    assert flips(geometric, geometric, 0.95) == ()


def test_one_catalyst_alone_leads_nobody() -> None:
    assert not rank(_contest("a", set()), 0.95).settled
