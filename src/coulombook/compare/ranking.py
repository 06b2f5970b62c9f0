"""Who leads, who follows, and where the data cannot tell."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from coulombook.compare.pairs import Contest


@dataclass(frozen=True, slots=True)
class Ranking:
    """Catalysts in order, best first.

    ``steps`` says of each neighbours in this order whether they are told apart; ``beyond`` are pairs told apart though
    no step between them is. ``leaders`` are those that nobody is told to be better than.
    """

    catalysts: tuple[str, ...]
    steps: tuple[bool, ...]
    beyond: tuple[tuple[str, str], ...]
    leaders: tuple[str, ...]

    @property
    def settled(self) -> bool:
        """Whether one catalyst leads all the others."""
        return len(self.leaders) == 1 and len(self.catalysts) > 1


def rank(contest: Contest, level: float, *, lowest_first: bool = False) -> Ranking:
    """Rank the catalysts of one point by the verdicts of their pairs.

    ``lowest_first``: the smallest mean is the best, as of hydrogen.
    """
    names = contest.catalysts[::-1] if lowest_first else contest.catalysts
    apart = told_apart(contest, level)
    steps = tuple(frozenset(pair) in apart for pair in pairwise(names))
    beyond = tuple(
        (one, other)
        for place, one in enumerate(names)
        for reach, other in enumerate(names[place + 1 :], start=place + 1)
        if frozenset((one, other)) in apart and not any(steps[place:reach])
    )
    leaders = tuple(
        one
        for place, one in enumerate(names)
        if not any(frozenset((ahead, one)) in apart for ahead in names[:place])
    )
    return Ranking(names, steps, beyond, leaders)


def told_apart(contest: Contest, level: float) -> frozenset[frozenset[str]]:
    """The pairs that the family tells apart."""
    return frozenset(frozenset((pair.one, pair.other)) for pair in contest.pairs if pair.told_apart(level))


def flips(one: Contest, other: Contest, level: float) -> tuple[tuple[str, str], ...]:
    """Pairs told apart in both contests, the first of each leading in the one and following in the other.

    For one point on two bases: such as a catalyst that leads on its geometric area by being rough.
    """
    leads = _leads(other, level)
    return tuple(pair for pair in _leads(one, level) if (pair[1], pair[0]) in leads)


def _leads(contest: Contest, level: float) -> Sequence[tuple[str, str]]:
    return [(pair.one, pair.other) for pair in contest.pairs if pair.told_apart(level)]
