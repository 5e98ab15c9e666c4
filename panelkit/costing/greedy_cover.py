"""Covering by price per newly covered marker: only to compare with the exact cover."""

from collections.abc import Sequence
from fractions import Fraction

__all__ = ["greedy_cover"]


def greedy_cover(
    wanted: Sequence[str], options: Sequence[tuple[str, frozenset[str], int]]
) -> int | None:
    """Return what the greedy cover costs once what it does not need is left out.

    Parameters
    ----------
    wanted : sequence of str
        Markers to be covered.
    options : sequence of (str, frozenset of str, int)
        Id, markers and cost of each option.

    Returns
    -------
    int or None
        The cost; None where the options do not cover everything.
    """
    left = set(wanted)
    taken: list[tuple[str, frozenset[str], int]] = []
    while left:
        useful = [option for option in options if option[1] & left]
        if not useful:
            return None
        best = min(
            useful,
            key=lambda option: (Fraction(option[2], len(option[1] & left)), option[0]),
        )
        taken.append(best)
        left -= best[1]
    for option in sorted(taken, key=lambda option: -option[2]):
        others = [other for other in taken if other is not option]
        if set(wanted) <= set().union(*(other[1] for other in others)):
            taken = others
    return sum(option[2] for option in taken)
