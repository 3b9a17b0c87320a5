"""Cholesky factors of overlap matrices, and counts of eigenvalues by inertia.

With S split into a well-conditioned part K, chosen by pivoted Cholesky, and the rest R, the number
of eigenvalues of S below t is that of the negative eigenvalues of the remainder

    C(t) = S_RR - t - S_RK (S_KK - t)**-1 S_KR,

provided that S_KK - t has a Cholesky factor, so no negative eigenvalue: the law of inertia (J. J.
Sylvester 1852), additive over a split (E. V. Haynsworth, Linear Algebra Appl. 1, 73, 1968).

All functions take real symmetric and complex Hermitian matrices, shape (n, n).
"""

from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.linalg import eigvalsh, get_lapack_funcs

from overlapse.grammar.model import Floats

Matrix = npt.NDArray[Any]
Part = npt.NDArray[np.intp]


def factored(work: Matrix) -> Matrix | None:
    """The upper Cholesky factor U of the conjugate, U**H U, column-major; None where there is none.

    Made in place of ``work``, which must be row-major: its transpose is then column-major, as
    LAPACK wants it, and its conjugate.
    """
    (potrf,) = get_lapack_funcs(("potrf",), (work,))
    factor, info = potrf(work.T, lower=False, clean=False, overwrite_a=True)
    return factor if info == 0 else None


def shifted(matrix: Matrix, shift: float, part: Part | None = None) -> Matrix:
    """A copy of a matrix, or of the part of it with the given indices, less ``shift``."""
    work = matrix.copy() if part is None else matrix[np.ix_(part, part)]
    work.flat[:: len(work) + 1] -= shift
    return work


def pivoted(matrix: Matrix, *, overwrite: bool = False) -> tuple[Part, Floats]:
    """Pivoted Cholesky: the order of the functions and their pivots, falling, shape (rank,).

    A pivot is the squared norm of what a function adds to those before it.  The rank ends where
    nothing is left above rounding; functions after it follow in no special order.  overwrite: the
    matrix is no longer needed.
    """
    (pstrf,) = get_lapack_funcs(("pstrf",), (matrix,))
    tolerance = 4.0 * len(matrix) * np.finfo(float).eps
    work = matrix if overwrite else matrix.copy()
    factor, piv, rank, _ = pstrf(work.T, tol=tolerance, lower=False, overwrite_a=True)
    pivots = np.abs(np.diagonal(factor)[:rank]) ** 2
    return np.asarray(piv, dtype=np.intp) - 1, np.asarray(pivots, dtype=float)


def counts_below(matrix: Matrix, steps: Sequence[float]) -> dict[float, int] | None:
    """Number of eigenvalues below each of the steps; None where inertia does not tell it.

    That happens only where no well-conditioned part exceeds the largest step.
    """
    if not len(steps):
        return {}
    order, pivots = pivoted(matrix)
    first, *others = sorted(steps, reverse=True)
    # Eigenvalues of what is kept are smaller than its pivots, mostly ten times, seldom more.
    for margin in (30.0, 300.0):
        rank = int(np.searchsorted(-pivots, -margin * first))
        kept, rest = order[:rank], order[rank:]
        found = _count(matrix, first, kept, rest)
        if found is not None:
            break
    else:
        return None
    counts = {first: found, **_by_powers(matrix, others, first, kept, rest)}
    for step in others:
        if step not in counts:
            again = _count(matrix, step, kept, rest)
            if again is None:
                return None
            counts[step] = again
    return counts


def _count(matrix: Matrix, step: float, kept: Part, rest: Part) -> int | None:
    grams = _grams(matrix, step, kept, rest, 1)
    return None if grams is None else _negative(shifted(matrix, step, rest) - grams[0])


def _by_powers(
    matrix: Matrix, steps: Sequence[float], larger: float, kept: Part, rest: Part
) -> dict[float, int]:
    """Counts for steps well below one at which the kept part is definite, from one factor for all.

    C(t) = S_RR - t - G_1 - t G_2 - t**2 G_3 - ..., G_q = S_RK S_KK**-q S_KR.  The terms from t**3
    on add up to at least t**3 G_4 and at most 1 / (1 - t / larger) times that.  A step at which
    the bounds differ by a function is left out.
    """
    steps = [step for step in steps if step <= 0.1 * larger]
    grams = _grams(matrix, 0.0, kept, rest, 4) if steps else None
    if grams is None:
        return {}
    whole = matrix[np.ix_(rest, rest)] - grams[0]
    counts = {}
    for t in steps:
        remainder = shifted(whole, t) - t * grams[1] - t**2 * grams[2] - t**3 * grams[3]
        least = _negative(remainder)
        more = 1.0 / (1.0 - t / larger) - 1.0
        if least == _negative(remainder - more * t**3 * grams[3]):
            counts[t] = least
    return counts


def _negative(matrix: Matrix) -> int:
    return int((eigvalsh(matrix, overwrite_a=True) < 0.0).sum()) if len(matrix) else 0


def _grams(matrix: Matrix, shift: float, kept: Part, rest: Part, count: int) -> list[Matrix] | None:
    """S_RK (S_KK - shift)**-q S_KR for q = 1 ... count; None where S_KK - shift has no factor."""
    if not len(kept):
        return [np.zeros((len(rest), len(rest)), dtype=matrix.dtype)] * count
    factor = factored(shifted(matrix, shift, kept))
    if factor is None:
        return None
    (trtrs,) = get_lapack_funcs(("trtrs",), (factor,))
    # conj(S_KR) to the left, because the factor is that of the conjugate.
    right = np.asfortranarray(matrix[np.ix_(kept, rest)].conj())
    grams = []
    for power in range(count):
        right = trtrs(factor, right, lower=False, trans=0 if power % 2 else 2, overwrite_b=True)[0]
        grams.append(right.T @ right.conj())
    return grams
