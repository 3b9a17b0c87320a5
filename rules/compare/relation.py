"""Two blocks of one element: equal, and in which sense, or different, and where first."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import zip_longest
from typing import Literal

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.elements import symbol_of
from overlapse.grammar.model import Block, Channel, Document, Potential, letter_of
from overlapse.rules.compare.canonical import channel_key, elements_of, terms_of
from overlapse.rules.compare.compared import Part, Sense, compare_functions
from overlapse.rules.compare.pairing import paired_sets
from overlapse.rules.compare.printed import is_rounded, printed
from overlapse.rules.compare.sides import Difference, Side, Spot
from overlapse.rules.compare.within import COARSEST_EXPONENT

Verdict = Literal[
    "equal text", "equal numbers", "equal to rounding", "equal span", "contained in", "contains",
    "different", "only in first", "only in second",
]  # fmt: skip
EQUAL: tuple[Verdict, ...] = ("equal text", "equal numbers", "equal to rounding", "equal span")

_VERDICTS: dict[Sense, Verdict] = {
    "numbers": "equal numbers",
    "rounding": "equal to rounding",
    "span": "equal span",
    "contained": "contained in",
    "contains": "contains",
    "different": "different",
}


@dataclass(frozen=True)
class Relation:
    """How one element of a set is related to the same element of another.

    verdict: the strongest that holds; "contained in" and "contains" are said of the first.  lines:
    of the two headings, None where the element is missing.
    reasons: what else is to be said, in words.  differences: all that differs, in the order of the
    first text; where some of it is more than rounding, that alone.  angle: largest principal angle
    between the spaces of one l, in radian, None where numbers decided.
    """

    atomic_number: int
    verdict: Verdict
    lines: tuple[int | None, int | None]
    reasons: tuple[str, ...] = ()
    differences: tuple[Difference, ...] = ()
    angle: float | None = None

    @property
    def symbol(self) -> str:
        return symbol_of(self.atomic_number)

    @property
    def first(self) -> Difference | None:
        """The first difference in the order of the text."""
        return self.differences[0] if self.differences else None


def relate(left: Document, mine: Block, right: Document, theirs: Block) -> Relation:
    """Compare a block with one of the same element.

    Both documents must have their coefficients over normalised primitives
    (`overlapse.grammar.convention.over_normalised`).
    """
    one, other = Side(left, mine), Side(right, theirs)
    parts = [compare_functions(one, other, l) for l in sorted({*one.members, *other.members})]
    parts.append(_compare_potentials(one, other))
    parts.append(_compare_kinds(mine, theirs))
    verdict = _VERDICTS[_together([part.sense for part in parts])]
    if verdict == "equal numbers" and _same_text(left, mine, right, theirs):
        verdict = "equal text"
    found = [difference for part in parts for difference in part.differences]
    real = [difference for difference in found if not difference.rounded]
    angles = [part.angle for part in parts if part.angle is not None]
    reasons = [reason for part in parts for reason in part.reasons]
    for block, which in ((mine, "first"), (theirs, "second")):
        if not block.complete:
            reasons.append(f"parts of this element could not be read in the {which} file")
    return Relation(
        mine.atomic_number,
        verdict,
        (mine.line, theirs.line),
        tuple(reasons),
        tuple(sorted(real or found, key=_order)),
        max(angles, default=None),
    )


def _together(senses: Sequence[Sense]) -> Sense:
    """The verdict on the whole from those on its parts."""
    found = set(senses)
    if "different" in found or {"contained", "contains"} <= found:
        return "different"
    for sense in ("contained", "contains", "span", "rounding"):
        if sense in found:
            return sense
    return "numbers"


def _order(difference: Difference) -> tuple[bool, int, int]:
    spot = difference.left or difference.right
    assert spot is not None
    return difference.left is None, spot.line, spot.column


def _same_text(left: Document, mine: Block, right: Document, theirs: Block) -> bool:
    if left.layout != right.layout or mine.functions != theirs.functions:
        return False
    return _own_lines(left, mine) == _own_lines(right, theirs)


def _own_lines(document: Document, block: Block) -> list[str]:
    """The lines of a block's heading, shells and potential, which may stand in different places."""
    spans = [(block.line - 1, block.line)]
    for shell in block.shells:
        spans.append((shell.line - 1, shell.cells.last if shell.cells else shell.line))
    if block.potential is not None:
        spans.append((block.potential.line - 1, block.potential.line))
        spans += [(c.line - 1, c.line + len(c.powers)) for c in block.potential.channels]
    lines = document.source.lines
    return [line.rstrip() for first, last in spans for line in lines[first:last]]


