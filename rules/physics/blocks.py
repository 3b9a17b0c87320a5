"""Overlap matrices in sparse form, screened contraction by contraction."""

from collections.abc import Iterator, Sequence
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
from overlapse.rules.physics.placed import Ints, Placed

DROP = 1e-12  # elements below are not stored
BOUNDED = 1e-2  # of that: what a bound holds an element below is not even worked out


Indices = npt.NDArray[np.int32]


class Sparse(NamedTuple):
    """A sparse overlap matrix.

    matrix: `scipy.sparse.csr_array`, shape (n, n).  bound: no eigenvalue differs by more from that
    of the full matrix (the largest sum of what was left out of a row).
    """

    matrix: Any
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
    held: list[tuple[Floats, Indices, Indices]] = []
    stored = 0
    for part in _parts(frame, drop, progress):
        size = np.abs(part.values)
        keep = size >= drop
        k, c, d, p = np.nonzero(keep)
        values = part.values[keep]
        rows = (part.rows[k, p] + c).astype(np.int32)
        columns = (part.columns[k, p] + d).astype(np.int32)
        held.append((values, rows, columns))
        size[keep] = 0.0
        _, height, width, _ = size.shape
        sides = [(part.rows, height, 2)]
        if not part.own:
            held.append((values, columns, rows))
            sides.append((part.columns, width, 1))
        for first, count, axis in sides:
            where = first[:, None, :] + np.arange(count)[:, None]
            missing += np.bincount(where.ravel(), size.sum(axis=axis).ravel(), frame.size)
        stored += len(rows) * (1 if part.own else 2)
        # Lists, one column of them joined, and the matrix: 16, 8 and 12 bytes.
        if memory is not None and 36 * stored + WORKING > memory:
            raise TooLarge("A sparse matrix (so far)", 36 * stored + WORKING, memory)
    shape = (frame.size, frame.size)
    columns_of = list(zip(*held, strict=True)) or [(), (), ()]
    held.clear()
    values, at, to = (_joined(columns_of) for _ in range(3))
    matrix = sparse.coo_array((values, (at, to)), shape=shape)
    matrix.has_canonical_format = True  # no element comes twice: that need not be looked for
    return Sparse(matrix.tocsr(), float(missing.max(initial=0.0)))


def _joined(columns: list[Any]) -> Any:
    """The first of the columns in one piece, and its pieces forgotten."""
    return np.concatenate([np.zeros(0, dtype=np.int32), *columns.pop(0)])


def _parts(frame: Frame, drop: float, progress: Progress | None) -> Iterator[_Part]:
    done, whole = 0.0, float(frame.size) ** 2
    for number, left in enumerate(frame.kinds):
        for right in frame.kinds[number:]:
            pair = KindPair(left, right, Tail(LIMIT))
            groups = [one for row in pair.pairs for one in row]
            spans = [group.spans(BOUNDED * drop) for group in groups]
            longest = max((float(span.max()) for span in spans), default=0.0)
            for some in frame.pairs(left, right, longest):
                for group, span in zip(groups, spans, strict=True):
                    yield from _of_groups(frame, group, span, some)
                done += some.share / whole
                if progress is not None:
                    progress(min(1.0, done))


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
