"""Contractions: is every primitive used, is none there twice?"""

from collections.abc import Iterator

import numpy as np

from overlapse.grammar.model import Block, Function, letter_of
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.physics.onecentre import contracted_overlap
from overlapse.rules.registry import rule
from overlapse.rules.repair import without_row


@rule("contraction.idle")
def idle(case: Case) -> Iterator[Finding]:
    """A column of coefficients is zero throughout, or a primitive is used by no column.

    A contraction of nothing is no function and makes the overlap matrix singular; a primitive
    without any coefficient costs time and does nothing, and often marks a number that was lost.

    Formula: all c_ij = 0 for one j, or for one i.

    Source: common practice, no source.

    Remedy: restore the lost coefficient, or take the column or the primitive out.

    Bad::

        C 0
        S 2 1.00
          4.0 1.0
          0.5 0.0
        ****

    Good::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        ****
    """
    for block in case.document.blocks:
        for index, shell in enumerate(block.shells):
            zero = shell.coefficients == 0.0
            for column in np.flatnonzero(zero.all(axis=0)):
                letter = letter_of(shell.angular[int(column) // shell.columns_per_l])
                yield case.at_shell(
                    block,
                    index,
                    "error",
                    f"all coefficients of column {column + 1} ({letter}) are zero: "
                    "this is no function",
                    row=0,
                    column=int(column),
                    measured=0.0,
                    remedy="restore the coefficients, or take the column out",
                )
            if zero.all(axis=0).any():
                continue
            for row in np.flatnonzero(zero.all(axis=1)):
                yield case.at_shell(
                    block,
                    index,
                    "warning",
                    f"the primitive of exponent {shell.spelling(int(row))} has no coefficient "
                    "other than zero",
                    row=int(row),
                    measured=0.0,
                    edits=without_row(shell, int(row)),
                    remedy="restore its coefficient, or take the row out",
                )


@rule("contraction.repeat")
def repeat(case: Case, *, likeness: float = 1e-10) -> Iterator[Finding]:
    """Two contracted functions of one l are the same function.

    The overlap matrix is exactly singular: a program stops, drops one of them, or runs away.  The
    two may differ by a factor and still be the same.

    Formula: 1 - |<f|g>| / sqrt(<f|f><g|g>) below the limit.

    Source: common practice, no source.

    Limits: likeness: how close to one the overlap of the normalised functions must be.

    Remedy: take one of the two out; if one of them was meant to be another function, restore it.

    Bad::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        S 2 1.00
          4.0 0.6
          0.5 0.5
        ****

    Good::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        S 1 1.00
          0.5 1.0
        ****
    """
    for block in case.document.blocks:
        pairs = [pair for l in block.counts for pair in _equal_functions(block, l, likeness)]
        shells = {second[0]: first for first, second in pairs}
        for first, second in pairs:
            index, function = second
            if shells.pop(index, None) is None:
                continue
            yield case.at_shell(
                block,
                index,
                "error",
                f"{block.names[index]} repeats a function of {block.names[first[0]]} on line "
                f"{block.shells[first[0]].line}",
                function=function,
                measured=1.0,
                limit=1.0 - likeness,
                remedy="take one of the two out, or restore the function that was meant",
            )


def _equal_functions(
    block: Block, l: int, likeness: float
) -> Iterator[tuple[tuple[int, Function], tuple[int, Function]]]:
    functions = [
        (index, f)
        for index, f in block.functions_of(l)
        if len(f.exponents) > 1 and (f.exponents > 0.0).all()
    ]
    if len(functions) < 2:
        return
    overlap = np.abs(contracted_overlap([f for _, f in functions]))
    for first, second in zip(*np.nonzero(np.triu(overlap > 1.0 - likeness, 1)), strict=True):
        yield functions[first], functions[second]
