"""Primitives: is every exponent possible, in its place, and not too close to another?"""

from collections.abc import Iterator

import numpy as np

from overlapse.grammar.model import Block, Floats, Function, letter_of
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.physics.onecentre import contracted_overlap, eigenvalues
from overlapse.rules.registry import rule


@rule("primitive.positive")
def positive(case: Case) -> Iterator[Finding]:
    """An exponent is zero or negative.

    Such a function does not fall off and cannot be normalised; every integral over it is wrong.

    Formula: the norm of r**l exp(-a r**2) exists for a > 0 only.

    Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
    chapter 6.

    Remedy: a lost or added minus sign, or columns exchanged: compare with the source.

    Bad::

        C 0
        S 2 1.00
          4.0 0.6
          -0.5 0.5
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
            for row in np.flatnonzero(shell.exponents <= 0.0):
                value = float(shell.exponents[row])
                yield case.at_shell(
                    block,
                    index,
                    "error",
                    f"exponent {value:g} is not positive",
                    row=int(row),
                    measured=value,
                    limit=0.0,
                    expected=-value if value < 0 else None,
                    remedy="a sign was added or columns were exchanged: compare with the source",
                )


@rule("primitive.repeat")
def repeat(case: Case) -> Iterator[Finding]:
    """The same exponent stands twice in one shell, or two lone primitives of one l are equal.

    Within one contraction the two rows act as one with the sum of their coefficients, so one is a
    copy that should have been another number, or the contraction was pasted twice.  Two lone
    primitives with one exponent are the same function twice, and the overlap matrix is singular.
    Exponents that return in another contraction are normal: that is how segmented layouts write
    general contractions.  So is an exponent that returns in another column of a general
    contraction, as long as no column uses both rows.

    Source: common practice, no source.

    Remedy: restore the number that belongs there, or take the copy out.

    Bad::

        C 0
        S 3 1.00
          4.0 0.6
          0.5 0.3
          0.5 0.3
        ****

    Good::

        C 0
        S 3 1.00
          4.0 0.6
          0.5 0.3
          0.1 0.3
        ****
    """
    for block in case.document.blocks:
        told: set[tuple[int, int]] = set()
        for index, function in block.contracted:
            for first, second in _equal_rows(function):
                if (index, second) in told:
                    continue
                told.add((index, second))
                shell = block.shells[index]
                before = shell.place(first).line
                yield case.at_shell(
                    block,
                    index,
                    "error",
                    f"exponent {shell.spelling(second)} stands twice in one contraction "
                    f"(first on line {before})",
                    function=function,
                    row=second,
                    measured=float(shell.exponents[second]),
                    remedy="restore the exponent that belongs in this row, or take the row out",
                )
        yield from _equal_lone(case, block)


def _equal_rows(function: Function) -> Iterator[tuple[int, int]]:
    seen: dict[float, int] = {}
    for exponent, row in zip(function.exponents.tolist(), function.rows.tolist(), strict=True):
        if exponent in seen:
            yield seen[exponent], row
        seen.setdefault(exponent, row)


def _lone(block: Block) -> dict[int, list[tuple[int, Function]]]:
    """Functions made of one primitive, by l, with the index of their shell."""
    found: dict[int, list[tuple[int, Function]]] = {}
    for index, function in block.contracted:
        if len(function.exponents) == 1 and function.exponents[0] > 0.0:
            found.setdefault(function.l, []).append((index, function))
    return found


def _equal_lone(case: Case, block: Block) -> Iterator[Finding]:
    told: set[int] = set()
    for l, functions in _lone(block).items():
        seen: dict[float, int] = {}
        for index, function in functions:
            exponent = float(function.exponents[0])
            first = seen.setdefault(exponent, index)
            row = int(function.rows[0])
            if first == index or index in told:
                continue
            told.add(index)
            yield case.at_shell(
                block,
                index,
                "error",
                f"this {letter_of(l)} function of exponent {exponent:g} is given twice: it is "
                f"{block.names[first]} on line {block.shells[first].line} again",
                function=function,
                row=row,
                measured=exponent,
                remedy="take one of the two out: together they make the overlap matrix singular",
            )


@rule("primitive.crowded")
def crowded(case: Case, *, eigenvalue: float = 1e-7, near_twin: float = 5e-4) -> Iterator[Finding]:
    """Lone primitives of one l on one centre are nearly linearly dependent.

    Two functions that nearly coincide leave a combination that nearly vanishes; its coefficient in
    the orbitals is then decided by rounding.  A limit on the ratio of neighbours is not enough: at
    a ratio of 1.4 each pair looks harmless, yet ten such s functions have an eigenvalue of 2e-8.
    So the one-centre overlap matrix of the functions made of one primitive is diagonalised for each
    l, and the closest pair is named.  Primitives inside contractions may lie close together
    without harm and are not counted.

    Formula: S_ij = (2 sqrt(a_i a_j) / (a_i + a_j)) ** (l + 3/2); smallest eigenvalue of S.

    Source: closed form as in T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure
    Theory, Wiley 2000; even-tempered progressions: R. D. Bardo, K. Ruedenberg, J. Chem. Phys. 60,
    918 (1974).

    Limits: eigenvalue: warning below it.  near_twin: warning where 1 - S of the closest pair is
    below it (exponents within 5 % for s functions); both leave all but a handful of published sets
    silent.

    Remedy: drop the function named, or space the exponents evenly on a logarithmic scale.

    Bad::

        C 0
        S 1 1.00
          4.0 1.0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.49 1.0
        ****

    Good::

        C 0
        S 1 1.00
          4.0 1.0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.1 1.0
        ****
    """
    for block in case.document.blocks:
        for l, functions in _lone(block).items():
            distinct = {float(f.exponents[0]): (index, f) for index, f in functions}
            if len(distinct) < 2:
                continue
            pairs = list(distinct.values())
            overlap = contracted_overlap([function for _, function in pairs])
            if not np.isfinite(overlap).all():
                continue
            values = eigenvalues(overlap)
            gap, first, second = closest_pair(overlap)
            if values[0] >= eigenvalue and gap >= near_twin:
                continue
            index, function = pairs[second]
            other, twin = pairs[first]
            yield case.at_shell(
                block,
                index,
                "warning",
                f"lone {letter_of(l)} primitives are nearly linearly dependent: smallest "
                f"eigenvalue of their overlap {values[0]:.1e}, {ladder(values)}; the closest pair "
                f"is {function.exponents[0]:g} here and {twin.exponents[0]:g} "
                f"({block.names[other]}, line {block.shells[other].line}), "
                f"which overlap by {1.0 - gap:.5f}",
                function=function,
                row=int(function.rows[0]),
                measured=float(values[0]) if values[0] < eigenvalue else gap,
                limit=eigenvalue if values[0] < eigenvalue else near_twin,
                remedy="drop one of the pair, or restore the exponent that was meant",
            )


STEPS = (1e-4, 1e-5, 1e-6, 1e-7, 1e-8)


def ladder(values: Floats) -> str:
    """How many eigenvalues lie below each step of the ladder, in words."""
    below = [(step, int((values < step).sum())) for step in STEPS]
    told = [f"{count} below {step:.0e}".replace("e-0", "e-") for step, count in below if count]
    return ", ".join(told) if told else "none below 1e-4"


def closest_pair(overlap: Floats) -> tuple[float, int, int]:
    """1 - |S| of the closest pair of functions, and the pair's indices."""
    distance = 1.0 - np.abs(overlap)
    distance[np.tril_indices(len(distance))] = np.inf
    first, second = np.unravel_index(int(np.nanargmin(distance)), distance.shape)
    return float(distance[first, second]), int(first), int(second)
