"""Hartree-Fock for a molecule, roughly: repulsion and exchange are sums over a grid.

Orbitals are sought among the directions of S with eigenvalues above 1e-6, starting from the field
of `superposed`.  The exchange operator K enters by what it does to the occupied orbitals i,

    K = sum over ij of  K|i> (M**-1)_ij <j|K,    M_ij = <i|K|j>,

which is exact for them.  Gradients below 1e-3 hartree are enough: what is asked for is how far a
direction that is left out would be occupied, to a factor of two.

Too many pairs of orbitals leave the field of the electron gas; too many points leave none.

Source: compressed exchange: L. Lin, J. Chem. Theory Comput. 12, 2242 (2016); extrapolation: P.
Pulay, Chem. Phys. Lett. 73, 393 (1980); potentials of orbital pairs on a grid: A. D. Becke, R. M.
Dickson, J. Chem. Phys. 89, 2993 (1988).
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.grid import TOP, Grid, Potentials, points_of
from overlapse.rules.physics.placed import Placed
from overlapse.rules.physics.superposed import in_order, superposed_field

KEPT = 1e-6  # eigenvalue of S from which a direction takes part in the orbitals
ENOUGH, CYCLES = 1e-3, 12  # largest element of the gradient, hartree; iterations at most
NEGLIGIBLE = 1e-12  # weight of a point times the largest squared value of a function there
HELD = 6  # matrices that are extrapolated from
MOST_VALUES, MOST_WORK = 3e7, 1.5e10  # numbers held (240 MB), multiplications of a cycle
MOST_PAIRED = 8e9  # multiplications of a cycle for the potentials of pairs


class Field(NamedTuple):
    """Fock matrices of either spin, hartree, shape (n, n), and the electrons of either spin.

    exact: whether exchange is that of Hartree-Fock, else that of the electron gas.
    """

    focks: tuple[Floats, Floats]
    electrons: tuple[int, int]
    exact: bool = True

    def orbitals(self, spin: int, x: Floats, kinetic: Floats) -> tuple[Floats, Floats]:
        """Energies (m,) and orbitals over the columns of x, (m, m), in order of occupation."""
        if not self.exact:
            return in_order(x, kinetic, self.focks[spin])
        energies, orbitals = np.linalg.eigh(x.T @ self.focks[spin] @ x)
        return energies, orbitals


def filled(
    atoms: Sequence[Placed], empty: Sequence[int], charge: int, unpaired: int | None
) -> tuple[list[int], tuple[int, int]]:
    """Nuclear charges, 0 for an empty centre, and electrons of either spin (see `outlook.foresee`).

    A charge above that of the nuclei leaves less than no electrons.
    """
    nuclei = [0 if k in set(empty) else a.block.atomic_number for k, a in enumerate(atoms)]
    electrons = sum(nuclei) - charge
    up = min((electrons + (electrons % 2 if unpaired is None else unpaired)) // 2, electrons)
    return nuclei, (up, electrons - up)


def independent(overlap: Floats, least: float) -> Floats:
    """Orthonormal combinations, shape (n, m), from eigenvalues of S above ``least``."""
    values, vectors = np.linalg.eigh(overlap)
    enough = values > least
    found: Floats = vectors[:, enough] / np.sqrt(values[enough])
    return found


def affordable(atoms: Sequence[Placed], size: int) -> bool:
    """Whether a field for ``size`` functions takes seconds and moderate memory."""
    values = float(points_of(len(atoms)) * size)
    return values <= MOST_VALUES and values * size <= MOST_WORK


def exchange_affordable(atoms: int, electrons: tuple[int, int]) -> bool:
    """Whether the exchange of so many electrons of either spin takes seconds."""
    table = float(atoms * points_of(atoms) * 2 * (TOP + 1) ** 2)
    pairs = sum(n * (n + 1) / 2 for n in set(electrons))
    return table <= MOST_VALUES and table * pairs <= MOST_PAIRED


def molecular_field(
    atoms: Sequence[Placed],
    nuclei: Sequence[int],
    overlap: Floats,
    kinetic: Floats,
    electrons: tuple[int, int],
    *,
    exchange: bool = True,
) -> Field:
    """The field of a molecule, in the order of functions of `placed.lay_out`.

    nuclei: atomic number of each atom, 0 for an empty centre that only carries functions.
    overlap, kinetic: matrices of the functions, shape (n, n), hartree.  electrons: of either spin.
    exchange: False leaves the field of the electron gas, as for many atoms.
    """
    grid = Grid(np.array([atom.position for atom in atoms], dtype=float).reshape(-1, 3))
    values = grid.values(atoms)
    x = independent(overlap, KEPT)
    gas = superposed_field(grid, values, nuclei, x, kinetic, electrons)
    start = Field((kinetic + gas,) * 2, electrons, exact=False)
    if not exchange or not exchange_affordable(len(atoms), electrons):
        return start
    occupied = [x @ start.orbitals(s, x, kinetic)[1][:, :n] for s, n in enumerate(electrons)]
    bare = kinetic + (values * (grid.weights * grid.attraction(nuclei))) @ values.T
    potentials = Potentials(grid, (values**2).max(axis=0) * grid.weights > NEGLIGIBLE)
    seen: list[tuple[tuple[Floats, Floats], Floats]] = []
    for _ in range(CYCLES):
        focks = _focks(bare, values, potentials, occupied)
        gradient = np.concatenate(
            [
                (x.T @ (f @ c @ (c.T @ overlap) - (overlap @ c) @ (c.T @ f)) @ x).ravel()
                for f, c in zip(focks, occupied, strict=True)
            ]
        )
        if np.abs(gradient).max() < ENOUGH:
            break
        seen = [*seen[1 - HELD :], (focks, gradient)]
        mixed = _extrapolated(seen)
        occupied = [
            x @ np.linalg.eigh(x.T @ mixed[s] @ x)[1][:, :n] for s, n in enumerate(electrons)
        ]
    return Field(focks, electrons)


def _focks(
    bare: Floats, values: Floats, potentials: Potentials, occupied: Sequence[Floats]
) -> tuple[Floats, Floats]:
    """Fock matrices of the occupied orbitals of either spin, each of shape (n, occupied)."""
    weights = potentials.grid.weights
    on_grid = [c.T @ values for c in occupied]
    density = sum((phi**2).sum(axis=0) for phi in on_grid)
    density = potentials.grid.scaled(density, sum(len(phi) for phi in on_grid))
    fock = bare + (values * (weights * potentials(density[None])[0])) @ values.T
    up = fock - _exchange(values, potentials, occupied[0], on_grid[0])
    if np.array_equal(occupied[0], occupied[1]):
        return up, up
    return up, fock - _exchange(values, potentials, occupied[1], on_grid[1])


def _exchange(values: Floats, potentials: Potentials, occupied: Floats, phi: Floats) -> Floats:
    """Exchange operator of the orbitals (values ``phi`` on the grid), shape (n, n)."""
    if not len(phi):
        return np.zeros((len(occupied), len(occupied)))
    exchanged = np.zeros_like(phi)
    for i in range(len(phi)):
        pairs = potentials(phi[i] * phi[i:])
        exchanged[i] += (phi[i:] * pairs).sum(axis=0)
        exchanged[i + 1 :] += phi[i] * pairs[1:]
    done = (values * potentials.grid.weights) @ exchanged.T
    among = occupied.T @ done
    found: Floats = done @ np.linalg.solve(0.5 * (among + among.T), done.T)
    return found


def _extrapolated(
    seen: Sequence[tuple[tuple[Floats, Floats], Floats]],
) -> tuple[Floats, Floats]:
    """The combination of Fock matrices whose gradient is smallest."""
    count = len(seen)
    products = np.array([[one @ two for _, two in seen] for _, one in seen])
    matrix = -np.ones((count + 1, count + 1))
    matrix[:count, :count] = products / products.max()
    matrix[count, count] = 0.0
    right = np.zeros(count + 1)
    right[count] = -1.0
    parts = np.linalg.lstsq(matrix, right, rcond=None)[0][:count]
    both = [sum(p * focks[s] for p, (focks, _) in zip(parts, seen, strict=True)) for s in (0, 1)]
    return np.asarray(both[0]), np.asarray(both[1])
