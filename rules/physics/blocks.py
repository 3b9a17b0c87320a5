"""Overlap matrices in sparse form, screened contraction by contraction.

The matrix is held in blocks of some thousand rows and columns, one of each pair of mirror images.
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
ROWS = 3000  # functions of a block's side, about


Indices = npt.NDArray[np.int32]


class Blocked:
    """A symmetric matrix in blocks.

    starts: first row of each panel of rows, and the number of rows, rising.  blocks: by numbers
    i <= j of two panels a `scipy.sparse.csr_array`; those of i < j stand for their mirror images
    too.
    """

    def __init__(self, starts: Sequence[int], blocks: dict[tuple[int, int], Any]) -> None:
        self._starts, self._blocks = starts, blocks

    @property
    def shape(self) -> tuple[int, int]:
        return self._starts[-1], self._starts[-1]

    @property
    def nnz(self) -> int:
        """Number of elements, mirror images counted."""
        return sum(block.nnz * (1 if i == j else 2) for (i, j), block in self._blocks.items())

    def __matmul__(self, vector: Floats) -> Floats:
        """The product with a vector, shape (n,)."""
        found = np.zeros(len(vector))
        parts = [slice(first, stop) for first, stop in pairwise(self._starts)]
        for (i, j), block in self._blocks.items():
            found[parts[i]] += block @ vector[parts[j]]
            if i != j:
                found[parts[j]] += block.T @ vector[parts[i]]
        return found

    def dense(self, among: Ints | None = None) -> Floats:
        """All of it, or the part with the given rows and columns, rising, as a full array."""
        chosen = np.arange(self._starts[-1]) if among is None else among
        limits = np.searchsorted(chosen, self._starts)
        inside = [
            chosen[first:stop] - start
            for (first, stop), start in zip(pairwise(limits), self._starts, strict=False)
        ]
        found = np.zeros((len(chosen), len(chosen)))
        for (i, j), block in self._blocks.items():
            part = block[inside[i]][:, inside[j]].toarray()
            rows, columns = (slice(limits[k], limits[k + 1]) for k in (i, j))
            found[rows, columns] = part
            found[columns, rows] = part.T
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
    panels = _panels(frame)
    blocks: dict[tuple[int, int], Any] = {}
    pairs = _KindPairs(drop)
    done, stored = 0.0, 0
    for i, one in enumerate(panels):
        for j, two in enumerate(panels[i:], i):
            lists: list[tuple[Floats, Indices, Indices]] = []
            for some, parts in _parts(frame, one, two, pairs):
                for part in parts:
                    lists += _kept(part, drop, missing, (one, two), i == j)
                done += some.share / float(frame.size) ** 2
                if progress is not None:
                    progress(min(1.0, done))
            blocks[i, j] = _assembled(lists, (one.size, two.size))
            stored += blocks[i, j].nnz
            # Of the last block there are the lists as well.
            needed = 12 * stored + 28 * blocks[i, j].nnz + WORKING
            if memory is not None and needed > memory:
                raise TooLarge("A sparse matrix (so far)", needed, memory)
    starts = [panel.first for panel in panels] + [frame.size]
    return Sparse(Blocked(starts, blocks), float(missing.max(initial=0.0)))


class _Panel(NamedTuple):
    """Some atoms in a row: their kinds with these members alone, first function, and how many."""

    kinds: tuple[Kind, ...]
    first: int
    size: int


def _panels(frame: Frame) -> list[_Panel]:
    """The atoms in panels of about the same number of functions."""
    count = max(1, round(frame.size / ROWS))
    limits = np.searchsorted(frame.starts, np.linspace(0, frame.size, count + 1)).tolist()
    limits[-1] = len(frame.starts) - 1
    found = []
    for first, stop in pairwise(limits):
        kinds = []
        for kind in frame.kinds:
            inside = kind.members[(kind.members >= first) & (kind.members < stop)]
            kinds.append(kind._replace(members=inside))
        start = int(frame.starts[first])
        found.append(_Panel(tuple(kinds), start, int(frame.starts[stop]) - start))
    return found


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
    part: _Part, drop: float, missing: Floats, panels: tuple[_Panel, _Panel], mirrored: bool
) -> Iterator[tuple[Floats, Indices, Indices]]:
    """The elements that are stored: values, rows and columns within their block.

    What is left out is added to ``missing``.  mirrored: elements of other atoms come with their
    mirror images.
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
    if mirrored and not part.own:
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
