"""Spaces of contracted functions on one centre: how far two of them are apart.

The functions of one l span a space.  Two texts may hold different numbers and yet the same space,
because a function may be added to another without changing what the set can describe.  Principal
angles compare spaces: all are zero where one space lies in the other.

Primitives of both spaces are embedded in coordinates in which their overlap is the ordinary scalar
product, x = F c with F^T F = S; there orthonormal bases Q give the cosines of the angles as the
singular values of Q1^T Q2, and the sines, which alone are accurate for small angles, as those of
Q2 - Q1 Q1^T Q2.

Source: A. Bjorck, G. H. Golub, Math. Comput. 27, 579 (1973); for the sines also A. V. Knyazev,
M. E. Argentati, SIAM J. Sci. Comput. 23, 2008 (2002).
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Floats, Function
from overlapse.rules.physics.onecentre import primitive_overlap

# Directions in which a normalised set reaches less far than this are taken as dependence.
_DEPENDENT = 1e-6


class Projection(NamedTuple):
    """Functions against the span of others.

    distances: sine of the angle between each function and the span, shape (n,).  weights: the
    combination of the others, each normalised, that comes nearest to each normalised function,
    shape (n, m).
    """

    distances: Floats
    weights: Floats


def principal_angles(left: Sequence[Function], right: Sequence[Function]) -> Floats:
    """Angles between the spans of two lists of contracted functions of one l, rising, in radian.

    Shape (k,), k the smaller of the two dimensions.  NaN throughout where a function cannot be
    normalised (an exponent that is not positive).
    """
    first, second = _embedded([left, right])
    if not (np.isfinite(first).all() and np.isfinite(second).all()):
        return np.full(min(len(left), len(right)), np.nan)
    one, other = _orthonormal(first), _orthonormal(second)
    if one.shape[1] < other.shape[1]:
        one, other = other, one
    overlap = one.T @ other
    cosines = np.clip(np.linalg.svd(overlap, compute_uv=False), 0.0, 1.0)
    sines = np.linalg.svd(other - one @ overlap, compute_uv=False)[::-1]
    sines = np.clip(sines[: len(cosines)], 0.0, 1.0)
    angles: Floats = np.where(sines < 0.7, np.arcsin(sines), np.arccos(cosines))
    return angles


def projection(functions: Sequence[Function], others: Sequence[Function]) -> Projection:
    """How far each function lies outside the span of others of the same l.

    Distances are 1 where there are no others, NaN where a function cannot be normalised.
    """
    if not others:
        return Projection(np.ones(len(functions)), np.zeros((len(functions), 0)))
    vectors, frame = _embedded([functions, others])
    shape = (len(functions), len(others))
    if not np.isfinite(frame).all():
        return Projection(np.full(shape[0], np.nan), np.full(shape, np.nan))
    with np.errstate(all="ignore"):
        left, sizes, right = np.linalg.svd(frame, full_matrices=False)
        kept = sizes > _DEPENDENT * sizes[0]
        inside = left[:, kept].T @ vectors
        rest = vectors - left[:, kept] @ inside
        weights = (right[kept].T / sizes[kept]) @ inside
    return Projection(np.linalg.norm(rest, axis=0), weights.T)


def normalised_overlaps(left: Sequence[Function], right: Sequence[Function]) -> Floats:
    """Overlap of each normalised function with each of the other list; NaN where there is none."""
    first, second = _embedded([left, right])
    with np.errstate(all="ignore"):
        overlaps: Floats = first.T @ second
    return overlaps


def difference(function: Function, other: Function) -> tuple[Function, float]:
    """What remains of a function when as much as possible of another is taken away.

    Both are normalised first.  Returns the remainder as a function and its size, the sine of the
    angle between the two (summed in primitives, so that no digits cancel).
    """
    exponents, table = _table([function, other])
    l = function.l
    with np.errstate(all="ignore"):
        overlap = primitive_overlap(exponents, exponents, l)
        table = table / np.sqrt(np.einsum("pi,pq,qi->i", table, overlap, table))
        rest = table[:, 0] - (table[:, 0] @ overlap @ table[:, 1]) * table[:, 1]
        size = float(np.sqrt(max(0.0, rest @ overlap @ rest)))
    used = np.flatnonzero(rest)
    return Function(l, exponents[used], rest[used], used, 0), size


def noise(functions: Sequence[Function]) -> float:
    """Size below which a distance is made of the rounding of this arithmetic alone.

    The embedding is good to the square root of the machine's precision for each unit of the
    largest coefficients of a normalised function.
    """
    largest = 1.0
    for function in functions:
        exponents, table = _table([function])
        with np.errstate(all="ignore"):
            overlap = primitive_overlap(exponents, exponents, function.l)
            size = np.linalg.norm(table) / np.sqrt(np.sum(table * (overlap @ table)))
        largest = max(largest, float(size)) if np.isfinite(size) else largest
    return 2e-8 * largest


def _table(functions: Sequence[Function]) -> tuple[Floats, Floats]:
    """Distinct exponents of all functions, and the coefficients over them, (nprim, nfunctions).

    Each function is scaled to a largest coefficient of one, so that no square can overflow.
    """
    exponents = np.unique(np.concatenate([function.exponents for function in functions]))
    table = np.zeros((len(exponents), len(functions)))
    for column, function in enumerate(functions):
        scaled = function.coefficients / (np.abs(function.coefficients).max() or 1.0)
        np.add.at(table[:, column], np.searchsorted(exponents, function.exponents), scaled)
    return exponents, table


def _embedded(lists: Sequence[Sequence[Function]]) -> list[Floats]:
    """Coordinates of normalised functions, one column each, of lists that share one embedding."""
    together = [function for functions in lists for function in functions]
    exponents, table = _table(together)
    overlap = primitive_overlap(exponents, exponents, together[0].l)
    if np.isfinite(overlap).all():
        values, vectors = np.linalg.eigh(overlap)
        coordinates = (np.sqrt(np.clip(values, 0.0, None))[:, None] * vectors.T) @ table
    else:
        coordinates = np.full(table.shape, np.nan)
    with np.errstate(all="ignore"):
        coordinates = coordinates / np.linalg.norm(coordinates, axis=0)
    cuts = np.cumsum([len(functions) for functions in lists])[:-1]
    return np.split(coordinates, cuts, axis=1)


def _orthonormal(vectors: Floats) -> Floats:
    """An orthonormal basis of the span of columns, without the directions they hardly reach."""
    left, sizes, _ = np.linalg.svd(vectors, full_matrices=False)
    basis: Floats = left[:, sizes > _DEPENDENT * sizes[0]]
    return basis