def _compare_kinds(mine: Block, theirs: Block) -> Part:
    """Spherical against Cartesian functions, which make other functions of the same numbers."""
    marks = (mine.functions, theirs.functions)
    if None in marks or marks[0] == marks[1] or max((*mine.counts, *theirs.counts), default=0) < 2:
        return Part("numbers")
    return Part(
        "different", (), (f"marked {marks[0]} in the first file, {marks[1]} in the second",)
    )


# ---- potentials


def _held(potential: Potential | None) -> Potential | None:
    return potential if potential and (potential.electrons or potential.channels) else None


def _compare_potentials(left: Side, right: Side) -> Part:
    mine, theirs = _held(left.block.potential), _held(right.block.potential)
    if mine is None and theirs is None:
        return Part("numbers")
    if mine is None or theirs is None:
        which = "second" if mine is None else "first"
        return Part("different", (), (f"only the {which} file has a core potential",))
    found: list[Difference] = []
    reasons = []
    if mine.electrons != theirs.electrons:
        reasons.append(f"core electrons: {mine.electrons} and {theirs.electrons}")
    own, others = _channels(mine), _channels(theirs)
    for key in sorted({*own, *others}):
        for one, other in zip_longest(own.get(key, ()), others.get(key, ())):
            if one is None or other is None:
                which = "second" if one is None else "first"
                reasons.append(f"only the {which} file has the {_channel_name(key)}")
            else:
                found += _compare_channels(left, one, right, other, _channel_name(key))
    if reasons or any(not difference.rounded for difference in found):
        told = ("the core potentials differ",) if found and not reasons else tuple(reasons)
        return Part("different", tuple(found), told)
    return Part("rounding" if found else "numbers", tuple(found))


def _channels(potential: Potential) -> dict[tuple[str, int], list[Channel]]:
    """Channels that have a term other than zero, by kind and l."""
    found: dict[tuple[str, int], list[Channel]] = {}
    for channel in potential.channels:
        if terms_of(channel):
            found.setdefault(channel_key(channel), []).append(channel)
    return found


def _channel_name(key: tuple[str, int]) -> str:
    kind, l = key
    part = "local part" if l < 0 else f"{letter_of(l)} part"
    return f"{'spin-orbit ' if kind == 'spin-orbit' else ''}{part} of the core potential"


def _compare_channels(
    left: Side, one: Channel, right: Side, other: Channel, name: str
) -> list[Difference]:
    found = []
    for mine, theirs in zip_longest(terms_of(one), terms_of(other)):
        if mine is None or theirs is None:
            spots = [
                None if term is None else side.term_spot(channel, term[1], name)
                for side, channel, term in ((left, one, mine), (right, other, theirs))
            ]
            found.append(Difference("term", spots[0], spots[1]))
            continue
        for what, at in (("power of r", 0), ("exponent", 1), ("coefficient", 2)):
            if mine[at] != theirs[at]:
                a = left.term_spot(one, mine[at], name)
                b = right.term_spot(other, theirs[at], name)
                found.append(Difference(what, a, b, at > 0 and _are_rounded(a, b)))
    return found


def _are_rounded(one: Spot, other: Spot) -> bool:
    coarsest = COARSEST_EXPONENT * min(abs(one.value), abs(other.value))
    a, b = printed(one.value, one.spelling), printed(other.value, other.spelling)
    return is_rounded(a, b, coarsest)


# ---- documents


def relate_documents(left: Document, right: Document) -> list[tuple[int, int, list[Relation]]]:
    """Relations of all elements of two documents, set by set.

    Each entry: the indices of the two sets that belong together (-1 for none), and their elements
    by atomic number.
    """
    left, right = over_normalised(left), over_normalised(right)
    return [
        (i, j, list(_relate_sets(left, i, right, j))) for i, j in paired_sets(left.sets, right.sets)
    ]


def _relate_sets(left: Document, i: int, right: Document, j: int) -> list[Relation]:
    mine = elements_of(left.sets[i]) if i >= 0 else {}
    theirs = elements_of(right.sets[j]) if j >= 0 else {}
    found = []
    for key in sorted({*mine, *theirs}):
        one, other = mine.get(key), theirs.get(key)
        if one is not None and other is not None:
            found.append(relate(left, one, right, other))
        else:
            verdict: Verdict = "only in first" if other is None else "only in second"
            lines = (one.line if one else None, other.line if other else None)
            found.append(Relation(key[0], verdict, lines))
    return found
