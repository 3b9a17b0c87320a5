"""Core potentials: do they fit the element and the functions beside them?"""

from collections.abc import Iterator
from typing import NamedTuple

from overlapse.grammar.elements import occupied, replaced_by
from overlapse.grammar.model import BasisSet, Block
from overlapse.rules.case import Case, gathered, is_orbital
from overlapse.rules.finding import Finding
from overlapse.rules.labels.cores import (
    Carrier,
    carriers_of,
    family_core,
    is_closed,
    is_usual,
    local_charge,
    neighbours,
    opens_f,
    possible_cores,
)
from overlapse.rules.labels.valence import innermost, is_valence_set, likely_core, valence_blocks
from overlapse.rules.registry import rule


class Doubt(NamedTuple):
    """What speaks against a count of electrons, and the count that is meant."""

    words: str
    meant: int | None
    sure: bool


def _impossible(carrier: Carrier) -> Doubt | None:
    """A count that no atom of this element can give to a core."""
    z, n = carrier.block.atomic_number, carrier.potential.electrons
    symbol = carrier.block.symbol
    if n >= z:
        return Doubt(f"{symbol} has only {z} electrons", None, True)
    if opens_f(n, z):
        return None
    if not is_closed(n, bool(carrier.potential.channels)):
        return Doubt("so many electrons fill no closed shells", None, True)
    if replaced_by(n) is not None and not is_usual(n, z):
        return Doubt(f"no potential for {symbol} with this core is in use", None, False)
    return None


def _odd_charge(carrier: Carrier, charges: dict[int, float]) -> Doubt | None:
    """A local part whose 1/r terms tell another core than the count.

    Some families cancel the singular attraction of the valence charge, Z - N, others carry the
    repulsion of the core, -N.
    """
    z, n = carrier.block.atomic_number, carrier.potential.electrons
    charge = charges.get(z)
    if charge is None or abs(charge - round(charge)) > 1e-6 or not charges:
        return None
    for sign, what in ((-1, "-N"), (1, "Z - N")):
        told = -round(charge) if sign < 0 else z - round(charge)
        if told == n:
            return None
        if 0 < told < z and is_usual(told, z) and (sign < 0) == (charge < 0):
            return Doubt(
                f"the 1/r terms of its local part sum to {round(charge)}, which is {what} for a "
                f"core of {told}",
                told,
                False,
            )
    return None


def _odd_neighbour(carrier: Carrier, carriers: list[Carrier]) -> Doubt | None:
    near = neighbours(carrier, carriers)
    counts = {c.potential.electrons for c in near}
    if len(counts) != 1 or carrier.potential.electrons in counts:
        return None
    (meant,) = counts
    names = " and ".join(c.block.symbol for c in near)
    return Doubt(f"its neighbours {names} have {meant}", meant, False)


def _odd_family(case: Case, index: int, carrier: Carrier) -> Doubt | None:
    for claim in case.claims[index]:
        if claim.designation is None:
            continue
        known = family_core(str(claim.designation), carrier.block.atomic_number)
        if known is not None and known.electrons != carrier.potential.electrons:
            told = f"{known.electrons} electrons" if known.electrons else "no potential"
            return Doubt(
                f"{known.label} ({claim.where}) has {told} here", known.electrons or None, False
            )
    return None


