"""An approximate field: what a molecule's electrons feel, without two-electron integrals.

It begins with superposed atoms that have the densities of Slater functions by Slater's rules, and
in a few rounds the occupied orbitals renew the density rho.  The classical potential is always that
of spherical atoms, each with its share of the density, and exchange is that of the homogeneous
electron gas:

    v(r) = sum over atoms of (-Z / d + charge within d / d + sum of shells beyond d)
           - (3 rho(r) / pi)**(1/3).

Matrix elements are sums over a grid of spheres about each atom.  That is good for a digit or two,
which is all that is asked of it, at a small part of the cost of a real self-consistent field.

Source: J. Harris, Phys. Rev. B 31, 1770 (1985) for fields of superposed densities; J. C. Slater,
Phys. Rev. 36, 57 (1930) for the first density; P. A. M. Dirac, Proc. Cambridge Philos. Soc. 26, 376
(1930) for exchange; grid and shares: A. D. Becke, J. Chem. Phys. 88, 2547 (1988).
"""

from collections.abc import Sequence
from math import factorial, pi

import numpy as np

from overlapse.grammar.elements import subshells
from overlapse.grammar.model import Floats
from overlapse.rules.physics.harmonics import cartesian_parts, solid_harmonics, sphere
from overlapse.rules.physics.kinds import Group, kinds
from overlapse.rules.physics.onecentre import norms
from overlapse.rules.physics.placed import Placed
from overlapse.rules.physics.slater import slater_zetas

RADIAL, DEGREE = 36, 13  # points on a ray; degree that the points of a sphere integrate exactly
ROUNDS = 3  # renewals of the density, half new and half old; more change little
SELF = 0.3  # see `in_order`
KEPT = 1e-6  # eigenvalue of S from which a direction takes part in the orbitals
MOST_VALUES, MOST_WORK = 3e7, 1.5e10  # numbers held (240 MB), multiplications of a round


def affordable(atoms: Sequence[Placed], size: int) -> bool:
    """Whether the field for ``size`` functions takes seconds and moderate memory."""
    values = float(len(atoms) * RADIAL * len(sphere(DEGREE)[1]) * size)
    return values <= MOST_VALUES and values * size <= MOST_WORK


def superposed_field(
    atoms: Sequence[Placed],
    nuclei: Sequence[int],
    overlap: Floats,
    kinetic: Floats,
    electrons: tuple[int, int],
) -> Floats:
    """Matrix of v, hartree, shape (n, n), in the order of `placed.lay_out`.

    nuclei: atomic number of each atom, 0 for an empty centre that only carries functions.
    overlap, kinetic: matrices of the functions, shape (n, n), hartree.  electrons: of either spin.
    """
    positions = np.array([atom.position for atom in atoms], dtype=float).reshape(-1, 3)
    grid = _Grid(positions)
    functions = _values(grid.points, positions, atoms)
    values, vectors = np.linalg.eigh(overlap)
    x = vectors[:, values > KEPT] / np.sqrt(values[values > KEPT])
    density = grid.scaled(_slater_density(grid, nuclei), sum(electrons))
    for renewal in range(ROUNDS + 1):
        potential = grid.classical(density, nuclei) - np.cbrt(3.0 * density / pi)
        matrix = (functions * (grid.weights * potential)) @ functions.T
        if renewal < ROUNDS:
            orbitals = x @ in_order(x, kinetic, kinetic + matrix)[1]
            new = sum(((orbitals[:, :n].T @ functions) ** 2).sum(axis=0) for n in electrons)
            mixed = new if renewal == 0 else 0.5 * (density + new)
            density = grid.scaled(mixed, sum(electrons))
    result: Floats = matrix
    return result


