"""Overlap matrices in sparse form, screened contraction by contraction.

The matrix is held in blocks of some thousand rows, one of each pair of mirror images.
Sorting elements into rows costs more the more rows there are to write to at a time; so the cost of
an element does not grow with the matrix.
"""

from collections.abc import Iterator, Sequence
from itertools import pairwise
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy import sparse

from overlapse.grammar.model import Floats
from overlapse.rules.physics.classes import GroupPair, Tail
from overlapse.rules.physics.harmonics import solid_harmonics
from overlapse.rules.physics.integrals import (
    BATCH,
    LIMIT,
    WORKING,
    Frame,
    KindPair,
    Pairs,
    Progress,
    TooLarge,
)
from overlapse.rules.physics.kinds import Kind
from overlapse.rules.physics.placed import Ints, Placed

DROP = 1e-12  # elements below are not stored
BOUNDED = 1e-2  # of that: what a bound holds an element below is not even worked out
ROWS = 3000  # of a block, about


Indices = npt.NDArray[np.int32]


class Block(NamedTuple):
    """A part of a symmetric matrix: its first row and column, and `scipy.sparse.csr_array`.

    A block away from the diagonal stands for its mirror image too.
    """

    row: int
    column: int
    matrix: Any

    @property
    def rows(self) -> slice:
        return slice(self.row, self.row + self.matrix.shape[0])

    @property
    def columns(self) -> slice:
        return slice(self.column, self.column + self.matrix.shape[1])

    @property
    def mirrored(self) -> bool:
        return self.row != self.column


class Blocked:
    """A symmetric matrix in blocks, shape (size, size)."""

    def __init__(self, size: int, blocks: Sequence[Block]) -> None:
        self.shape = size, size
        self._blocks = blocks

    @property
    def nnz(self) -> int:
        """Number of elements, mirror images counted."""
        return sum(block.matrix.nnz * (2 if block.mirrored else 1) for block in self._blocks)

    def __matmul__(self, vector: Floats) -> Floats:
        """The product with a vector, shape (n,)."""
        found = np.zeros(len(vector))
        for block in self._blocks:
            found[block.rows] += block.matrix @ vector[block.columns]
            if block.mirrored:
                found[block.columns] += block.matrix.T @ vector[block.rows]
        return found

    def dense(self, among: Ints | None = None) -> Floats:
        """All of it, or the part with the given rows and columns, rising, as a full array."""
        chosen = np.arange(self.shape[0]) if among is None else among
        found = np.zeros((len(chosen), len(chosen)))
        for block in self._blocks:
            sides = block.rows, block.columns
            rows, columns = (
                slice(*np.searchsorted(chosen, (side.start, side.stop))) for side in sides
            )
            part = block.matrix[chosen[rows] - block.row][:, chosen[columns] - block.column]
            found[rows, columns] = part.toarray()
            if block.mirrored:
                found[columns, rows] = found[rows, columns].T
        return found


class Sparse(NamedTuple):
    """A sparse overlap matrix.

    bound: no eigenvalue differs by more from that of the full matrix (the largest sum of what was
    left out of a row).
    """

    matrix: Blocked
    bound: float


class _Part(NamedTuple):
    """Overlaps of some pairs of contractions of some pairs of atoms.

    values: shape (k, c, c', p).  rows, columns: the first function of each, shape (k, p).  own:
    the pairs are of atoms with themselves, so that each element and its mirror are there.
    """

    values: Floats
    rows: Ints
    columns: Ints
    own: bool


def sparse_overlap(
    atoms: Sequence[Placed],
    *,
    drop: float = DROP,
    memory: int | None = None,
    progress: Progress | None = None,
) -> Sparse:
    """Overlap matrix of which only elements of at least ``drop`` are stored.

    memory: bytes allowed, judged while the matrix grows.  progress: called with the share done.
    Raises `TooLarge`, and `NotNormalisable` for a function of no finite positive self-overlap.
    """
    frame = Frame(atoms)
    missing = np.full(frame.size, BOUNDED * drop * frame.size)
    blocks: list[Block] = []
    pairs = _KindPairs(drop)
    done, stored = 0.0, 0
    for one, two in _panels(frame):
        lists: list[tuple[Floats, Indices, Indices]] = []
        for some, parts in _parts(frame, one, two, pairs):
            for part in parts:
                lists += _kept(part, drop, missing, (one, two))
            done += some.share / float(frame.size) ** 2
            if progress is not None:
                progress(min(1.0, done))
        matrix = _assembled(lists, (one.size, two.size))
        blocks.append(Block(one.first, two.first, matrix))
        stored += matrix.nnz
        # Of the last block there are the lists as well.
        needed = 12 * stored + 28 * matrix.nnz + WORKING
        if memory is not None and needed > memory:
            raise TooLarge("A sparse matrix (so far)", needed, memory)
    return Sparse(Blocked(frame.size, blocks), float(missing.max(initial=0.0)))


class _Panel(NamedTuple):
    """Some atoms in a row: their kinds with these members alone, first function, and how many."""

    kinds: tuple[Kind, ...]
    first: int
    size: int


