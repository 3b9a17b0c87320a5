"""An approximate field: what a molecule's electrons feel, without two-electron integrals.

It begins with superposed atoms that have the densities of Slater functions by Slater's rules, and
in a few rounds the occupied orbitals renew the density rho.  The classical potential is always that
of spherical atoms, each with its share of the density, and exchange is that of the homogeneous
electron gas:

    v(r) = sum over atoms of (-Z / d + charge within d / d + sum of shells beyond d)
           - (3 rho(r) / pi)**(1/3).

`molecule` goes on from here to Hartree-Fock, where that can be afforded.

Source: J. Harris, Phys. Rev. B 31, 1770 (1985) for fields of superposed densities; J. C. Slater,
Phys. Rev. 36, 57 (1930) for the first density; P. A. M. Dirac, Proc. Cambridge Philos. Soc. 26, 376
(1930) for exchange.
"""

from collections.abc import Sequence
from math import factorial, pi

import numpy as np

from overlapse.grammar.elements import subshells
from overlapse.grammar.model import Floats
from overlapse.rules.physics.grid import Grid
from overlapse.rules.physics.slater import slater_zetas

ROUNDS = 3  # renewals of the density, half new and half old; more change little
SELF = 0.3  # see `in_order`


def superposed_field(
    grid: Grid,
    values: Floats,
    nuclei: Sequence[int],
    x: Floats,
    kinetic: Floats,
    electrons: tuple[int, int],
) -> Floats:
    """Matrix of v, hartree, shape (n, n).

    values: of the functions on the grid, shape (n, p).  nuclei: atomic number of each atom, 0 for
    an empty centre that only carries functions.  x: orthonormal directions that may be occupied,
    shape (n, m).  kinetic: matrix, shape (n, n), hartree.  electrons: of either spin.
    """
    density = grid.scaled(_slater_density(grid, nuclei), sum(electrons))
    for renewal in range(ROUNDS + 1):
        potential = grid.classical(density, nuclei) - np.cbrt(3.0 * density / pi)
        matrix = (values * (grid.weights * potential)) @ values.T
        if renewal < ROUNDS:
            orbitals = x @ in_order(x, kinetic, kinetic + matrix)[1]
            new = sum(((orbitals[:, :n].T @ values) ** 2).sum(axis=0) for n in electrons)
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


def _slater_density(grid: Grid, nuclei: Sequence[int]) -> Floats:
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