@rule("potential.core")
def core(case: Case) -> Iterator[Finding]:
    """The number of electrons that a core potential replaces is impossible or unusual.

    A potential replaces closed shells: 2, 10, 18, 28, 36, 46, 54, 60, 68, 78 electrons, and the
    open f shell of a lanthanide or actinide with them in some families.  With another number the
    atom gets the wrong charge, and the valence electrons are counted wrongly; two families that
    differ for one element are a silent and real error.  The family, the neighbours in the row, and
    the 1/r terms of the local part tell which number is meant.

    Formula: N < Z; N electrons fill closed shells; the 1/r terms of a local part sum to Z - N or to
    -N in the families that carry them whole.

    Source: M. Dolg, X. Cao, Chem. Rev. 112, 403 (2012); P. J. Hay, W. R. Wadt, J. Chem. Phys. 82,
    270 (1985); core sizes counted in published files.

    Remedy: compare with the original publication of the potential.

    Bad::

        Na 0
        S 2 1.00
          0.5 -0.2
          0.1 1.1
        S 1 1.00
          0.05 1.0
        ****
        NA 0
        NA-ECP 2 24
        d potential
        1
        1 175.0 -10.0
        s-d potential
        1
        2 20.0 40.0
        p-d potential
        1
        2 10.0 20.0

    Good::

        Na 0
        S 2 1.00
          0.5 -0.2
          0.1 1.1
        S 1 1.00
          0.05 1.0
        ****
        NA 0
        NA-ECP 2 10
        d potential
        1
        1 175.0 -10.0
        s-d potential
        1
        2 20.0 40.0
        p-d potential
        1
        2 10.0 20.0
    """
    for index, members in enumerate(case.sets):
        carriers = [c for c in carriers_of(members) if c.potential.electrons]
        charges = {
            c.block.atomic_number: charge
            for c in carriers
            if (charge := local_charge(c.potential)) is not None
        }
        found = []
        for carrier in carriers:
            doubts = [
                doubt
                for doubt in (
                    _impossible(carrier),
                    _odd_charge(carrier, charges),
                    _odd_neighbour(carrier, carriers),
                    _odd_family(case, index, carrier),
                )
                if doubt is not None
            ]
            if doubts:
                found.append(_core_finding(case, carrier, doubts))
        yield from gathered(found)


def _core_finding(case: Case, carrier: Carrier, doubts: list[Doubt]) -> Finding:
    block, potential = carrier
    meant = next((doubt.meant for doubt in doubts if doubt.meant), None)
    sizes = possible_cores(block.atomic_number)
    told = f"; {meant} is meant" if meant else ""
    usual = f" (in use for {block.symbol}: {', '.join(map(str, sizes))})" if sizes else ""
    return case.at_line(
        potential.line,
        "error" if any(doubt.sure for doubt in doubts) else "warning",
        f"the potential of {block.symbol} replaces {potential.electrons} electrons: "
        f"{'; '.join(doubt.words for doubt in doubts)}{told}{usual}",
        element=block.symbol,
        measured=potential.electrons,
        limit=block.atomic_number,
        expected=meant,
        remedy="compare the number with the publication of the potential",
    )


# ---- potential.missing

# Published sets: at least 0.945 with all electrons, at most 0.913 beside a potential for 10 or more
# electrons (tight lone functions do it), at most 0.993 beside one for the 1s shell alone.
_WHOLE, _WHOLE_BESIDE_1S = 0.94, 0.996
# Below this a block cannot be one for all electrons, however many functions it has.
_VALENCE = 0.93


@rule("potential.missing")
def missing(case: Case) -> Iterator[Finding]:
    """A valence set has no core potential, or a set for all electrons has one.

    A block that lacks just the shells of a core was made for a core potential; without it the
    electrons of the core fall into valence functions and the energy means nothing.  The shells that
    are missing say how many electrons are meant.  Where no block of the set has a potential they
    are likely kept in a file of their own, which is a note; where others have theirs, one was lost.
    The other way round, functions for the core beside a potential that has replaced it let valence
    electrons collapse into the core.

    Formula: the occupied subshells less those that the block describes are those of a core of N
    electrons; the 1s Slater function of the atom, zeta = Z - 0.3, projected on the s functions of
    the block keeps 0.94 of its length squared only in sets for all electrons.

    Source: cores of 2, 10, 18, 28, 36, 46, 54, 60, 68, 78 electrons: M. Dolg, X. Cao, Chem. Rev.
    112, 403 (2012).  J. C. Slater, Phys. Rev. 36, 57 (1930).  The limit is measured on published
    sets.

    Remedy: add the potential that belongs to the valence set; take away a potential that does not
    belong to a set for all electrons.

    Bad::

        Na 0
        S 2 1.00
          0.5 -0.2
          0.1 1.1
        S 1 1.00
          0.05 1.0
        ****

    Good::

        Na 0
        S 2 1.00
          0.5 -0.2
          0.1 1.1
        S 1 1.00
          0.05 1.0
        ****
        NA 0
        NA-ECP 2 10
        d potential
        1
        1 175.0 -10.0
        s-d potential
        1
        2 20.0 40.0
        p-d potential
        1
        2 10.0 20.0
    """
    for index, members in enumerate(case.sets):
        if not case.is_fitting(index):
            yield from _without(case, index, members)
            yield from _beside(case, members)


