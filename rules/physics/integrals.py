"""Overlap and kinetic-energy matrices of contracted Gaussian functions.

Every contracted function is normalised; every component of a Cartesian shell has norm one of its
own, so that all overlap matrices have ones on the diagonal.

Atoms are sorted into kinds that carry the same functions; the pairs of two kinds are taken in
order of their distance, many at a time, so that what screening leaves out of a batch is the end of
a list.  There is no loop over pairs of atoms or shells.
"""

from collections.abc import Callable, Iterator, Sequence
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.classes import Tail, group_pair
from overlapse.rules.physics.harmonics import solid_harmonics
from overlapse.rules.physics.kinds import Kind, kinds
from overlapse.rules.physics.placed import Ints, Placed

LIMIT = 1e-15  # bound of what screening leaves out of a matrix element
PANEL = 100_000  # pairs of atoms that are looked at together
BATCH = 500_000  # elements that are worked out together
WORKING = 32 * 2**20  # bytes that buffers take beside the matrix

Progress = Callable[[float], None]


class TooLarge(MemoryError):
    """A matrix would need more memory than allowed; ``needed`` and ``allowed`` are bytes."""

    def __init__(self, what: str, needed: int, allowed: int) -> None:
        super().__init__(
            f"{what} needs {needed / 2**30:.2f} GiB and {allowed / 2**30:.2f} GiB may be used"
        )
        self.needed, self.allowed = needed, allowed


class KindPair:
    """Two kinds of atoms and all that their pairs share."""

    def __init__(self, left: Kind, right: Kind, tail: Tail, kinetic: bool = False) -> None:
        self.left, self.right = left, right
        self.pairs = [
            [group_pair(one, two, tail, kinetic) for two in right.groups] for one in left.groups
        ]
        self.top = left.top + right.top
        self.size = left.size * right.size
        self.reach = max((float(p.reach[0]) for row in self.pairs for p in row), default=0.0)
        self.order: Ints | None = None
        if left.order is not None or right.order is not None:
            places = [
                np.arange(kind.size) if kind.order is None else np.argsort(kind.order)
                for kind in (left, right)
            ]
            self.order = (places[0][:, None] * right.size + places[1]).ravel()

    def blocks(self, vectors: Floats) -> Floats:
        """Overlaps of all functions of atom pairs, shape (size * size', p).

        vectors: from the right to the left atom, shape (p, 3), bohr, sorted by length.
        """
        square = np.einsum("px,px->p", vectors, vectors)
        shortest = float(np.sqrt(square[0]))
        harmonics = solid_harmonics(vectors, self.top)
        found = np.empty((self.left.size, self.right.size, len(vectors)))
        room = np.empty(max(self._largest() * len(vectors), 1))
        down = 0
        for row, one in zip(self.pairs, self.left.groups, strict=True):
            height, across = len(one.place) * one.components, 0
            for pair, two in zip(row, self.right.groups, strict=True):
                width = len(two.place) * two.components
                count = int(np.searchsorted(square, pair.reach[0] ** 2))
                target = found[down : down + height, across : across + width]
                target[:, :, count:] = 0.0
                if count:
                    near = [part[:, :count] for part in harmonics[: pair.top + 1]]
                    shape = (len(one.place), one.components, len(two.place), two.components, -1)
                    part = target[:, :, :count].reshape(shape)
                    pair.fill(part, square[:count], near, shortest, room)
                across += width
            down += height
        flat = found.reshape(-1, len(vectors))
        return flat if self.order is None else flat[self.order]

    def _largest(self) -> int:
        return max(
            (
                len(one.place) * one.components * len(two.place) * two.components
                for one in self.left.groups
                for two in self.right.groups
            ),
            default=0,
        )


class Batch(NamedTuple):
    """Some pairs of atoms: their indices, shape (p,), and blocks, shape (size, size', p)."""

    left: Ints
    right: Ints
    blocks: Floats


class Pairs(NamedTuple):
    """Pairs of atoms by rising distance, first those of an atom with itself.

    left, right: indices, shape (p,).  vectors: from the right to the left atom, shape (p, 3), bohr.
    square: their squared lengths.  share: elements of the matrix that these atoms have in all.
    """

    left: Ints
    right: Ints
    vectors: Floats
    square: Floats
    share: float


