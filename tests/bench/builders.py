"""Builders of small systems whose basis sets are more or less dependent.

Published sets come from PySCF's wheel; what makes them dependent (near-twins, diffuse functions,
squeezed distances, doubled contractions) is added here.  Distances in angstrom, exponents in
bohr**-2.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from math import cos, pi, sin
from typing import Any

import numpy as np
from pyscf import gto

from overlapse.grammar.elements import number_of
from overlapse.grammar.model import Block, Shell
from overlapse.rules.physics.placed import Placed, lay_out

Shells = list[Any]  # one list per shell: l, then rows of exponent and coefficients
Basis = dict[str, Shells]
Atoms = list[tuple[str, tuple[float, float, float]]]


@dataclass(frozen=True)
class System:
    """One system: atoms (angstrom), basis by element, charge, unpaired electrons, functions."""

    name: str
    atoms: Atoms
    basis: Basis
    spin: int = 0
    charge: int = 0
    cartesian: bool = False

    def molecule(self, turned: bool = False) -> gto.Mole:
        """The oracle's molecule; ``turned`` moves all roundings."""
        atoms = [(s, _turn(p) if turned else p) for s, p in self.atoms]
        return gto.M(
            atom=atoms,
            basis=self.basis,
            spin=self.spin,
            charge=self.charge,
            cart=self.cartesian,
            verbose=0,
        )


def _turn(p: tuple[float, float, float]) -> tuple[float, float, float]:
    (c, s), (d, t) = (cos(0.7), sin(0.7)), (cos(1.1), sin(1.1))
    x, y, z = c * p[0] - s * p[1], s * p[0] + c * p[1], p[2]
    return x, d * y - t * z, t * y + d * z


# ---- geometries


def chain(symbols: Iterable[str], distance: float) -> Atoms:
    return [(s, (0.0, 0.0, k * distance)) for k, s in enumerate(symbols)]


def ring(symbols: Iterable[str], distance: float) -> Atoms:
    """A regular polygon with ``distance`` between neighbours."""
    members = list(symbols)
    n = len(members)
    radius = 0.5 * distance / sin(pi / n)
    angles = [2.0 * pi * k / n for k in range(n)]
    return [
        (s, (radius * cos(a), radius * sin(a), 0.0)) for s, a in zip(members, angles, strict=True)
    ]


def cube(even: str, odd: str, edge: float) -> Atoms:
    corners = [(x, y, z) for x in (0, 1) for y in (0, 1) for z in (0, 1)]
    return [(odd if sum(c) % 2 else even, tuple(edge * k for k in c)) for c in corners]  # type: ignore[misc]


def octahedron(symbol: str, radius: float) -> Atoms:
    ends = [(s * (k == 0), s * (k == 1), s * (k == 2)) for k in range(3) for s in (-1, 1)]
    return [(symbol, (radius * x, radius * y, radius * z)) for x, y, z in ends]


def centred(centre: str, symbol: str, distance: float) -> Atoms:
    """A tetrahedral molecule."""
    r = distance / 3**0.5
    ends = [(1, 1, 1), (1, -1, -1), (-1, 1, -1), (-1, -1, 1)]
    return [(centre, (0.0, 0.0, 0.0)), *((symbol, (r * x, r * y, r * z)) for x, y, z in ends)]


def squeezed(atoms: Atoms, factor: float) -> Atoms:
    return [(s, (factor * x, factor * y, factor * z)) for s, (x, y, z) in atoms]


def moved(atoms: Atoms, x: float, y: float, z: float) -> Atoms:
    return [(s, (a + x, b + y, c + z)) for s, (a, b, c) in atoms]


def water(at: float = 0.0) -> Atoms:
    return [("O", (at, 0.0, 0.0)), ("H", (at, 0.757, 0.587)), ("H", (at, -0.757, 0.587))]


def ammonia() -> Atoms:
    return [("N", (0.0, 0.0, 0.116)), *moved(ring("HHH", 1.623), 0.0, 0.0, -0.27)]