def _without(case: Case, index: int, members: BasisSet) -> Iterator[Finding]:
    """Valence blocks without a potential."""
    blocks = [block for block in members.blocks if block.complete and block.shells]
    others = [c for c in carriers_of(members) if c.block.shells]
    if not (is_orbital(members) or is_valence_set(members)):
        return
    valence = valence_blocks(members)
    valence += [b for b in blocks if b not in valence and _needs(case, index, b, bool(others))]
    if not valence:
        return
    sizes = [(block.symbol, _meant(case, index, block)) for block in valence[:6]]
    shown = ", ".join(f"{symbol} {electrons}" for symbol, electrons in sizes)
    shown += f" and {len(valence) - 6} more" if len(valence) > 6 else ""
    count = f"{len(valence)} of {len(blocks)} elements are valence sets"
    if len(valence) == 1:
        count = f"{valence[0].symbol} is a valence set"
    where = (
        "though other elements of the set have theirs"
        if others
        else "and no element of the set has one; perhaps they are in another file"
    )
    yield case.at_line(
        valence[0].line,
        "warning" if others else "note",
        f"{count} without the core potential that belongs to "
        f"{'it' if len(valence) == 1 else 'them'}, {where} (electrons to be replaced: {shown})",
        element=valence[0].symbol,
        measured=0,
        expected=sizes[0][1],
        remedy="use it together with its potential, never alone",
    )


def _needs(case: Case, index: int, block: Block, others: bool) -> bool:
    """Whether a block with functions enough for the whole atom was made for a potential after all.

    Asked only where other elements of the set have one, or the set's family gives it one.
    """
    if block.potential or block.atomic_number < 3:
        return False
    return (others or bool(_family_meant(case, index, block))) and innermost(block) < _VALENCE


def _meant(case: Case, index: int, block: Block) -> int | None:
    """Electrons of the potential that a valence block was made for: its family's, if known."""
    return _family_meant(case, index, block) or likely_core(block)


def _family_meant(case: Case, index: int, block: Block) -> int | None:
    for claim in case.claims[index]:
        if claim.designation is not None:
            known = family_core(str(claim.designation), block.atomic_number)
            if known is not None and known.electrons:
                return known.electrons
    return None


def _beside(case: Case, members: BasisSet) -> Iterator[Finding]:
    """Blocks for all electrons beside a potential."""
    found = []
    for block, potential in carriers_of(members):
        least = _WHOLE if potential.electrons > 2 else _WHOLE_BESIDE_1S
        if potential.electrons < 2 or not block.complete:
            continue
        if _covers(block) and (share := innermost(block)) >= least:
            found.append(
                case.at_line(
                    potential.line,
                    "warning",
                    f"the functions of {block.symbol} describe its 1s shell (to {share:.1%}), but "
                    f"the potential has replaced it with {potential.electrons} electrons: "
                    "a set for all electrons beside a core potential",
                    element=block.symbol,
                    measured=round(share, 6),
                    limit=least,
                    remedy="take the potential away, or use the valence set that belongs to it",
                )
            )
    yield from gathered(found)


def _covers(block: Block) -> bool:
    """Whether the block has functions for all occupied shells of the atom: a quick first test."""
    return all(block.counts.get(l, 0) >= n for l, n in occupied(block.atomic_number).items())