def _panels(frame: Frame) -> Iterator[tuple[_Panel, _Panel]]:
    """Rows and columns of the blocks: some thousand atoms with themselves, and with all later."""
    count = max(1, round(frame.size / ROWS))
    limits = np.searchsorted(frame.starts, np.linspace(0, frame.size, count + 1)).tolist()
    last = limits[-1] = len(frame.starts) - 1
    for first, stop in pairwise(limits):
        panel = _panel(frame, first, stop)
        yield panel, panel
        if stop < last:
            yield panel, _panel(frame, stop, last)


def _panel(frame: Frame, first: int, stop: int) -> _Panel:
    kinds = []
    for kind in frame.kinds:
        inside = kind.members[(kind.members >= first) & (kind.members < stop)]
        kinds.append(kind._replace(members=inside))
    start = int(frame.starts[first])
    return _Panel(tuple(kinds), start, int(frame.starts[stop]) - start)


class _KindPairs:
    """Pairs of kinds, by their places in the list of kinds, with what all their panels share."""

    def __init__(self, drop: float) -> None:
        self._known: dict[tuple[int, int], tuple[list[GroupPair], list[Floats]]] = {}
        self._drop = drop

    def of(self, key: tuple[int, int], left: Kind, right: Kind) -> "_Shared":
        """Pairs of groups, and the distances from which their elements are not worked out."""
        if key not in self._known:
            groups = [one for row in KindPair(left, right, Tail(LIMIT)).pairs for one in row]
            self._known[key] = groups, [one.spans(BOUNDED * self._drop) for one in groups]
        return self._known[key]


_Shared = tuple[list[GroupPair], list[Floats]]


def _parts(
    frame: Frame, one: _Panel, two: _Panel, shared: _KindPairs
) -> Iterator[tuple[Pairs, Iterator[_Part]]]:
    """All elements of two panels, each pair of atoms once."""
    for i, left in enumerate(one.kinds):
        for j, right in enumerate(two.kinds):
            if (one is two and j < i) or not (len(left.members) and len(right.members)):
                continue
            groups, spans = shared.of((i, j), left, right)
            longest = max((float(span.max()) for span in spans), default=0.0)
            for some in frame.pairs(left, right, longest):
                yield (
                    some,
                    (
                        part
                        for group, span in zip(groups, spans, strict=True)
                        for part in _of_groups(frame, group, span, some)
                    ),
                )


def _kept(
    part: _Part, drop: float, missing: Floats, panels: tuple[_Panel, _Panel]
) -> Iterator[tuple[Floats, Indices, Indices]]:
    """The elements that are stored: values, rows and columns within their block.

    In a block on the diagonal those of two atoms come with their mirror images.  What is left out
    is added to ``missing``.
    """
    size = np.abs(part.values)
    keep = size >= drop
    values = part.values[keep]
    _, height, width, _ = size.shape
    down, across = np.arange(height)[:, None], np.arange(width)[:, None]
    rows = part.rows[:, None, :] + down
    columns = part.columns[:, None, :] + across
    at = (rows - panels[0].first).astype(np.int32)[:, :, None, :]
    to = (columns - panels[1].first).astype(np.int32)[:, None, :, :]
    at, to = (np.broadcast_to(index, size.shape)[keep] for index in (at, to))
    yield values, at, to
    if panels[0] is panels[1] and not part.own:
        yield values, to, at
    size[keep] = 0.0
    missing += np.bincount(rows.ravel(), size.sum(axis=2).ravel(), len(missing))
    if not part.own:
        missing += np.bincount(columns.ravel(), size.sum(axis=1).ravel(), len(missing))


def _assembled(lists: list[tuple[Floats, Indices, Indices]], shape: tuple[int, int]) -> Any:
    """One block of the elements, whose lists are lost."""
    columns: list[Any] = list(zip(*lists, strict=True)) or [(), (), ()]
    lists.clear()
    none = np.zeros(0, dtype=np.int32)
    values, at, to = (np.concatenate([none, *columns.pop(0)]) for _ in range(3))
    matrix = sparse.coo_array((values, (at, to)), shape=shape)
    matrix.has_canonical_format = True  # no element comes twice: that need not be looked for
    return matrix.tocsr()


def _of_groups(frame: Frame, group: GroupPair, spans: Floats, some: Pairs) -> Iterator[_Part]:
    order = np.argsort(-spans, kind="stable")
    spans = spans[order]
    first, second = np.divmod(order, len(group.right.place))
    one, two = group.left.place[first], group.right.place[second]
    own = int(np.searchsorted(some.left != some.right, True))
    end = int(np.searchsorted(some.square, spans[0] ** 2))
    start = 0
    while start < end:
        shortest = float(np.sqrt(some.square[start]))
        active = max(1, int(np.searchsorted(-spans, -shortest)))
        size = active * group.left.components * group.right.components
        stop = min(own if start < own else end, start + int(np.clip(BATCH // size, 16, 4000)))
        part = slice(start, stop)
        near = solid_harmonics(some.vectors[part], group.top)
        yield _Part(
            group.chosen(order[:active], some.square[part], near, shortest),
            frame.starts[some.left[part]] + one[:active, None],
            frame.starts[some.right[part]] + two[:active, None],
            start < own,
        )
        start = stop
