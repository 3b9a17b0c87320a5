"""Which sets of two texts belong together."""

from collections.abc import Sequence

from overlapse.grammar.designation import parse_label
from overlapse.grammar.model import BasisSet
from overlapse.rules.compare.canonical import digest_of, elements_of


def paired_sets(left: Sequence[BasisSet], right: Sequence[BasisSet]) -> list[tuple[int, int]]:
    """Pairs of indices of sets that belong together; -1 stands for no partner.

    One set on either side always belongs to the other.  Among several, those of one label come
    first, then those with most elements of equal content, then those in the same order; a fitting
    set never belongs to an orbital one.
    """
    if len(left) == len(right) == 1:
        return [(0, 0)]
    scores = sorted(
        (
            (_likeness(one, other), -abs(i - j), -i, -j)
            for i, one in enumerate(left)
            for j, other in enumerate(right)
            if {one.role, other.role} != {"orbital", "fitting"}
        ),
        reverse=True,
    )
    chosen: dict[int, int] = {}
    for _, _, i, j in scores:
        if -i not in chosen and -j not in chosen.values():
            chosen[-i] = -j
    pairs = [(i, chosen.get(i, -1)) for i in range(len(left))]
    return pairs + [(-1, j) for j in range(len(right)) if j not in chosen.values()]


def _likeness(one: BasisSet, other: BasisSet) -> float:
    """2 or more for one label, and up to 1 by the share of elements of equal content."""
    mine, theirs = elements_of(one), elements_of(other)
    common = mine.keys() & theirs.keys()
    equal = sum(digest_of(mine[key]).whole == digest_of(theirs[key]).whole for key in common)
    return 2.0 * same_label(one.label, other.label) + equal / max(len(mine), len(theirs), 1)


def same_label(one: str | None, other: str | None) -> bool:
    """Whether two labels mean one set, however they are spelled."""
    if not one or not other:
        return False
    if one.casefold() == other.casefold():
        return True
    designation = parse_label(one)
    return designation is not None and designation == parse_label(other)
