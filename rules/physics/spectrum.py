"""Condition of an overlap matrix, by the cheapest algorithm that is sufficient.

Small matrices: all eigenvalues.  Large ones: the largest by Lanczos, the smallest by Lanczos on the
inverse, applied through one Cholesky factor; functions below each step of the ladder are counted by
inertia, and only where the smallest eigenvalue says that there are any.

Formula (inertia): with S split into a well-conditioned part K, chosen by pivoted Cholesky, and the
rest R, the number of eigenvalues of S below t is that of the negative eigenvalues of

    S_RR - t - S_RK (S_KK - t)**-1 S_KR,

provided that S_KK - t has a Cholesky factor, so no negative eigenvalue: the law of inertia
(J. J. Sylvester 1852), additive over a split (E. V. Haynsworth, Linear Algebra Appl. 1, 73, 1968).

Formula (bound): the smallest eigenvalue of any principal submatrix is an upper bound of that of the
matrix (interlacing; R. A. Horn, C. R. Johnson, Matrix Analysis, chapter 4).  The submatrix of the
diffuse functions comes close to it and is small.

All functions take real symmetric and complex Hermitian matrices, shape (n, n).
"""

from collections.abc import Callable, Sequence
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.linalg import eigh, eigvalsh, get_lapack_funcs
from scipy.sparse.linalg import ArpackError, LinearOperator, eigsh

from overlapse.grammar.model import Floats

LADDER = (1e-4, 1e-5, 1e-6, 1e-7, 1e-8)
SMALL = 700  # up to this size all eigenvalues are the cheapest way
DIFFUSE = (0.3, 0.6)  # bohr**-2: functions below are tried first

Matrix = npt.NDArray[Any]


class Spectrum(NamedTuple):
    """What the eigenvalues of an overlap matrix say.

    condition: largest over smallest, infinite where the smallest is not positive.  below: for each
    step of the ladder the number of eigenvalues under it, exact.  method: how it was found.
    """

    smallest: float
    largest: float
    condition: float
    below: dict[float, int]
    functions: int
    method: str


class Verdict(NamedTuple):
    """Whether all eigenvalues exceed a limit, and how that was found."""

    exceeds: bool
    method: str


def spectrum(matrix: Matrix, ladder: Sequence[float] = LADDER) -> Spectrum:
    """Smallest and largest eigenvalue, condition number, and counts below each step."""
    n = len(matrix)
    if n <= SMALL:
        return _from_all(eigvalsh(matrix), ladder)
    low, high = smallest(matrix), largest(matrix)
    needed = [step for step in ladder if step > low]
    counts = counts_below(matrix, needed) if needed else {}
    if counts is None:
        return _from_all(eigvalsh(matrix), ladder)
    below = {step: counts.get(step, 0) for step in ladder}
    method = "Cholesky factor, Lanczos on matrix and inverse"
    if needed:
        method += "; counts by inertia"
    return Spectrum(low, high, _condition(low, high), below, n, method)


def _from_all(values: Floats, ladder: Sequence[float]) -> Spectrum:
    below = {step: int(np.searchsorted(values, step)) for step in ladder}
    low, high = (float(values[0]), float(values[-1])) if len(values) else (1.0, 1.0)
    return Spectrum(low, high, _condition(low, high), below, len(values), "all eigenvalues")


def _condition(low: float, high: float) -> float:
    return high / low if low > 0.0 else float("inf")


def exceeds(matrix: Matrix, limit: float, exponents: Floats | None = None) -> Verdict:
    """Whether the smallest eigenvalue is above a limit.

    exponents: bohr**-2, shape (n,), one for each function (`placed.Functions.exponent`).  With
    them the diffuse functions are tried alone first: where they fail, so does the whole matrix.
    Otherwise one Cholesky factor of the matrix less the limit decides, diffuse functions first,
    because a factorization that fails then stops early.
    """
    if exponents is None:
        return Verdict(_definite(matrix, limit, None), "one Cholesky factor")
    order = np.argsort(exponents, kind="stable")
    tried = 0
    for cut in DIFFUSE:
        count = int(np.searchsorted(exponents[order], cut))
        if tried < count <= 0.8 * len(order):
            tried = count
            if not _definite(matrix, limit, order[:count]):
                return Verdict(False, f"bound from {count} functions of exponents below {cut:g}")
    return Verdict(_definite(matrix, limit, order), "one Cholesky factor, diffuse functions first")


def _definite(matrix: Matrix, limit: float, chosen: npt.NDArray[np.intp] | None) -> bool:
    part = matrix.copy() if chosen is None else matrix[np.ix_(chosen, chosen)]
    part.flat[:: len(part) + 1] -= limit
    return _factor(part) is not None


def _factor(work: Matrix) -> Matrix | None:
    """Lower Cholesky factor, column-major, made in place of ``work``; None where there is none."""
    (potrf,) = get_lapack_funcs(("potrf",), (work,))
    # The transpose of a row-major matrix is column-major, and here its conjugate.
    factor, info = potrf(work.T, lower=False, clean=False, overwrite_a=True)
    return factor if info == 0 else None


def largest(matrix: Matrix) -> float:
    """The largest eigenvalue; by Lanczos where the matrix is large."""
    if len(matrix) > SMALL:
        try:
            found = eigsh(
                matrix, 1, which="LA", v0=_start(matrix), tol=1e-6, return_eigenvectors=False
            )
            return float(found[0])
        except ArpackError:
            pass
    return float(eigvalsh(matrix)[-1]) if len(matrix) else 1.0


