"""Overlap of Gaussian functions that share a centre.

For normalised primitives of one angular momentum l with exponents a and b

    <a|b> = (2 sqrt(a b) / (a + b)) ** (l + 3/2),

and different l, or different components of one l, do not overlap at all.  A contraction
f = sum_i c_i g_i has the self-overlap sum_ij c_i c_j <a_i|a_j>.

Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
chapters 6 and 8.
"""

from math import gamma

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Floats, Function


def norms(exponents: Floats, l: int) -> Floats:
    """Factors N that normalise the radial parts N r**l exp(-a r**2), shape of the exponents.

    N**2 = 2 (2a)**(l+3/2) / Gamma(l+3/2), a in bohr**-2.
    """
    root: Floats = np.sqrt(2.0 / gamma(l + 1.5)) * (2.0 * exponents) ** (0.5 * l + 0.75)
    return root


def overlap_of(left: Floats, right: Floats, l: int | npt.NDArray[np.intp]) -> Floats:
    """Overlap of normalised primitives of one l; shapes of the three must broadcast.

    Exponents (bohr**-2) must be positive; others give NaN.
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        root = np.sqrt(left / right)
        # Written with the ratio, so that neither product nor sum can overflow.
        overlap: Floats = (2.0 / (root + 1.0 / root)) ** (l + 1.5)
    return overlap


def primitive_overlap(left: Floats, right: Floats, l: int) -> Floats:
    """As `overlap_of`, of each on the left with each on the right, shape (left, right)."""
    return overlap_of(left[:, None], right[None, :], l)


def self_overlap(exponents: Floats, coefficients: Floats, l: int) -> float:
    """Self-overlap of one contraction over normalised primitives; dimensionless.

    Infinite or NaN where numbers are too large for it, never an error.
    """
    with np.errstate(over="ignore", invalid="ignore"):
        return float(coefficients @ primitive_overlap(exponents, exponents, l) @ coefficients)


def contracted_overlap(functions: list[Function]) -> Floats:
    """Overlap of contracted functions of one l on one centre, each normalised first.

    Shape (n, n), ones on the diagonal.  A function that cannot be normalised (its self-overlap is
    not positive and finite) gives NaN in its row and column.
    """
    l = functions[0].l
    exponents = np.concatenate([function.exponents for function in functions])
    owner = np.repeat(np.arange(len(functions)), [len(f.exponents) for f in functions])
    weights = np.zeros((len(functions), len(exponents)))
    weights[owner, np.arange(len(exponents))] = np.concatenate([f.coefficients for f in functions])
    with np.errstate(all="ignore"):
        # The length of a function does not matter here, but its square could leave the range.
        weights /= np.abs(weights).max(axis=1, keepdims=True)
        overlap = weights @ primitive_overlap(exponents, exponents, l) @ weights.T
        scale = 1.0 / np.sqrt(np.diagonal(overlap))
        result: Floats = overlap * scale[:, None] * scale[None, :]
    return result


def eigenvalues(overlap: Floats) -> Floats:
    """Eigenvalues of a symmetric matrix, rising, shape (n,)."""
    return np.asarray(np.linalg.eigvalsh(overlap), dtype=np.float64)