class Frame:
    """Atoms sorted into kinds; where the functions of each atom begin."""

    def __init__(self, atoms: Sequence[Placed]) -> None:
        self.kinds = kinds(atoms)
        self.positions = np.array([atom.position for atom in atoms], dtype=float).reshape(-1, 3)
        sizes = np.zeros(len(atoms), dtype=np.intp)
        for kind in self.kinds:
            sizes[kind.members] = kind.size
        self.starts = np.concatenate([np.zeros(1, dtype=np.intp), np.cumsum(sizes)])
        self.size = int(self.starts[-1])

    def batches(
        self, tail: Tail, kinetic: bool = False, progress: Progress | None = None
    ) -> Iterator[Batch]:
        """The blocks of all pairs of atoms within reach, each pair once, in batches."""
        whole = float(self.size) ** 2
        done = 0.0
        for number, left in enumerate(self.kinds):
            for right in self.kinds[number:]:
                if not left.size * right.size:
                    continue
                pair = KindPair(left, right, tail, kinetic)
                for some in self.pairs(left, right, pair.reach):
                    yield from _batches(pair, some)
                    done += some.share / whole
                    if progress is not None:
                        progress(min(1.0, done))

    def pairs(self, left: Kind, right: Kind, reach: float) -> Iterator[Pairs]:
        """Pairs of atoms closer than ``reach``, each once, so many at a time as memory likes."""
        rows = max(1, PANEL // max(1, len(right.members)))
        for first in range(0, len(left.members), rows):
            members = left.members[first : first + rows]
            one = np.repeat(members, len(right.members))
            two = np.tile(right.members, len(members))
            share = float(len(one) * left.size * right.size)
            if left is right:
                once = one <= two
                one, two = one[once], two[once]
            vectors = self.positions[one] - self.positions[two]
            square = np.einsum("px,px->p", vectors, vectors)
            order = np.flatnonzero(square < reach**2)
            # An atom with itself before others, even if another has the same place.
            key = np.where(one == two, -1.0, square)[order]
            order = order[np.argsort(key, kind="stable")]
            yield Pairs(
                one[order],
                two[order],
                vectors[order],
                square[order],
                share if left is right else 2.0 * share,
            )


def _batches(pair: KindPair, some: Pairs) -> Iterator[Batch]:
    step = batch_size(pair)
    for start in range(0, len(some.left), step):
        part = slice(start, start + step)
        blocks = pair.blocks(some.vectors[part])
        shape = (pair.left.size, pair.right.size, -1)
        yield Batch(some.left[part], some.right[part], blocks.reshape(shape))


def batch_size(pair: KindPair) -> int:
    """How many pairs of atoms are best worked out together."""
    return int(np.clip(BATCH // pair.size, 16, 2000))


def memory_needed(functions: int) -> int:
    """Bytes that a dense matrix takes while it is made."""
    return 8 * functions**2 + WORKING


def _dense(
    atoms: Sequence[Placed],
    kinetic: bool,
    memory: int | None = None,
    progress: Progress | None = None,
) -> Floats:
    frame = Frame(atoms)
    needed = memory_needed(frame.size)
    if memory is not None and needed > memory:
        raise TooLarge(f"A dense matrix of {frame.size} functions", needed, memory)
    matrix = np.zeros((frame.size, frame.size))
    for batch in frame.batches(Tail(LIMIT), kinetic, progress):
        at, to = frame.starts[batch.left], frame.starts[batch.right]
        blocks = batch.blocks
        own = np.flatnonzero(batch.left == batch.right)
        if len(own):  # two halves of one block are equal but for rounding
            blocks[..., own] = 0.5 * (blocks[..., own] + blocks[..., own].swapaxes(0, 1))
        _scatter(matrix, at, to, blocks.transpose(2, 0, 1))
        _scatter(matrix, to, at, blocks.transpose(2, 1, 0))
    return matrix


def _scatter(matrix: Floats, rows: Ints, columns: Ints, blocks: Floats) -> None:
    """Put blocks, shape (p, h, w), where they belong: ``rows`` and ``columns`` are their corners.

    One line of a block is one item of ``w`` numbers, moved at once.
    """
    _, height, width = blocks.shape
    item = np.dtype((np.void, 8 * width))
    places = np.ndarray((matrix.size - width + 1,), item, matrix.data, strides=(8,))
    index = (rows[:, None] + np.arange(height)) * len(matrix) + columns[:, None]
    places[index] = np.ascontiguousarray(blocks).view(item)[..., 0]


def overlap(
    atoms: Sequence[Placed], *, memory: int | None = None, progress: Progress | None = None
) -> Floats:
    """Overlap matrix, shape (n, n), in the order of `placed.lay_out`, exactly symmetric.

    memory: bytes allowed.  progress: called with the share done.  Raises `TooLarge` where memory
    does not suffice, `NotNormalisable` for a function of no finite positive self-overlap.
    """
    return _dense(atoms, False, memory, progress)


def kinetic(atoms: Sequence[Placed], *, memory: int | None = None) -> Floats:
    """Kinetic-energy matrix in hartree, shape (n, n), as `overlap`."""
    return _dense(atoms, True, memory)
