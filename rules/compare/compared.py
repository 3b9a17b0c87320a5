"""Functions of one l in two blocks: which are the same, in which sense, and what differs."""

from collections.abc import Iterator, Sequence
from typing import Literal, NamedTuple

import numpy as np

from overlapse.grammar.model import letter_of
from overlapse.rules.compare.canonical import numbers_of
from overlapse.rules.compare.printed import is_rounded
from overlapse.rules.compare.sides import Difference, Member, Side
from overlapse.rules.compare.within import COARSEST_EXPONENT, factor, lies_within
from overlapse.rules.physics.spans import normalised_overlaps, principal_angles

Sense = Literal["numbers", "rounding", "span", "contained", "contains", "different"]

# The same of coefficients, as a share of the largest of their function.
_COARSEST_COEFFICIENT = 0.005
# Functions that overlap less than this are hardly meant to be one.
_ALIKE = 0.3


class Part(NamedTuple):
    """What was found for one l, or for the potential.

    sense: in which the two are equal, or which holds the other.  angle: largest principal angle in
    radian, None where it was not needed.  reasons: in words.
    """

    sense: Sense
    differences: tuple[Difference, ...] = ()
    reasons: tuple[str, ...] = ()
    angle: float | None = None


def compare_functions(left: Side, right: Side, l: int) -> Part:
    """Compare all functions of one l of two blocks."""
    mine, theirs = left.members.get(l, []), right.members.get(l, [])
    mine, theirs = _without_equal(mine, theirs)
    if not mine and not theirs:
        return Part("numbers")
    rounded = _rounded_pairs(left, mine, right, theirs)
    found = [d for one, other in rounded for d in differences_of(left, one, right, other)]
    mine = _except(mine, [one for one, _ in rounded])
    theirs = _except(theirs, [other for _, other in rounded])
    if not mine and not theirs:
        return Part("rounding", tuple(found))
    pairs, lonely = _partners(mine, theirs)
    real = [d for one, other in pairs for d in differences_of(left, one, right, other)]
    real += _missing(left, lonely[0], right, lonely[1])
    return _by_span(left, mine, right, theirs, l)._replace(differences=tuple(real + found))


def _missing(
    left: Side, only_left: Sequence[Member], right: Side, only_right: Sequence[Member]
) -> Iterator[Difference]:
    for member in only_left:
        yield Difference("function", left.spot(member), None)
    for member in only_right:
        yield Difference("function", None, right.spot(member))


# ---- by numbers


def _without_equal(
    mine: Sequence[Member], theirs: Sequence[Member]
) -> tuple[list[Member], list[Member]]:
    """What remains when functions of equal numbers are taken away, each once."""
    waiting: dict[bytes, list[Member]] = {}
    for member in theirs:
        waiting.setdefault(numbers_of(member.function), []).append(member)
    rest = []
    for member in mine:
        if same := waiting.get(numbers_of(member.function)):
            same.pop(0)
        else:
            rest.append(member)
    left_over = [member for members in waiting.values() for member in members]
    return rest, left_over


def _except(members: Sequence[Member], taken: Sequence[Member]) -> list[Member]:
    # By identity: arrays have no single answer to whether they are equal.
    gone = {id(member) for member in taken}
    return [member for member in members if id(member) not in gone]


def _rounded_pairs(
    left: Side, mine: Sequence[Member], right: Side, theirs: Sequence[Member]
) -> list[tuple[Member, Member]]:
    """Functions that are equal but for rounding, each taken once."""
    free = list(theirs)
    pairs = []
    for member in mine:
        other = next((o for o in free if _is_rounded(left, member, right, o)), None)
        if other is not None:
            free = _except(free, [other])
            pairs.append((member, other))
    return pairs


def _is_rounded(left: Side, one: Member, right: Side, other: Member) -> bool:
    a, b = one.function, other.function
    if len(a.exponents) != len(b.exponents):
        return False
    # Far-away numbers need not be spelled.
    if not np.allclose(a.exponents, b.exponents, rtol=0.02, atol=0.0):
        return False
    if not np.allclose(a.coefficients, b.coefficients, rtol=0.0, atol=0.02 * _largest(one)):
        return False
    return all(d.rounded for d in differences_of(left, one, right, other))


def _largest(member: Member) -> float:
    return float(np.abs(member.function.coefficients).max())


def differences_of(left: Side, one: Member, right: Side, other: Member) -> list[Difference]:
    """Numbers in which two functions differ, the exponent of a row before its coefficient."""
    found = []
    rows, only_left, only_right = _aligned(one, other)
    coarsest = _COARSEST_COEFFICIENT * min(_largest(one), _largest(other))
    for i, j in rows:
        a, b = left.exponent(one, i), right.exponent(other, j)
        if a.value != b.value:
            same = is_rounded(a, b, COARSEST_EXPONENT * min(abs(a.value), abs(b.value)))
            found.append(Difference("exponent", left.spot(one, i), right.spot(other, j), same))
        a, b = left.coefficient(one, i), right.coefficient(other, j)
        if a.value != b.value:
            same = is_rounded(a, b, coarsest)
            spots = left.spot(one, i, True), right.spot(other, j, True)
            found.append(Difference("coefficient", *spots, same))
    found += [_lonely_row(left, one, i, right, other) for i in only_left]
    for j in only_right:
        lonely = _lonely_row(right, other, j, left, one)
        found.append(lonely._replace(left=lonely.right, right=lonely.left))
    return found


