"""Bounds of the smallest overlap eigenvalue of atom pairs and of a compact cluster.

Of each atom only some functions are taken, its lone primitives of m = 0 about the bond.  Their
overlap matrix is a principal submatrix of that of all functions, so its smallest eigenvalue is an
upper bound of that of every molecule that holds such a pair (interlacing; R. A. Horn, C. R.
Johnson, Matrix Analysis, Cambridge University Press 1985, section 4.3).  All atoms of a file are
done at once, in tables of the width of the largest.
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.onecentre import overlap_of
from overlapse.rules.physics.placed import Ints
from overlapse.rules.physics.twocentre import axial_overlap

_NONE = -1  # the angular momentum of a place that holds no function


class Lone(NamedTuple):
    """Lone primitives of several atoms, both shapes (atoms, width): angular momenta, -1 where an
    atom has no more, and exponents, bohr**-2."""

    l: Ints
    exponents: Floats

    def of(self, atoms: Sequence[int]) -> "Lone":
        """Some of the atoms."""
        at = np.asarray(atoms, dtype=np.intp)
        return Lone(self.l[at], self.exponents[at])


def lone(functions: Sequence[Sequence[tuple[int, float]]]) -> Lone:
    """A table of functions (l, exponent), atom by atom."""
    shape = len(functions), max(map(len, functions), default=0)
    l, exponents = np.full(shape, _NONE, dtype=np.intp), np.ones(shape)
    for row, members in enumerate(functions):
        for column, (momentum, exponent) in enumerate(members):
            l[row, column], exponents[row, column] = momentum, exponent
    return Lone(l, exponents)


def one_centre(atoms: Lone) -> Floats:
    """Overlaps on one centre, shape (atoms, width, width); empty places are orthonormal."""
    left, right = atoms.exponents[:, :, None], atoms.exponents[:, None, :]
    l, k = atoms.l[:, :, None], atoms.l[:, None, :]
    found = np.where((l == k) & (l != _NONE), overlap_of(left, right, l), 0.0)
    width = np.arange(atoms.l.shape[1])
    found[:, width, width] = 1.0
    return found


def two_centre(left: Lone, right: Lone, distances: Floats) -> Floats:
    """Overlaps of pairs of atoms at distances in bohr, shapes (pairs, width, width) and (pairs,).

    All pairs of functions of the same l and l' are done in one go.
    """
    l, k = (part.ravel() for part in np.broadcast_arrays(left.l[:, :, None], right.l[:, None, :]))
    a, b, far = (
        part.ravel()
        for part in np.broadcast_arrays(
            left.exponents[:, :, None], right.exponents[:, None, :], distances[:, None, None]
        )
    )
    found = np.zeros(len(l))
    code = np.where((l == _NONE) | (k == _NONE), _NONE, l * 32 + k)
    # Not np.unique, whose first use imports a large part of numpy more.
    for one in sorted(set(code[code != _NONE].tolist())):
        at = np.flatnonzero(code == one)
        found[at] = axial_overlap(one // 32, a[at], one % 32, b[at], far[at])
    return found.reshape(len(distances), left.l.shape[1], right.l.shape[1])


def alike_bounds(atoms: Lone, distances: Floats) -> Floats:
    """Upper bounds of the smallest eigenvalue of each atom beside its like, shape (atoms,).

    The reflection that exchanges the two turns functions of odd l round, so even and odd
    combinations fall apart: A + B P and A - B P with P = (-1)**l.
    """
    if not atoms.l.size:
        return np.ones(len(atoms.l))
    own, across = one_centre(atoms), two_centre(atoms, atoms, distances)
    across *= np.where(atoms.l % 2, -1.0, 1.0)[:, None, :]
    both = np.stack([own + across, own - across])
    found: Floats = np.linalg.eigvalsh(both)[:, :, 0].min(axis=0)
    return found


def mixed_bounds(left: Lone, right: Lone, distances: Floats) -> Floats:
    """Upper bounds of the smallest eigenvalue of pairs of unlike atoms, shape (pairs,)."""
    if not left.l.size:
        return np.ones(len(left.l))
    width = left.l.shape[1]
    matrices = np.empty((len(left.l), 2 * width, 2 * width))
    matrices[:, :width, :width] = one_centre(left)
    matrices[:, width:, width:] = one_centre(right)
    across = two_centre(left, right, distances)
    matrices[:, :width, width:] = across
    matrices[:, width:, :width] = across.transpose(0, 2, 1)
    found: Floats = np.asarray(np.linalg.eigvalsh(matrices)[:, 0], dtype=np.float64)
    return found


def cube_bounds(atoms: Lone, edges: Floats) -> Floats:
    """Upper bounds of the smallest eigenvalue of eight like atoms on a cube, shape (atoms,).

    Of their s functions the combination that changes sign along every edge is taken: with B(d) the
    overlaps at distance d, the eigenvalues of A - 3 B(a) + 3 B(sqrt2 a) - B(sqrt3 a) are among
    those of the s functions of the cube.  edges: bohr.
    """
    s = Lone(np.where(atoms.l == 0, 0, _NONE), atoms.exponents)
    if not (s.l == 0).any():
        return np.ones(len(s.l))
    matrices = one_centre(s)
    for weight, stretch in ((-3.0, 1.0), (3.0, 2.0**0.5), (-1.0, 3.0**0.5)):
        matrices = matrices + weight * two_centre(s, s, stretch * edges)
    found: Floats = np.asarray(np.linalg.eigvalsh(matrices)[:, 0], dtype=np.float64)
    return found
