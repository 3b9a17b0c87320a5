"""Values of functions at points about each atom, and the potentials of densities on these points.

Matrix elements are sums over a grid of spheres about each atom, a point being shared between atoms.
The potential of a density is that of its parts on each atom's spheres, expanded in harmonics:

    v(r) = sum over atoms and lm of  4 pi / (2l+1) Y_lm  (integral over r' of
           min(r, r')**l / max(r, r')**(l+1)  rho_lm(r')  r'**2).

That is good for two or three digits, at a small part of the cost of two-electron integrals.

Source: A. D. Becke, J. Chem. Phys. 88, 2547 (1988) for the grid and the shares; A. D. Becke, R. M.
Dickson, J. Chem. Phys. 89, 2993 (1988) for potentials; cumulative integrals by cubics through four
neighbours: P. J. Davis, P. Rabinowitz, Methods of Numerical Integration, Academic Press 1984.
"""

from collections.abc import Sequence
from functools import cache
from itertools import pairwise
from math import pi, prod
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Floats
from overlapse.rules.physics.harmonics import cartesian_parts, solid_harmonics, sphere
from overlapse.rules.physics.kinds import Group, kinds
from overlapse.rules.physics.onecentre import norms
from overlapse.rules.physics.placed import Placed

RADIAL, DEGREE = 36, 13  # points on a ray; degree that the points of a sphere integrate exactly
TOP = 4  # highest l of the harmonics that densities are expanded in
FINER = 4  # steps between two points of a ray, among which potentials are interpolated


def points_of(atoms: int) -> int:
    """Number of points of the grid for so many atoms."""
    return atoms * RADIAL * len(sphere(DEGREE)[1])


