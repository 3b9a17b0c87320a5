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
    order, pivots, _ = _with_pivots(matrix if overwrite else matrix.copy())
    return order, pivots


def _with_pivots(work: Matrix) -> tuple[Part, Floats, Matrix]:
    """As `pivoted`, and the factor, made in place of ``work`` as that of `factored` is."""
    (pstrf,) = get_lapack_funcs(("pstrf",), (work,))
    tolerance = 4.0 * len(work) * np.finfo(float).eps
    factor, piv, rank, _ = pstrf(work.T, tol=tolerance, lower=False, overwrite_a=True)
    pivots = np.abs(np.diagonal(factor)[:rank]) ** 2
    return np.asarray(piv, dtype=np.intp) - 1, np.asarray(pivots, dtype=float), factor


def counts_below(matrix: Matrix, steps: Sequence[float]) -> dict[float, int] | None:
    """Number of eigenvalues below each of the steps; None where inertia does not tell it.

    That happens only where no well-conditioned part exceeds the largest step.
    """
    if not len(steps):
        return {}
    first, *others = sorted(steps, reverse=True)
    # Eigenvalues of what is kept are smaller than its pivots, mostly ten times, seldom more.
    for margin in (30.0, 300.0):
        order, pivots, factor = _with_pivots(matrix.copy())
        rank = int(np.searchsorted(-pivots, -margin * first))
        kept, rest = order[:rank], order[rank:]
        low = [step for step in others if step <= 0.1 * first]
        # The factor tells S_KR, S_KK and its own solutions: all that smaller steps need.
        grams = _grams(factor[:, :rank], factor[:rank, rank:].copy("F"), 4) if low else []
        del factor  # it is as large as the matrix
        found = _count(matrix, first, kept, rest)
        if found is not None:
            break
    else:
        return None
    counts = {first: found, **_by_powers(matrix, low, first, rest, grams)}
    for step in others:
        if step not in counts:
            again = _count(matrix, step, kept, rest)
            if again is None:
                return None
            counts[step] = again
    return counts


def _count(matrix: Matrix, step: float, kept: Part, rest: Part) -> int | None:
    """Number of eigenvalues below a step; None where S_KK less the step has no factor."""
    remainder = shifted(matrix, step, rest)
    if len(kept):
        factor = factored(shifted(matrix, step, kept))
        if factor is None:
            return None
        # conj(S_KR), because the factor is that of the conjugate.
        right = np.asfortranarray(matrix[np.ix_(kept, rest)].conj())
        remainder -= _grams(factor, _solved(factor, right, 2), 1)[0]
    return _negative(remainder)


def _by_powers(
    matrix: Matrix, steps: Sequence[float], larger: float, rest: Part, grams: Sequence[Matrix]
) -> dict[float, int]:
    """Counts for steps well below one at which the kept part is definite, from one factor for all.

    C(t) = S_RR - t - G_1 - t G_2 - t**2 G_3 - ..., G_q = S_RK S_KK**-q S_KR.  The terms from t**3
    on add up to at least t**3 G_4 and at most 1 / (1 - t / larger) times that.  A step at which
    the bounds differ by a function is left out.
    """
    counts = {}
    for t in steps:
        remainder = shifted(matrix, t, rest) - grams[0]
        remainder -= t * grams[1] + t**2 * grams[2] + t**3 * grams[3]
        values = eigvalsh(remainder)
        least = int((values < 0.0).sum())
        more = (1.0 / (1.0 - t / larger) - 1.0) * t**3
        # The rest moves no eigenvalue by more than its norm, so by no more than its trace.
        most = int((values < more * float(np.trace(grams[3]).real)).sum())
        if least == most or least == _negative(remainder - more * grams[3]):
            counts[t] = least
    return counts


def _negative(matrix: Matrix) -> int:
    return int((eigvalsh(matrix, overwrite_a=True) < 0.0).sum()) if len(matrix) else 0


def _solved(factor: Matrix, right: Matrix, trans: int) -> Matrix:
    """U**-1 right, or with ``trans`` 2 U**-H right, in place; of U only the first rows count."""
    if not factor.shape[1]:
        return right
    (trtrs,) = get_lapack_funcs(("trtrs",), (factor,))
    found: Matrix = trtrs(factor, right, lower=False, trans=trans, overwrite_b=True)[0]
    return found


def _grams(factor: Matrix, right: Matrix, count: int) -> list[Matrix]:
    """S_RK S_KK**-q S_KR for q = 1 ... count, from the factor U of conj(S_KK), shape (any, k), and
    ``right`` = U**-H conj(S_KR), column-major, shape (k, r), which is lost."""
    grams = [right.T @ right.conj()]
    for power in range(1, count):
        right = _solved(factor, right, 0 if power % 2 else 2)
        grams.append(right.T @ right.conj())
    return grams