def benzene() -> Atoms:
    return [*ring("CCCCCC", 1.395), *ring("HHHHHH", 2.479)]


def ethene() -> Atoms:
    ends = [(s * 1.232, t * 0.923) for s in (-1, 1) for t in (-1, 1)]
    return [
        ("C", (-0.667, 0.0, 0.0)),
        ("C", (0.667, 0.0, 0.0)),
        *(("H", (x, y, 0.0)) for x, y in ends),
    ]


# ---- basis sets


def published(*names: str, **elements: str) -> Basis:
    """``published("cc-pvdz", "O", "H")``; keywords give single elements a set of their own."""
    basis = {symbol: gto.basis.load(names[0], symbol) for symbol in names[1:]}
    basis.update({symbol: gto.basis.load(name, symbol) for symbol, name in elements.items()})
    return basis


def twins(basis: Basis, symbols: str, l: int, exponent: float, ratio: float) -> Basis:
    """Two primitives of nearly equal exponents on each of the elements."""
    pair = [[l, [exponent, 1.0]], [l, [exponent * ratio, 1.0]]]
    return {s: [*b, *pair] if s in symbols.split() else b for s, b in basis.items()}


def diffuse(basis: Basis, symbols: str, steps: int = 1, factor: float = 0.3) -> Basis:
    """More diffuse functions for every l, each ``factor`` times the one before."""
    out = dict(basis)
    for symbol in symbols.split():
        least: dict[int, float] = {}
        for l, *rows in basis[symbol]:
            least[l] = min([row[0] for row in rows] + [least.get(l, 1e9)])
        more = [[l, [a * factor**k, 1.0]] for l, a in least.items() for k in range(1, steps + 1)]
        out[symbol] = [*basis[symbol], *more]
    return out


def even(l: int, count: int, middle: float, ratio: float) -> Shells:
    """An even-tempered series about the exponent ``middle``."""
    return [[l, [middle * ratio ** (0.5 * (count - 1) - k), 1.0]] for k in range(count)]


def doubled(basis: Basis, symbol: str, l: int, shift: float) -> Basis:
    """A second column in the longest contraction of one l that differs from the first a little."""
    shells = [list(shell) for shell in basis[symbol]]
    longest = max((s for s in shells if s[0] == l), key=len)
    rows = longest[1:]
    worked = [
        [row[0], row[1], row[1] * (1.0 + shift * (-1) ** k * (k + 1) / len(rows))]
        for k, row in enumerate(rows)
    ]
    shells[shells.index(longest)] = [l, *worked]
    return {**basis, symbol: shells}


# ---- the same system for our own integrals

BOHR = 0.529177210903  # angstrom, the oracle's value


def placed(system: System) -> tuple[list[Placed], list[int]]:
    """Atoms with their functions, and atomic numbers of the nuclei (0 for an empty centre)."""
    blocks = {}
    for symbol, shells in system.basis.items():
        made = []
        for l, *rows in sorted(shells, key=lambda shell: shell[0]):  # the oracle's order
            table = np.array(rows)
            made.append(Shell((l,), table[:, 0], table[:, 1:]))
        number = number_of(symbol.removeprefix("X-"))
        assert number is not None
        blocks[symbol] = Block(number, tuple(made))
    atoms, nuclei = [], []
    for symbol, (x, y, z) in system.atoms:
        position = (x / BOHR, y / BOHR, z / BOHR)
        atoms.append(Placed(blocks[symbol], position, not system.cartesian))
        nuclei.append(0 if symbol.startswith("X-") else blocks[symbol].atomic_number)
    return atoms, nuclei


def places(system: System) -> list[int]:
    """Where the oracle lists each of our functions: it has p functions as x, y, z, not y, z, x."""
    atoms, _ = placed(system)
    functions = lay_out(atoms)
    order = list(range(len(functions.l)))
    if not system.cartesian:
        for k, (l, m) in enumerate(zip(functions.l, functions.component, strict=True)):
            if l == 1:
                order[k] = k - (m + 1) + (1, 2, 0)[m + 1]
    return order
