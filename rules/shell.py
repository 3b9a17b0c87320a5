"""Shells: is any missing that the atom needs?"""

from collections.abc import Iterator

from overlapse.grammar.elements import core
from overlapse.grammar.model import Block, letter_of
from overlapse.rules.case import Case, gathered, is_orbital
from overlapse.rules.finding import Finding
from overlapse.rules.labels.valence import (
    fitting_core,
    is_valence_set,
    lacking,
    needed,
    valence_blocks,
)
from overlapse.rules.registry import rule


def _judged(case: Case) -> Iterator[list[Block]]:
    """For each set, the blocks for which a missing shell means something.

    Where several elements lack just the shells of a usual core, they are valence blocks whose
    potentials live elsewhere; `potential.missing` says so once.
    """
    for members in case.sets:
        if is_orbital(members):
            valence = {id(block) for block in valence_blocks(members)}
            yield [b for b in members.blocks if b.complete and b.shells and id(b) not in valence]


def _shells(counts: dict[int, int]) -> str:
    return " ".join(f"{count}{letter_of(l)}" for l, count in sorted(counts.items()) if count)


def _missing(case: Case, block: Block, l: int, short: int, what: str) -> Finding:
    wanted = needed(block) or {}
    letter = letter_of(l)
    found = block.counts.get(l, 0)
    beside = f" beside the potential for {block.potential.electrons}" if block.potential else ""
    message = (
        f"{block.symbol} has {wanted[l]} occupied {letter} shell{'s' * (wanted[l] > 1)}{beside}; "
        f"the block has {found or 'no'} {letter} function{'s' * (found != 1)}, so {short} "
        f"{what} function{'s are' if short > 1 else ' is'} missing"
    )
    electrons = None if block.potential else fitting_core(block)
    if electrons is not None:
        message += f"; it would fit a core potential for {electrons} electrons, but none is given"
    return case.at_line(
        block.line,
        "error",
        message,
        element=block.symbol,
        shell=letter,
        measured=found,
        limit=wanted[l],
        expected=_shells(wanted),
        remedy=(
            "add the potential that belongs to this valence set"
            if electrons is not None
            else "restore the lost shell from the source"
        ),
    )


def _lacks_core(block: Block, l: int) -> bool:
    """Whether even the core of an all-electron block is not covered for this l."""
    kernel = core(block.atomic_number)
    return block.potential is None and block.counts.get(l, 0) < kernel.get(l, 0)


@rule("shell.core")
def core_shells(case: Case) -> Iterator[Finding]:
    """Fewer functions of some l than the atom has core shells.

    Without a function for each core shell the electrons of the core have nowhere to go and the
    energy is wrong by many hartree.  If a core potential was meant to replace them, it is not in
    the file.  Sets in which most elements lack their core (fragments that only add functions,
    valence sets whose potentials live elsewhere, fitting sets) are not held to it.

    Formula: count of contracted functions of l < occupied core subshells of l, less those that the
    block's core potential replaces.

    Source: ground-state configurations of the elements (NIST Atomic Spectra Database); every
    all-electron family that was counted keeps the rule.

    Remedy: restore the lost shells, or add the core potential.

    Bad::

        Na 0
        S 1 1.00
          90.0 1.0
        P 1 1.00
          0.5 1.0
        ****
        H 0
        S 1 1.00
          0.5 1.0
        ****
        He 0
        S 1 1.00
          0.9 1.0
        ****

    Good::

        Na 0
        S 1 1.00
          90.0 1.0
        S 1 1.00
          5.0 1.0
        S 1 1.00
          0.05 1.0
        P 1 1.00
          3.0 1.0
        ****
    """
    for blocks in _judged(case):
        yield from gathered(
            [
                _missing(case, block, l, short, "core")
                for block in blocks
                for l, short in lacking(block).items()
                if _lacks_core(block, l)
            ]
        )


