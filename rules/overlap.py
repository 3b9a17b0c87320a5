"""Overlap: will the set go linearly dependent?"""

from collections.abc import Iterator

import numpy as np

from overlapse.grammar.model import Severity, letter_of
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.physics.onecentre import contracted_overlap, eigenvalues
from overlapse.rules.primitive import closest_pair, ladder
from overlapse.rules.registry import rule


@rule("overlap.centre")
def centre(
    case: Case, *, fails: float = 2e-9, strained: float = 1e-7, tight: float = 1e-6
) -> Iterator[Finding]:
    """The contracted functions of one centre are nearly linearly dependent.

    The overlap matrix of a molecule contains that of each atom as a block, so its smallest
    eigenvalue cannot be larger than the smallest of any atom's: what is seen on one centre is a
    rigorous upper bound for every molecule.  Below about 1e-8 a self-consistent field is decided
    by rounding and may run away; programs that remove vanishing combinations drop functions there.
    A set that passes may still fail in a molecule.

    Formula: S_ij over normalised contracted functions of one l; smallest eigenvalue; interlacing
    of eigenvalues of principal submatrices (Cauchy).

    Source: R. A. Horn, C. R. Johnson, Matrix Analysis, Cambridge University Press 1985, section
    4.3; canonical orthogonalisation: P.-O. Lowdin, Adv. Quantum Chem. 5, 185 (1970).

    Limits: fails: error below it, a field is predicted to fail.  strained: warning below it,
    programs will drop functions.  tight: note below it.

    Remedy: drop one of the closest pair named, or restore the exponent that was meant.

    Bad::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        S 2 1.00
          4.0 0.6
          0.5 0.5005
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
        for l in block.counts:
            functions = [
                (index, f)
                for index, f in block.functions_of(l)
                if len(f.exponents) and (f.exponents > 0.0).all()
            ]
            if len(functions) < 2:
                continue
            overlap = contracted_overlap([f for _, f in functions])
            if not np.isfinite(overlap).all():
                continue
            # A function that is given twice has a rule of its own.
            once = [k for k in range(len(functions)) if not (overlap[k, :k] > 1.0 - 1e-10).any()]
            functions, overlap = [functions[k] for k in once], overlap[np.ix_(once, once)]
            if len(functions) < 2:
                continue
            values = eigenvalues(overlap)
            if values[0] >= tight:
                continue
            gap, first, second = closest_pair(overlap)
            index, function = functions[second]
            severity = _severity(values[0], fails, strained)
            yield case.at_shell(
                block,
                index,
                severity,
                f"the {len(functions)} contracted {letter_of(l)} functions on one centre are "
                f"nearly linearly dependent: smallest eigenvalue {values[0]:.1e}, "
                f"{ladder(values)}; closest to each other are {block.names[index]} here and "
                f"{block.names[functions[first][0]]} "
                f"(line {block.shells[functions[first][0]].line}), overlap {1.0 - gap:.7f}; "
                "no molecule can do better",
                function=function,
                measured=float(values[0]),
                limit=next(t for t in (fails, strained, tight) if values[0] < t),
                remedy="drop one of the two, or restore the numbers that were meant",
            )


def _severity(smallest: float, fails: float, strained: float) -> Severity:
    if smallest < fails:
        return "error"
    return "warning" if smallest < strained else "note"
