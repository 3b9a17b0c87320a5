"""What lies beside a document and may be held against it: a seal, a reference, sets of its family.

Rules know no files; whoever has them puts these into the `Case`.
"""

from collections.abc import Mapping, Sequence
from typing import NamedTuple

from overlapse.grammar.designation import Designation
from overlapse.grammar.model import BasisSet, Block, Document
from overlapse.rules.compare.canonical import ElementKey, digest_of, elements_of
from overlapse.rules.labels.composition import notation


class Seal(NamedTuple):
    """What an element held when it was sealed.

    digest, parts: see `overlapse.rules.compare.canonical.Digest`.  holds: its composition.
    """

    digest: str
    parts: Mapping[str, str]
    holds: str


class SealedSet(NamedTuple):
    """A set as it was sealed.

    own: index of the set of the document that it belongs to, -1 where that is gone.
    """

    own: int
    label: str | None
    elements: Mapping[ElementKey, Seal]


class Kin(NamedTuple):
    """A set whose functions a set of the document must contain, by what both are called.

    own: index of the set of the document.  label: what that set is called; parent: what the other
    is.  source, members: the other set and the document it stands in.
    """

    own: int
    label: Designation
    parent: Designation
    source: Document
    members: BasisSet


def seal_of(block: Block) -> Seal:
    """The seal of what a block holds now."""
    digest = digest_of(block)
    return Seal(digest.whole, digest.parts, notation(block))


def seals_of(members: BasisSet) -> dict[ElementKey, Seal]:
    """The seals of all elements of a set."""
    return {key: seal_of(block) for key, block in elements_of(members).items()}


def belonging(labels: Sequence[str | None], sets: Sequence[BasisSet]) -> list[int]:
    """For each label of a sealed set the index of the set that it belongs to, -1 for none.

    Sets of one label belong together in their order, and so do those left over: a new label is no
    new number.
    """
    free = list(range(len(sets)))
    found = [-1] * len(labels)
    for by_label in (True, False):
        for at, label in enumerate(labels):
            if found[at] < 0:
                fitting = (i for i in free if not by_label or _same(label, sets[i].label))
                found[at] = next(fitting, -1)
                if found[at] >= 0:
                    free.remove(found[at])
    return found


def _same(one: str | None, other: str | None) -> bool:
    return (one or "").casefold() == (other or "").casefold()