def _lonely_row(own: Side, member: Member, at: int, side: Side, other: Member) -> Difference:
    """A primitive that the other function does without: a zero in its shell, or no row at all."""
    shell = side.block.shells[other.shell]
    here = np.flatnonzero(shell.exponents == member.function.exponents[at])
    if not len(here):
        return Difference("row", own.spot(member, at), None)
    zero = other.function._replace(
        exponents=shell.exponents[here],
        coefficients=shell.coefficients[here, other.function.column],
        rows=here,
    )
    place = side.spot(Member(other.shell, zero), 0, True)
    return Difference("coefficient", own.spot(member, at, True), place)


def _aligned(one: Member, other: Member) -> tuple[list[tuple[int, int]], list[int], list[int]]:
    """Rows of two functions that belong together, by exponent, and rows without a partner.

    Equal exponents first, then the nearest.
    """
    a, b = one.function.exponents.tolist(), other.function.exponents.tolist()
    rows: list[tuple[int, int]] = []
    free = dict.fromkeys(range(len(b)))
    rest = []
    for i, value in enumerate(a):
        j = next((j for j in free if b[j] == value), None)
        if j is None:
            rest.append(i)
        else:
            rows.append((i, j))
            del free[j]
    waiting = list(free)
    if len(rest) == len(waiting):
        return sorted([*rows, *zip(rest, waiting, strict=True)]), [], []
    with np.errstate(all="ignore"):
        gaps = np.abs(np.log(np.abs(np.array(a)[:, None] / np.array(b)[None, :])))
    gaps = np.nan_to_num(gaps, nan=np.inf)
    while rest and waiting:
        i, j = divmod(int(np.argmin(gaps[np.ix_(rest, waiting)])), len(waiting))
        rows.append((rest.pop(i), waiting.pop(j)))
    return sorted(rows), rest, waiting


def _partners(
    mine: Sequence[Member], theirs: Sequence[Member]
) -> tuple[list[tuple[Member, Member]], tuple[list[Member], list[Member]]]:
    """Functions that most likely mean each other, and those left alone on either side."""
    if not mine or not theirs:
        return [], (list(mine), list(theirs))
    closeness = np.abs(
        normalised_overlaps([m.function for m in mine], [m.function for m in theirs])
    )
    closeness[~np.isfinite(closeness)] = 0.0
    chosen: dict[int, int] = {}
    # The sort is stable, so that what is equally close is taken in the order of the text.
    for flat in np.argsort(-closeness, axis=None, kind="stable").tolist():
        i, j = divmod(flat, len(theirs))
        if i not in chosen and j not in chosen.values():
            chosen[i] = j
    pairs = [(mine[i], theirs[chosen[i]]) for i in sorted(chosen)]
    taken = set(chosen.values())
    return pairs, (
        [member for i, member in enumerate(mine) if i not in chosen],
        [member for j, member in enumerate(theirs) if j not in taken],
    )


def nearest_difference(left: Side, right: Side, member: Member) -> Difference | None:
    """How the likeliest counterpart of a function of the second block differs from it.

    Looked for among functions of as many primitives that the second block does not have itself;
    None where none is alike at all.
    """
    l, count = member.function.l, len(member.function.exponents)
    strange, _ = _without_equal(left.members.get(l, []), right.members.get(l, []))
    others = [other for other in strange if len(other.function.exponents) == count]
    if not others:
        return None
    closeness = normalised_overlaps([member.function], [m.function for m in others])[0]
    closeness = np.nan_to_num(np.abs(closeness))
    best = int(np.argmax(closeness))
    if closeness[best] < _ALIKE:
        return None
    found = differences_of(left, others[best], right, member)
    return next((difference for difference in found if not difference.rounded), None)


# ---- by span


def _by_span(
    left: Side, mine: Sequence[Member], right: Side, theirs: Sequence[Member], l: int
) -> Part:
    """Whether what differs in numbers spans the same space, or one part of the other."""
    all_mine, all_theirs = left.members.get(l, []), right.members.get(l, [])
    letter = letter_of(l)
    if not all_mine or not all_theirs:
        have = "only the second file has" if not all_mine else "only the first file has"
        return Part("contains" if all_mine else "contained", (), (f"{have} {letter} functions",))
    with np.errstate(all="ignore"):
        inside = lies_within(left, mine, right, all_theirs)
        covers = lies_within(right, theirs, left, all_mine)
        functions = [[m.function for m in members] for members in (all_mine, all_theirs)]
        angles = principal_angles(*functions)
    angle = float(angles.max()) if len(angles) and np.isfinite(angles).all() else None
    if inside and covers:
        return Part("span", (), (_how(left, mine, right, theirs, letter, angle),), angle)
    counts = f"{letter} functions: {len(all_mine)} and {len(all_theirs)}"
    if inside or covers:
        return Part("contained" if inside else "contains", (), (counts,), angle)
    reasons = (counts,) if len(all_mine) != len(all_theirs) else ()
    return Part("different", (), reasons, angle)


def _how(
    left: Side,
    mine: Sequence[Member],
    right: Side,
    theirs: Sequence[Member],
    letter: str,
    angle: float | None,
) -> str:
    """What makes two equal spaces differ in numbers."""
    pairs, lonely = _partners(mine, theirs)
    if not any(lonely):
        factors = [factor(left, one, right, other) for one, other in pairs]
        if all(f is not None for f in factors):
            name, first = left.name(pairs[0][0]), factors[0]
            more = f", and {len(pairs) - 1} more alike" if len(pairs) > 1 else ""
            return f"{name} is scaled by {first:.9g} as a whole{more}"
    elif not pairs:
        side = left if lonely[0] else right
        names = ", ".join(side.name(member) for member in (*lonely[0], *lonely[1]))
        which = "first" if lonely[0] else "second"
        return f"{names} of the {which} file adds nothing to its other functions"
    return f"the {letter} functions are contracted in another way; largest angle {angle or 0:.1e}"