def in_order(x: Floats, kinetic: Floats, fock: Floats) -> tuple[Floats, Floats]:
    """Orbital energies, shape (m,), and orbitals over the columns of x, in order of occupation.

    The exchange of the electron gas leaves an electron some of its repulsion with itself, and more
    so in compact orbitals: levels of hydrogen, helium and neon come out too high by about 0.3 times
    the root of their kinetic energy (hartree).  Without that shift diffuse orbitals would be
    occupied before the antibonding ones of squeezed atoms.
    """
    energies, orbitals = np.linalg.eigh(x.T @ fock @ x)
    motion = np.einsum("ai,ab,bi->i", orbitals, x.T @ kinetic @ x, orbitals, optimize=True)
    order = np.argsort(energies - SELF * np.sqrt(np.maximum(motion, 0.0)), kind="stable")
    return energies[order], orbitals[:, order]


class _Grid:
    """Points (p, 3) of all atoms' spheres, their weights with and without the atoms' shares (p,).

    Points are in order of atoms, rays' points (rising), and directions.
    """

    def __init__(self, positions: Floats) -> None:
        angle = pi * np.arange(RADIAL, 0, -1) / (RADIAL + 1)
        x = np.cos(angle)
        self.radius = (1.0 + x) / (1.0 - x)
        around = pi / (RADIAL + 1) * np.sin(angle) * 2.0 / (1.0 - x) ** 2 * self.radius**2
        nodes, self.angular = sphere(DEGREE)
        shell = (self.radius[:, None, None] * nodes).reshape(-1, 3)
        self.points = (positions[:, None, :] + shell).reshape(-1, 3)
        self.distances = np.stack([np.linalg.norm(self.points - p, axis=1) for p in positions])
        self.weights = np.concatenate(
            [
                np.outer(around, self.angular).ravel()
                * _share(self.distances[:, k * len(shell) : (k + 1) * len(shell)], positions, k)
                for k in range(len(positions))
            ]
        )

    def scaled(self, density: Floats, electrons: int) -> Floats:
        """The density, made to hold just so many electrons on this grid."""
        held = float(self.weights @ density)
        return density * (electrons / held) if held > 0.0 else density

    def classical(self, density: Floats, nuclei: Sequence[int]) -> Floats:
        """Potential of the nuclei and of the density as spherical atoms, shape (p,)."""
        charges = (self.weights * density).reshape(len(nuclei), RADIAL, -1).sum(axis=2)
        total = np.zeros(len(density))
        for charge, z, distance in zip(charges, nuclei, self.distances, strict=True):
            # Half of a sphere's own charge counts as within, half as beyond.
            within = np.cumsum(charge) - 0.5 * charge
            shells = charge / self.radius
            beyond = np.cumsum(shells[::-1])[::-1] - 0.5 * shells
            screened = np.interp(distance, self.radius, within + beyond * self.radius)
            total += (screened - z) / np.maximum(distance, 1e-9)
        return total


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


def _values(points: Floats, positions: Floats, atoms: Sequence[Placed]) -> Floats:
    """Values of all functions at the points, shape (n, p)."""
    members = {int(k): kind for kind in kinds(atoms) for k in kind.members}
    rows = []
    for index, position in enumerate(positions):
        away = points - position
        square = (away**2).sum(axis=1)
        harmonics = solid_harmonics(away, members[index].top)
        found = np.empty((members[index].size, len(points)))
        for group in members[index].groups:
            for place, part in zip(group.place, _radial(group, square), strict=True):
                for l, expansion in _parts(group):
                    block = (expansion @ harmonics[l]) * (part * square ** ((group.l - l) // 2))
                    into = slice(place, place + group.components)
                    found[into] = block if l == group.l else found[into] + block
        rows.append(found)
    return np.concatenate(rows)


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


def _slater_density(grid: _Grid, nuclei: Sequence[int]) -> Floats:
    """Density of neutral spherical atoms at the points of the grid, bohr**-3, shape (p,)."""
    density = np.zeros(grid.distances.shape[1])
    for z, d in zip(nuclei, grid.distances, strict=True):
        order, left = subshells(z) if z else (), z
        zetas = slater_zetas(order, z)
        for n, l in order:
            held = min(left, 4 * l + 2)
            left -= held
            zeta = 2.0 * zetas[n, l]
            scale = held * zeta ** (2 * n + 1) / factorial(2 * n) / (4.0 * pi)
            density += scale * d ** (2 * n - 2) * np.exp(-zeta * d)
    return density