@rule("shell.valence")
def valence_shells(case: Case) -> Iterator[Finding]:
    """Fewer functions of some l than the atom has occupied shells.

    The core is there but a valence shell is not: a shell was lost when the file was edited or
    converted.

    Formula: count of contracted functions of l < occupied subshells of l, less those that the
    block's core potential replaces.

    Source: ground-state configurations of the elements (NIST Atomic Spectra Database); every
    all-electron family that was counted keeps the rule.

    Remedy: restore the lost shell.

    Bad::

        C 0
        S 1 1.00
          40.0 1.0
        S 1 1.00
          0.5 1.0
        ****

    Good::

        C 0
        S 1 1.00
          40.0 1.0
        S 1 1.00
          0.5 1.0
        P 1 1.00
          0.5 1.0
        ****
    """
    for blocks in _judged(case):
        yield from gathered(
            [
                _missing(case, block, l, short, "valence")
                for block in blocks
                for l, short in lacking(block).items()
                if not _lacks_core(block, l)
            ]
        )


@rule("shell.ladder")
def ladder(case: Case) -> Iterator[Finding]:
    """An angular momentum is missing below one that is present.

    Sets add polarization functions in order; a d function without any p below it means that the
    p functions were lost.

    Source: common practice, no source.

    Remedy: restore the lost shells.

    Bad::

        Be 0
        S 1 1.00
          20.0 1.0
        S 1 1.00
          0.5 1.0
        D 1 1.00
          0.4 1.0
        ****

    Good::

        Be 0
        S 1 1.00
          20.0 1.0
        S 1 1.00
          0.5 1.0
        P 1 1.00
          0.5 1.0
        D 1 1.00
          0.4 1.0
        ****
    """
    for blocks in _judged(case):
        yield from gathered(
            [
                case.at_line(
                    block.line,
                    "warning",
                    f"{block.symbol} has {letter_of(above)} functions but no {letter_of(l)} "
                    "function below them",
                    element=block.symbol,
                    shell=letter_of(l),
                    measured=0,
                    limit=1,
                    remedy=f"restore the {letter_of(l)} functions",
                )
                for block in blocks
                for l, above in _gaps(block)
            ]
        )


def _gaps(block: Block) -> Iterator[tuple[int, int]]:
    """l that are missing though a higher one is present, with the next one that is present.

    What the occupied shells already demand is left to the rules that say so.
    """
    counts, told = block.counts, lacking(block)
    for l in range(max(counts, default=0)):
        if not counts.get(l, 0) and l not in told and needed(block) is not None:
            yield l, min(k for k in counts if k > l)


@rule("shell.fragment")
def fragment(case: Case) -> Iterator[Finding]:
    """Most elements of the set lack occupied shells: a fragment.

    Files that only add polarization or diffuse functions, and fitting sets, look like this.  Used
    alone as an orbital set such a file gives nonsense, so it is said once; missing shells are then
    not reported element by element.  Valence sets without their core potentials are another matter
    (`potential.missing`).

    Source: common practice, no source.

    Remedy: use it together with the set that it belongs to.

    Bad::

        C 0
        D 1 1.00
          0.8 1.0
        ****
        N 0
        D 1 1.00
          0.8 1.0
        ****

    Good::

        H 0
        S 1 1.00
          0.5 1.0
        ****
    """
    for members in case.sets:
        if members.role == "fitting" or is_orbital(members):
            continue
        blocks = [block for block in members.blocks if block.complete and block.shells]
        short = [block for block in blocks if lacking(block)]
        if not short or is_valence_set(members):
            continue
        yield case.at_line(
            short[0].line,
            "note",
            f"{len(short)} of {len(blocks)} elements lack occupied shells: it adds functions to "
            "another set, or is no orbital set",
            element=short[0].symbol,
            measured=len(short),
            limit=len(blocks),
            remedy="use it together with what it belongs to, not alone",
        )