def smallest(matrix: Matrix) -> float:
    """The smallest eigenvalue; by Lanczos on the inverse where the matrix is large.

    Where the matrix itself has no Cholesky factor (an eigenvalue at the limit of rounding, or a
    negative one) it is shifted up until it has; the shift costs no more digits than were there.
    """
    if len(matrix) > SMALL:
        found = _inverse_lanczos(matrix, 1)
        if found is not None:
            return float(found[0][0])
    return float(eigvalsh(matrix)[0]) if len(matrix) else 1.0


def _inverse_lanczos(matrix: Matrix, count: int) -> tuple[Floats, Matrix] | None:
    n, shift = len(matrix), 0.0
    for shift in (0.0, 1e-11, 1e-8, 1e-4):
        work = matrix.copy()
        work.flat[:: n + 1] += shift
        factor = _factor(work)
        if factor is not None:
            break
    else:
        return None
    inverse = LinearOperator((n, n), matvec=_solver(factor), dtype=matrix.dtype)
    try:
        values, vectors = eigsh(
            inverse, count, which="LM", v0=_start(matrix), tol=1e-7, ncv=max(20, 2 * count + 1)
        )
    except ArpackError:
        return None
    order = np.argsort(-values)
    return 1.0 / values[order] - shift, vectors[:, order]


def _solver(factor: Matrix) -> Callable[[Matrix], Matrix]:
    (potrs,) = get_lapack_funcs(("potrs",), (factor,))
    conjugate = np.iscomplexobj(factor)  # the factor is that of the conjugate

    def solve(vector: Matrix) -> Matrix:
        right = vector.conj() if conjugate else vector
        found = potrs(factor, right, lower=False)[0]
        return np.asarray(found.conj() if conjugate else found)

    return solve


def _start(matrix: Matrix) -> Matrix:
    """A start without any symmetry that an eigenvector could be orthogonal to; always the same."""
    return np.random.default_rng(len(matrix)).normal(size=len(matrix)).astype(matrix.dtype)


def counts_below(matrix: Matrix, steps: Sequence[float]) -> dict[float, int] | None:
    """Number of eigenvalues below each of the steps, by inertia; None where that fails.

    It fails only where no well-conditioned part of useful size exceeds a step.
    """
    if not len(steps):
        return {}
    order, pivots = pivoted(matrix)
    counts: dict[float, int] = {}
    for step in steps:
        # Eigenvalues of what is kept are smaller than its pivots, mostly ten times, seldom more.
        for margin in (30.0, 300.0):
            rank = int(np.searchsorted(-pivots, -margin * step))
            found = _negative(matrix, step, order[:rank], order[rank:])
            if found is not None:
                counts[step] = found
                break
        else:
            return None
    return counts


def _negative(
    matrix: Matrix, step: float, kept: npt.NDArray[np.intp], rest: npt.NDArray[np.intp]
) -> int | None:
    remainder = matrix[np.ix_(rest, rest)]
    remainder.flat[:: len(rest) + 1] -= step
    if len(kept):
        work = matrix[np.ix_(kept, kept)]
        work.flat[:: len(kept) + 1] -= step
        factor = _factor(work)
        if factor is None:
            return None
        (trtrs,) = get_lapack_funcs(("trtrs",), (factor,))
        # The factor is conj(U): U**H U = S, and the columns wanted are U**-H S_KR.
        across = np.asfortranarray(matrix[np.ix_(kept, rest)].conj())
        across = trtrs(factor, across, lower=False, trans=2, overwrite_b=True)[0]
        remainder -= across.T @ across.conj()
    return int((eigvalsh(remainder, overwrite_a=True) < 0.0).sum()) if len(rest) else 0


def pivoted(matrix: Matrix) -> tuple[npt.NDArray[np.intp], Floats]:
    """Pivoted Cholesky: the order of the functions and their pivots, falling, shape (rank,).

    A pivot is the squared norm of what a function adds to those before it.  The rank ends where
    nothing is left above rounding; functions after it follow in no special order.
    """
    (pstrf,) = get_lapack_funcs(("pstrf",), (matrix,))
    tolerance = 4.0 * len(matrix) * np.finfo(float).eps
    factor, piv, rank, _ = pstrf(matrix.copy().T, tol=tolerance, lower=False, overwrite_a=True)
    pivots = np.abs(np.diagonal(factor)[:rank]) ** 2
    return np.asarray(piv, dtype=np.intp) - 1, np.asarray(pivots, dtype=float)


def lowest(matrix: Matrix, below: float) -> tuple[Floats, Matrix]:
    """All eigenvalues below a limit, rising, shape (k,), and their vectors, shape (n, k)."""
    n = len(matrix)
    if n > SMALL:
        counts = counts_below(matrix, [below])
        if counts is not None and counts[below] == 0:
            return np.zeros(0), np.zeros((n, 0), dtype=matrix.dtype)
        if counts is not None and counts[below] <= n // 60:
            found = _inverse_lanczos(matrix, counts[below])
            if found is not None and found[0][-1] < below:
                return found
    values, vectors = eigh(matrix, subset_by_value=(-np.inf, below))
    return np.asarray(values, dtype=float), vectors
