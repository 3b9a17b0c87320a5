"""Sets that a set must contain: found among other documents, and held against it."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import NamedTuple

import numpy as np

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.designation import Designation
from overlapse.grammar.model import BasisSet, Block, Document
from overlapse.rules.compare.beside import Kin
from overlapse.rules.compare.canonical import elements_of, numbers_of
from overlapse.rules.compare.sides import Member, Side
from overlapse.rules.compare.within import lies_within
from overlapse.rules.families.kin import contains, may_contain
from overlapse.rules.labels.claims import Claim, claims_of
from overlapse.rules.physics.spans import projection

# Files round in different ways: what agrees this far is one number.
_EXPONENTS = 2e-6
_COEFFICIENTS = 1e-4
# A function that lies so little outside a space is in it for every purpose.
_NEGLIGIBLE = 1e-7


def designations_of(claims: Mapping[int, Sequence[Claim]]) -> dict[int, Designation]:
    """What each set is called by its weightiest claim that is understood."""
    found = {}
    for index, told in claims.items():
        known = (c.designation for c in told if c.designation and not c.designation.readings)
        if (designation := next(known, None)) is not None:
            found[index] = designation
    return found


def kin_among(
    claims: Mapping[int, Sequence[Claim]],
    sets: Sequence[BasisSet],
    documents: Iterable[Document],
) -> list[Kin]:
    """Sets of some documents that sets of another one must contain.

    claims: what the sets of that one are called; sets: themselves.  A set that another of those
    found contains already is left out: the larger one says all that it would say.
    """
    called = designations_of(claims)
    found: list[Kin] = []
    for document in map(over_normalised, documents):
        for index, parent in designations_of(claims_of(document, None)).items():
            members = document.sets[index]
            found += [
                Kin(own, label, parent, document, members)
                for own, label in called.items()
                if may_contain(label, parent) and _are_whole(sets[own], members)
            ]
    return [kin for kin in found if not any(_covers(larger, kin) for larger in found)]


def _are_whole(members: BasisSet, parent: BasisSet) -> bool:
    """Whether two sets are sets by themselves, and not functions to be added to another one.

    Such fragments go by the name of the whole; they hold no contraction, or fewer functions than
    the set they are for.
    """
    if "fitting" in (members.role, parent.role):
        return False
    if not _has_contractions(members) or not _has_contractions(parent):
        return False
    own, other = elements_of(members), elements_of(parent)
    common = own.keys() & other.keys()
    fewer = sum(len(own[key].contracted) < len(other[key].contracted) for key in common)
    return fewer * 2 <= len(common)


def _has_contractions(members: BasisSet) -> bool:
    several = (
        any(len(function.exponents) > 1 for _, function in block.contracted)
        for block in members.blocks
    )
    return sum(several) * 2 > len(members.blocks)


def _covers(larger: Kin, smaller: Kin) -> bool:
    """Whether one parent contains another, for all elements of that one."""
    if larger.own != smaller.own or not may_contain(larger.parent, smaller.parent):
        return False
    elements = {block.atomic_number for block in larger.members.blocks}
    return all(block.atomic_number in elements for block in smaller.members.blocks)


class Lack(NamedTuple):
    """Functions of a parent's element that a set does not contain.

    missing: the functions.  own, parent: the two blocks.
    """

    own: Side
    parent: Side
    missing: tuple[Member, ...]


def lacks(document: Document, kin: Kin) -> Iterator[Lack]:
    """Elements of a set that lack functions of its parent."""
    own, other = elements_of(document.sets[kin.own]), elements_of(kin.members)
    twice = {number for number, ordinal in {*own, *other} if ordinal}
    for key in sorted(own.keys() & other.keys()):
        mine, theirs = own[key], other[key]
        if (
            mine.complete
            and theirs.complete
            and key[0] not in twice
            and _core(mine) == _core(theirs)
            and contains(kin.label, kin.parent, key[0])
        ):
            sides = Side(document, mine), Side(kin.source, theirs)
            missing = tuple(member for l in sides[1].members for member in _missing(*sides, l))
            if missing:
                yield Lack(*sides, missing)


def _core(block: Block) -> int:
    return block.potential.electrons if block.potential else 0


def _missing(own: Side, parent: Side, l: int) -> Iterator[Member]:
    here = own.members.get(l, [])
    known = {numbers_of(member.function) for member in here}
    for member in parent.members[l]:
        if numbers_of(member.function) in known or any(_is_near(member, each) for each in here):
            continue
        with np.errstate(all="ignore"):
            nearby = [other.function for other in here]
            if projection([member.function], nearby).distances[0] <= _NEGLIGIBLE:
                continue
            if not lies_within(parent, [member], own, here):
                yield member


def _is_near(one: Member, other: Member) -> bool:
    """Whether two functions agree to the digits that files usually agree to, but for the sign."""
    a, b = one.function, other.function
    if len(a.exponents) != len(b.exponents):
        return False
    if not np.allclose(a.exponents, b.exponents, rtol=_EXPONENTS, atol=0.0):
        return False
    big = int(np.argmax(np.abs(a.coefficients)))
    sign = 1.0 if a.coefficients[big] * b.coefficients[big] > 0 else -1.0
    return np.allclose(a.coefficients, sign * b.coefficients, rtol=_COEFFICIENTS, atol=1e-7)
