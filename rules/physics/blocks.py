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

    values: shape (k, c, c', p).  rows, columns: the first function of each, shape (k, p).
    """

    values: Floats
    rows: Ints
    columns: Ints


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
        rows = (part.rows[k, p] + c).astype(np.int32)
        columns = (part.columns[k, p] + d).astype(np.int32)
        held.append((part.values[keep], rows, columns))
        size[keep] = 0.0
        _, height, width, _ = size.shape
        for first, count, axis in ((part.rows, height, 2), (part.columns, width, 1)):
            where = first[:, None, :] + np.arange(count)[:, None]
            missing += np.bincount(where.ravel(), size.sum(axis=axis).ravel(), frame.size)
        stored += len(rows)
        # Lists, one half, its transpose, and the whole: 16, 12, 12 and 24 bytes.
        if memory is not None and 64 * stored + WORKING > memory:
            raise TooLarge("A sparse matrix (so far)", 64 * stored + WORKING, memory)
    shape = (frame.size, frame.size)
    if not held:
        return Sparse(sparse.csr_array(shape), 0.0)
    values, at, to = (np.concatenate(column) for column in zip(*held, strict=True))
    half = sparse.coo_array((values, (at, to)), shape=shape).tocsr()
    return Sparse(half + half.T.tocsr(), float(missing.max()))


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
    end = int(np.searchsorted(some.square, spans[0] ** 2))
    start = 0
    while start < end:
        shortest = float(np.sqrt(some.square[start]))
        active = max(1, int(np.searchsorted(-spans, -shortest)))
        size = active * group.left.components * group.right.components
        part = slice(start, min(end, start + int(np.clip(BATCH // size, 16, 4000))))
        near = solid_harmonics(some.vectors[part], group.top)
        values = group.chosen(order[:active], some.square[part], near, shortest)
        # Elements of an atom with itself are added to their own transposes.
        values[..., some.left[part] == some.right[part]] *= 0.5
        yield _Part(
            values,
            frame.starts[some.left[part]] + one[:active, None],
            frame.starts[some.right[part]] + two[:active, None],
        )
        start = part.stop