class Grid:
    """Points (p, 3) of all atoms' spheres, and their weights (p,) with the atoms' shares.

    Points are in order of atoms, rays' points (rising), and directions.  positions: of the atoms,
    bohr, shape (atoms, 3).
    """

    def __init__(self, positions: Floats) -> None:
        self.positions = positions
        self.radius, slope = _ray()
        nodes, self.angular = sphere(DEGREE)
        shell = (self.radius[:, None, None] * nodes).reshape(-1, 3)
        self.each = len(shell)  # points of one atom
        self.points = (positions[:, None, :] + shell).reshape(-1, 3)
        self.distances = np.stack([np.linalg.norm(self.points - p, axis=1) for p in positions])
        self.shares = np.concatenate(
            [
                _share(self.distances[:, k * self.each : (k + 1) * self.each], positions, k)
                for k in range(len(positions))
            ]
        )
        around = np.outer(slope * self.radius**2, self.angular).ravel()
        self.weights = self.shares * np.tile(pi / (RADIAL + 1) * around, len(positions))

    def scaled(self, density: Floats, electrons: int) -> Floats:
        """The density, made to hold just so many electrons on this grid."""
        held = float(self.weights @ density)
        return density * (electrons / held) if held > 0.0 else density

    def attraction(self, nuclei: Sequence[int]) -> Floats:
        """Potential of the nuclei, hartree, shape (p,)."""
        bare: Floats = -np.array(nuclei, dtype=float) @ (1.0 / np.maximum(self.distances, 1e-9))
        return bare

    def classical(self, density: Floats, nuclei: Sequence[int]) -> Floats:
        """Potential of the nuclei and of the density as spherical atoms, shape (p,)."""
        charges = (self.weights * density).reshape(len(nuclei), RADIAL, -1).sum(axis=2)
        total = self.attraction(nuclei)
        for charge, distance in zip(charges, self.distances, strict=True):
            # Half of a sphere's own charge counts as within, half as beyond.
            within = np.cumsum(charge) - 0.5 * charge
            shells = charge / self.radius
            beyond = np.cumsum(shells[::-1])[::-1] - 0.5 * shells
            screened = np.interp(distance, self.radius, within + beyond * self.radius)
            total += screened / np.maximum(distance, 1e-9)
        return total

    def values(self, atoms: Sequence[Placed]) -> Floats:
        """Values of all functions at the points, shape (n, p)."""
        members = {int(k): kind for kind in kinds(atoms) for k in kind.members}
        rows = []
        for index, position in enumerate(self.positions):
            away = self.points - position
            square = (away**2).sum(axis=1)
            harmonics = solid_harmonics(away, members[index].top)
            found = np.empty((members[index].size, len(away)))
            for group in members[index].groups:
                for place, part in zip(group.place, _radial(group, square), strict=True):
                    for l, expansion in _parts(group):
                        block = (expansion @ harmonics[l]) * (part * square ** ((group.l - l) // 2))
                        into = slice(place, place + group.components)
                        found[into] = block if l == group.l else found[into] + block
            rows.append(found)
        return np.concatenate(rows)


class Potentials:
    """Potentials of many densities on one grid.

    matters: the points, shape (p,), where all of a potential is wanted; elsewhere it lacks what
    comes from other atoms.  That part is worked out in single precision.
    """

    def __init__(self, grid: Grid, matters: npt.NDArray[np.bool_]) -> None:
        self.grid = grid
        self._harmonics = np.concatenate(solid_harmonics(sphere(DEGREE)[0], TOP))
        self._seen = [_seen(grid, centre, matters) for centre in range(len(grid.positions))]

    def __call__(self, densities: Floats) -> Floats:
        """Potentials, hartree, of densities (bohr**-3) at the points, both of shape (q, p)."""
        grid, count = self.grid, len(densities)
        parts = (densities * grid.shares).reshape(count, -1, RADIAL, len(grid.angular))
        expanded = (parts * grid.angular) @ self._harmonics.T
        found = np.zeros_like(densities)
        for centre, seen in enumerate(self._seen):
            # Axes: density, harmonic, point of the ray.
            radial = np.concatenate(
                [
                    expanded[:, centre, :, l * l : (l + 1) ** 2].transpose(0, 2, 1) @ kernel.T
                    for l, kernel in enumerate(_kernels())
                ],
                axis=1,
            )
            own = slice(centre * grid.each, (centre + 1) * grid.each)
            found[:, own] += (radial.transpose(0, 2, 1) @ self._harmonics).reshape(count, -1)
            fine = (radial @ _finer().T).astype(np.float32)
            outside = np.empty((count, len(seen.points)), dtype=np.float32)
            for step, (first, last) in zip(seen.steps, pairwise(seen.bounds), strict=True):
                ends = np.concatenate([fine[:, :, step], fine[:, :, step + 1]], axis=1)
                outside[:, first:last] = ends @ seen.table[:, first:last]
            found[:, seen.points] += outside
        return found


class _Seen(NamedTuple):
    """Points of other atoms as seen from one, in order of the step of its ray they lie in.

    points: their indices, shape (q,).  steps: those that hold points, and bounds: where the points
    of each begin, and the end.  table: harmonics times the weights of a step's lower end, then of
    its upper end, shape (2 (TOP+1)**2, q).
    """

    points: npt.NDArray[np.intp]
    steps: list[int]
    bounds: list[int]
    table: npt.NDArray[np.float32]


def _seen(grid: Grid, centre: int, matters: npt.NDArray[np.bool_]) -> _Seen:
    outside = matters.copy()
    outside[centre * grid.each : (centre + 1) * grid.each] = False
    points = np.flatnonzero(outside)
    distance = np.maximum(grid.distances[centre][points], 1e-9)
    harmonics = np.concatenate(
        solid_harmonics((grid.points[points] - grid.positions[centre]) / distance[:, None], TOP)
    )
    steps = FINER * (RADIAL - 1)
    angle = np.arccos((1.0 - distance) / (1.0 + distance))  # even on a ray, see `_ray`
    place = np.clip(FINER * (angle * (RADIAL + 1) / pi - 1.0), 0.0, steps * (1.0 - 1e-12))
    order = np.argsort(place, kind="stable")
    points, place, harmonics = points[order], place[order], harmonics[:, order]
    step = place.astype(np.intp)
    held, begins = np.unique(step, return_index=True)
    upper = place - step
    return _Seen(
        points,
        held.tolist(),
        [*begins.tolist(), len(points)],
        np.concatenate([harmonics * (1.0 - upper), harmonics * upper]).astype(np.float32),
    )


@cache
def _ray() -> tuple[Floats, Floats]:
    """Distances of a ray's points, bohr, rising, and their derivative by the even parameter t.

    r = (1 - cos t) / (1 + cos t), t = k pi / (RADIAL + 1).
    """
    t = pi * np.arange(1, RADIAL + 1) / (RADIAL + 1)
    return (1.0 - np.cos(t)) / (1.0 + np.cos(t)), 2.0 * np.sin(t) / (1.0 + np.cos(t)) ** 2


@cache
def _kernels() -> tuple[Floats, ...]:
    """For each l the matrix from densities rho_lm on a ray to their potentials on it."""
    radius, slope = _ray()
    gap = pi / (RADIAL + 1)
    between = np.zeros((RADIAL + 1, RADIAL))  # weights of the integral from one point to the next
    between[0, 0] = between[-1, -1] = 0.5 * gap
    for k in range(1, RADIAL):
        inside = 1 < k < RADIAL - 1
        into = slice(k - 2, k + 2) if inside else slice(k - 1, k + 1)
        between[k, into] = np.array([-1, 13, 13, -1] if inside else [12, 12]) * gap / 24.0
    within = np.cumsum(between, axis=0)[:-1]
    beyond = np.cumsum(between[::-1], axis=0)[-2::-1]
    found = []
    for l in range(TOP + 1):
        inner = within * np.outer(radius ** (-l - 1.0), radius ** (l + 2.0) * slope)
        outer = beyond * np.outer(radius ** float(l), radius ** (1.0 - l) * slope)
        found.append(4.0 * pi / (2 * l + 1) * (inner + outer))
    return tuple(found)


@cache
def _finer() -> Floats:
    """From values on a ray to values FINER times as dense, by cubics through four neighbours."""
    count = FINER * (RADIAL - 1) + 1
    found = np.zeros((count, RADIAL))
    for row in range(count):
        place = row / FINER
        first = min(max(int(place) - 1, 0), RADIAL - 4)
        near = range(first, first + 4)
        for k in near:
            found[row, k] = prod((place - j) / (k - j) for j in near if j != k)
    return found


def _share(distances: Floats, positions: Floats, centre: int) -> Floats:
    """The part of each point that belongs to a centre; the parts of all centres add up to one."""
    cells = np.ones_like(distances)
    for one in range(len(positions)):
        for two in range(one):
            apart = float(np.linalg.norm(positions[one] - positions[two]))
            if apart < 1e-6:
                continue
            mu = (distances[one] - distances[two]) / apart
            for _ in range(3):
                mu = 1.5 * mu - 0.5 * mu**3
            cells[one] *= 0.5 * (1.0 - mu)
            cells[two] *= 0.5 * (1.0 + mu)
    share: Floats = cells[centre] / cells.sum(axis=0)
    return share


def _parts(group: Group) -> tuple[tuple[int, Floats], ...]:
    """Pairs of l and the expansion of a component in harmonics of that l."""
    if group.spherical:
        return ((group.l, np.eye(2 * group.l + 1)),)
    return cartesian_parts(group.l)


def _radial(group: Group, square: Floats) -> Floats:
    """Sums of normalised primitives less r**l, shape (functions, p)."""
    weights = group.weights * norms(group.exponents, group.l)
    found: Floats = weights @ np.exp(-np.outer(group.exponents, square))
    return found
