"""Condition of an overlap matrix, by the cheapest algorithm that is sufficient.

Small matrices: all eigenvalues, and of middling ones too where any are to be counted.  Large ones:
the largest by Lanczos, the smallest by Lanczos on the inverse, applied through one Cholesky factor;
functions below each step of the ladder are counted by inertia (`inertia`), and only where the
smallest eigenvalue says that there are any.

All functions take real symmetric and complex Hermitian matrices, shape (n, n).
"""

from collections.abc import Callable, Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.linalg import eigh, eigvalsh, get_lapack_funcs
from scipy.sparse.linalg import ArpackError, LinearOperator, eigsh

from overlapse.grammar.model import Floats
from overlapse.rules.physics.blocks import Blocked
from overlapse.rules.physics.inertia import Matrix, Part, counts_below, factored, shifted

LADDER = (1e-4, 1e-5, 1e-6, 1e-7, 1e-8)
SMALL = 700  # up to this size all eigenvalues are the cheapest way
MIDDLE = 1800  # up to this size they are where some have to be counted (tests/bench/overlap.py)
COPIES = 2.5  # of a dense matrix: what its spectrum takes at most, itself included


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


def spectrum(matrix: Matrix, ladder: Sequence[float] = LADDER) -> Spectrum:
    """Smallest and largest eigenvalue, condition number, and counts below each step."""
    n = len(matrix)
    # One Cholesky factor, which is cheap, says whether there is anything to count.
    if n <= SMALL or (n <= MIDDLE and ladder and not _definite(matrix, max(ladder))):
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


def spectrum_of_sparse(
    matrix: Blocked, exponents: Floats, *, memory: int, ladder: Sequence[float] = LADDER
) -> Spectrum:
    """As `spectrum`, of a matrix in blocks, within so many bytes.

    Where the dense matrix and its factor fit, they are made: sparse factors fill up and are slower.
    Else the most diffuse functions that fit are judged alone: then ``smallest`` is an upper bound,
    ``below`` and ``condition`` are lower bounds, and ``method`` says so.  exponents: bohr**-2,
    shape (n,), of `placed.Functions`.
    """
    n = matrix.shape[0]
    fits = int((memory / (COPIES * 8)) ** 0.5)
    if n <= fits:
        return spectrum(matrix.dense(), ladder)
    order = np.sort(np.argsort(exponents, kind="stable")[:fits])
    part = spectrum(matrix.dense(order), ladder)
    high = _largest(matrix)
    return Spectrum(
        part.smallest,
        high,
        _condition(part.smallest, high),
        part.below,
        n,
        f"bounds from the {fits} most diffuse of {n} functions, by {part.method}",
    )


def _from_all(values: Floats, ladder: Sequence[float]) -> Spectrum:
    below = {step: int(np.searchsorted(values, step)) for step in ladder}
    low, high = (float(values[0]), float(values[-1])) if len(values) else (1.0, 1.0)
    return Spectrum(low, high, _condition(low, high), below, len(values), "all eigenvalues")


def _condition(low: float, high: float) -> float:
    return high / low if low > 0.0 else float("inf")


def _definite(matrix: Matrix, limit: float) -> bool:
    """Whether all eigenvalues exceed a limit."""
    return factored(shifted(matrix, limit)) is not None


def largest(matrix: Matrix) -> float:
    """The largest eigenvalue; by Lanczos where the matrix is large."""
    if len(matrix) > SMALL:
        try:
            found = eigsh(
                matrix,
                1,
                which="LA",
                v0=_start(len(matrix), matrix.dtype),
                tol=1e-6,
                return_eigenvectors=False,
            )
            return float(found[0])
        except ArpackError:
            pass
    return float(eigvalsh(matrix)[-1]) if len(matrix) else 1.0


def _largest(matrix: Blocked) -> float:
    start = _start(matrix.shape[0], np.float64)
    product = LinearOperator(matrix.shape, matvec=matrix.__matmul__, dtype=np.float64)
    return float(eigsh(product, 1, which="LA", v0=start, tol=1e-6, return_eigenvectors=False)[0])


def smallest(matrix: Matrix, among: Part | None = None) -> float:
    """The smallest eigenvalue; by Lanczos on the inverse where the matrix is large.

    among: of the part with these rows and columns, of which one copy at a time is made.

    Where the matrix itself has no Cholesky factor (an eigenvalue at the limit of rounding, or a
    negative one) it is shifted up until it has; the shift costs no more digits than were there.
    """
    if len(matrix if among is None else among) > SMALL:
        found = _inverse_lanczos(matrix, 1, among)
        if found is not None:
            return float(found[0][0])
    part = matrix if among is None else matrix[np.ix_(among, among)]
    return float(eigvalsh(part)[0]) if len(part) else 1.0


def _inverse_lanczos(
    matrix: Matrix, count: int, among: Part | None = None
) -> tuple[Floats, Matrix] | None:
    n, shift = len(matrix if among is None else among), 0.0
    for shift in (0.0, 1e-11, 1e-8, 1e-4):
        factor = factored(shifted(matrix, -shift, among))
        if factor is not None:
            break
    else:
        return None
    inverse = LinearOperator((n, n), matvec=_solver(factor), dtype=matrix.dtype)
    try:
        values, vectors = eigsh(
            inverse,
            count,
            which="LM",
            v0=_start(n, matrix.dtype),
            tol=1e-7,
            ncv=max(20, 2 * count + 1),
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


def _start(n: int, dtype: npt.DTypeLike) -> Matrix:
    """A start without any symmetry that an eigenvector could be orthogonal to; always the same."""
    return np.random.default_rng(n).normal(size=n).astype(dtype)


def lowest(matrix: Matrix, below: float, count: int | None = None) -> tuple[Floats, Matrix]:
    """Eigenvalues below a limit, rising, shape (k,), and their vectors, shape (n, k).

    count: so many of them, the smallest, where it is known that there are that many; all if None.
    """
    n = len(matrix)
    if n > SMALL:
        if count is None:
            counts = counts_below(matrix, [below])
            count = None if counts is None else counts[below]
        if count == 0:
            return np.zeros(0), np.zeros((n, 0), dtype=matrix.dtype)
        if count is not None and count <= n // 30:
            found = _inverse_lanczos(matrix, count)
            if found is not None and found[0][-1] < below:
                return found
    some = (-np.inf, below) if count is None else None
    first = None if count is None else (0, count - 1)
    values, vectors = eigh(matrix, subset_by_value=some, subset_by_index=first)
    return np.asarray(values, dtype=float), vectors
