"""Overlap and kinetic-energy matrices of contracted Gaussian functions.

Every contracted function is normalised; every component of a Cartesian shell has norm one of its
own, so that all matrices of overlap have ones on the diagonal.
"""

from collections.abc import Callable, Iterator, Sequence

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.classes import GroupPair, Kind, Tail, kinds
from overlapse.rules.physics.harmonics import solid_harmonics
from overlapse.rules.physics.placed import Ints, Placed

LIMIT = 1e-15  # bound of what screening leaves out of a matrix element


class KindPair:
    """Two kinds of atoms and all that their pairs share."""

    def __init__(self, left: Kind, right: Kind, tail: Tail, kinetic: bool = False) -> None:
        self.left, self.right = left, right
        self.pairs = [
            [GroupPair(one, two, tail, kinetic) for two in right.groups] for one in left.groups
        ]
        self.top = left.top + right.top
        self.reach = max((p.reach[0] for row in self.pairs for p in row), default=0.0)

    def blocks(self, vectors: Floats) -> Floats:
        """Overlaps of all functions of atom pairs, shape (p, size, size').

        vectors: from the right to the left atom, shape (p, 3), bohr, sorted by length.
        """
        square = np.einsum("px,px->p", vectors, vectors)
        shortest = float(np.sqrt(square[0]))
        harmonics = solid_harmonics(vectors, self.top)
        found = np.zeros((len(vectors), self.left.size, self.right.size))
        down = 0
        for row, one in zip(self.pairs, self.left.groups, strict=True):
            height, across = len(one.place) * one.components, 0
            for pair, two in zip(row, self.right.groups, strict=True):
                width = len(two.place) * two.components
                count = int(np.searchsorted(square, pair.reach[0] ** 2))
                if count:
                    near = [part[:, :count] for part in harmonics[: pair.top + 1]]
                    block = pair.blocks(square[:count], near, shortest)
                    block = block.transpose(4, 0, 2, 1, 3).reshape(count, height, width)
                    found[:count, down : down + height, across : across + width] = block
                across += width
            down += height
        for axis, order in ((1, self.left.order), (2, self.right.order)):
            if order is not None:
                found = np.take(found, np.argsort(order), axis=axis)
        return found


def _matrix(
    atoms: Sequence[Placed], kinetic: bool, progress: Callable[[float], None] | None = None
) -> Floats:
    groups = kinds(atoms)
    positions = np.array([atom.position for atom in atoms], dtype=float).reshape(-1, 3)
    sizes = np.zeros(len(atoms), dtype=np.intp)
    for kind in groups:
        sizes[kind.members] = kind.size
    starts = np.concatenate([[0], np.cumsum(sizes)])
    matrix = np.zeros((starts[-1], starts[-1]))
    for one in range(len(groups)):
        for two in range(one, len(groups)):
            pair = KindPair(groups[one], groups[two], Tail(LIMIT), kinetic)
            for left, right, blocks in _all_blocks(pair, positions, one == two):
                for a, b, block in zip(left, right, blocks, strict=True):
                    rows = slice(starts[a], starts[a + 1])
                    columns = slice(starts[b], starts[b + 1])
                    matrix[rows, columns] = block
                    matrix[columns, rows] = block.T
    return matrix


def _all_blocks(
    pair: KindPair, positions: Floats, same: bool, chunk: int = 512
) -> Iterator[tuple[Ints, Ints, Floats]]:
    left = np.repeat(pair.left.members, len(pair.right.members))
    right = np.tile(pair.right.members, len(pair.left.members))
    if same:
        keep = left <= right
        left, right = left[keep], right[keep]
    vectors = positions[left] - positions[right]
    length = np.sqrt((vectors**2).sum(axis=1))
    order = np.argsort(length, kind="stable")
    order = order[: int(np.searchsorted(length[order], pair.reach))]
    for start in range(0, len(order), chunk):
        part = order[start : start + chunk]
        yield left[part], right[part], pair.blocks(vectors[part])


def overlap(atoms: Sequence[Placed], *, progress: Callable[[float], None] | None = None) -> Floats:
    """Overlap matrix, shape (n, n), in the order of `placed.lay_out`.

    Raises `NotNormalisable` for a function of no finite positive self-overlap.
    """
    return _matrix(atoms, False, progress)


def kinetic(atoms: Sequence[Placed]) -> Floats:
    """Kinetic-energy matrix in hartree, shape (n, n), in the order of `placed.lay_out`."""
    return _matrix(atoms, True)
