"""Overlap matrices of crystals, layers and chains.

    S_ij(k) = sum over lattice vectors T of exp(i k T) <i in cell 0 | j in cell T>

Each primitive pair is followed to a distance of its own, chosen so that all that is left out of
any element of any S(k) is at most the tolerance, by a bound and not by experience: the number of
lattice points within r of a place is at most V_D (r + h)**D / volume, where h is the half sum of
the cell's edges and V_D the volume of the D-dimensional unit sphere, because cells around these
points do not overlap; and the pair's bound (`classes`) falls with distance.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import product
from math import gamma, pi
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy import sparse

from overlapse.grammar.model import Floats
from overlapse.rules.physics.classes import Tail
from overlapse.rules.physics.integrals import (
    WORKING,
    Frame,
    KindPair,
    Progress,
    TooLarge,
    batch_size,
)
from overlapse.rules.physics.kinds import Kind
from overlapse.rules.physics.placed import Ints, Placed

Complexes = npt.NDArray[np.complex128]
IMAGES = 1_000_000  # pairs of an atom and an image that are looked at together
MOST = 5_000_000  # images of a cell; even cells with edges of one bohr have fewer


class Lattice(NamedTuple):
    """Periodic directions: vectors, shape (D, 3), bohr, D from 1 to 3."""

    vectors: Floats

    @property
    def volume(self) -> float:
        """Volume, area or length of the cell in the periodic directions."""
        return float(np.sqrt(np.linalg.det(self.vectors @ self.vectors.T)))

    @property
    def edge(self) -> float:
        """No place of a cell is farther than this from its middle."""
        return 0.5 * float(np.linalg.norm(self.vectors, axis=1).sum())

    def points(self, radius: float, offset: float) -> Ints:
        """Whole-number coordinates of all lattice vectors up to ``radius + offset``, (m, D).

        Raises `TooLarge` where there are so many that the cell cannot be right.
        """
        far = radius + offset
        steps = np.linalg.norm(np.linalg.pinv(self.vectors), axis=0) * far
        if (count := float(np.prod(2.0 * steps + 1.0))) > MOST:
            raise TooLarge(f"A lattice sum over {count:.0e} images", int(80 * count), 80 * MOST)
        ranges = [np.arange(-int(step), int(step) + 1) for step in steps]
        grid = np.stack(np.meshgrid(*ranges, indexing="ij"), axis=-1).reshape(-1, len(ranges))
        found: Ints = grid[np.linalg.norm(grid @ self.vectors, axis=1) <= far]
        return found


def lattice_of(cell: Floats, periodic: Sequence[bool] = (True, True, True)) -> Lattice:
    """The periodic rows of a cell, shape (3, 3), bohr.

    Raises ValueError where there are none, or where they do not span what they should.
    """
    vectors = np.asarray(cell, dtype=float)[np.asarray(periodic, dtype=bool)]
    lengths = np.linalg.norm(vectors, axis=1)
    if not len(vectors) or not lengths.all():
        raise ValueError("a lattice needs at least one periodic direction, of a length above zero")
    lattice = Lattice(vectors)
    if not lattice.volume > 1e-6 * float(np.prod(lengths)):
        raise ValueError("the cell's vectors do not span a cell")
    return lattice


@dataclass(frozen=True, eq=False)
class LatticeTail(Tail):
    """What a lattice sum leaves out of an element stays below a limit.

    longest: images farther than that (bohr) are left out whatever they add, and the limit does
    not hold.
    """

    lattice: Lattice
    longest: float = np.inf

    def reach(self, mu: Floats, bounds: dict[int, Floats]) -> Floats:
        """Distance from which each pair is left out; see `classes.Tail.reach`."""
        half = np.array(list(bounds)) / 2.0
        # In units of mu**(-1/2); at the far end the bound is below the smallest number.
        grid = np.linspace(np.sqrt(half.max()) + 1e-9, 28.0, 800)
        powers = np.exp(half[:, None] * np.log(grid**2) - grid**2)
        bound = np.stack(list(bounds.values()), axis=1) @ powers
        dimension = len(self.lattice.vectors)
        sphere = pi ** (dimension / 2) / gamma(dimension / 2 + 1)
        radius = grid / np.sqrt(mu)[:, None]
        count = sphere * (radius + self.lattice.edge) ** dimension / self.lattice.volume
        # Sum over points beyond grid[k]: summation by parts, N taken at the far end of each step.
        left_out = np.cumsum((count[:, 1:] * -np.diff(bound))[:, ::-1], axis=1)[:, ::-1]
        first = (left_out <= self.limit / len(mu)).argmax(axis=1)
        return np.minimum(np.take_along_axis(radius, first[:, None], axis=1)[:, 0], self.longest)


def monkhorst_pack(mesh: Sequence[int], *, reduced: bool = True) -> Floats:
    """Fractional k-points (2r - q - 1) / 2q, r = 1 ... q, shape (k, 3).

    reduced: only one of k and -k, whose matrices are conjugates and share their eigenvalues.
    Source: H. J. Monkhorst, J. D. Pack, Phys. Rev. B 13, 5188 (1976).
    """
    axes = [[(2 * r - q - 1) / (2 * q) for r in range(1, q + 1)] for q in mesh]
    points = [point for point in product(*axes)]
    if reduced:
        points = [p for p in points if p >= tuple(-x for x in p)]
    return np.array(points)


def lattice_reach(
    atoms: Sequence[Placed],
    cell: Floats,
    *,
    tolerance: float = 1e-10,
    periodic: Sequence[bool] = (True, True, True),
) -> float:
    """The largest distance (bohr) that converged lattice sums have to follow."""
    tail = LatticeTail(tolerance, lattice_of(cell, periodic))
    groups = Frame(atoms).kinds
    pairs = (KindPair(a, b, tail) for i, a in enumerate(groups) for b in groups[i:])
    return max((pair.reach for pair in pairs), default=0.0)


def lattice_overlap(
    atoms: Sequence[Placed],
    cell: Floats,
    kpoints: Floats,
    *,
    tolerance: float = 1e-10,
    periodic: Sequence[bool] = (True, True, True),
    reach: float | None = None,
    memory: int | None = None,
    progress: Progress | None = None,
) -> Complexes:
    """Overlap matrices at k-points, shape (k, n, n), in the order of `placed.lay_out`, Hermitian.

    cell: rows are vectors, bohr, shape (3, 3); only the rows that are ``periodic`` count.  kpoints:
    in units of the reciprocal vectors, shape (k, 3).  tolerance: bound of the error of an element.
    reach: leave out images beyond this distance (bohr), so that it shows what a truncated sum
    does; the bound does not hold then.  memory: bytes allowed.  Raises `TooLarge`, ValueError for
    a cell that is none, `NotNormalisable`.
    """
    lattice = lattice_of(cell, periodic)
    frame = Frame(atoms)
    points = np.asarray(kpoints, dtype=float).reshape(-1, 3)[:, np.asarray(periodic, dtype=bool)]
    needed = 16 * len(points) * frame.size**2 + 4 * WORKING
    if memory is not None and needed > memory:
        raise TooLarge(f"S(k) at {len(points)} k-points", needed, memory)
    matrix = np.zeros((len(points), frame.size, frame.size), dtype=np.complex128)
    tail = LatticeTail(tolerance, lattice, np.inf if reach is None else reach)
    works = [(a, b) for i, a in enumerate(frame.kinds) for b in frame.kinds[i:] if a.size * b.size]
    for number, (left, right) in enumerate(works):
        pair = KindPair(left, right, tail)
        for at, to, blocks in _summed(frame, pair, lattice, points, left is right):
            _place(matrix, frame, (left, right), at, to, blocks)
        if progress is not None:
            progress((number + 1) / len(works))
    return matrix


def _summed(
    frame: Frame, pair: KindPair, lattice: Lattice, points: Floats, same: bool
) -> Iterator[tuple[Ints, Ints, Complexes]]:
    """Sums over images for some pairs of atoms: indices, and shape (pairs, k, size, size')."""
    left = np.repeat(pair.left.members, len(pair.right.members))
    right = np.tile(pair.right.members, len(pair.left.members))
    if same:
        once = left <= right
        left, right = left[once], right[once]
    offsets = frame.positions[left] - frame.positions[right]
    steps = lattice.points(pair.reach, float(np.linalg.norm(offsets, axis=1).max()))
    shifts = steps @ lattice.vectors
    phases = np.exp(2j * pi * (steps @ points.T))
    rows = max(1, min(IMAGES // len(steps), IMAGES * 8 // (pair.size * len(points))))
    for first in range(0, len(left), rows):
        some = slice(first, first + rows)
        total = _sum_images(pair, offsets[some], shifts, phases)
        shape = (-1, len(points), pair.left.size, pair.right.size)
        yield left[some], right[some], total.reshape(shape)


def _sum_images(pair: KindPair, offsets: Floats, shifts: Floats, phases: Complexes) -> Complexes:
    vectors = offsets[:, None, :] - shifts
    square = np.einsum("atx,atx->at", vectors, vectors).ravel()
    order = np.flatnonzero(square < pair.reach**2)
    order = order[np.argsort(square[order], kind="stable")]
    vectors = vectors.reshape(-1, 3)
    count = phases.shape[1]
    total = np.zeros((len(offsets) * count, pair.size), dtype=np.complex128)
    step = batch_size(pair)
    for start in range(0, len(order), step):
        part = order[start : start + step]
        blocks = np.ascontiguousarray(pair.blocks(vectors[part]).T)
        atoms, images = np.divmod(part, len(shifts))
        to = (atoms[:, None] * count + np.arange(count)).ravel()
        of = np.repeat(np.arange(len(part)), count)
        weights: Any = sparse.csr_array(
            (phases[images].ravel(), (to, of)), shape=(len(total), len(part))
        )
        total += weights @ blocks
    return total


def _place(
    matrix: Complexes, frame: Frame, kinds: tuple[Kind, Kind], at: Ints, to: Ints, blocks: Complexes
) -> None:
    own = np.flatnonzero(at == to)
    if len(own):  # a block and its transpose are equal but for rounding
        blocks[own] = 0.5 * (blocks[own] + blocks[own].conj().swapaxes(-1, -2))
    rows = (frame.starts[at][:, None] + np.arange(kinds[0].size))[:, :, None]
    columns = (frame.starts[to][:, None] + np.arange(kinds[1].size))[:, None, :]
    for k in range(len(matrix)):
        matrix[k][rows, columns] = blocks[:, k]
        matrix[k][columns, rows] = blocks[:, k].conj()
