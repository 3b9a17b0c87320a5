"""Molecules of PySCF and ours, side by side."""

from typing import Any

import numpy as np

from overlapse.grammar.elements import number_of
from overlapse.grammar.model import Block, Floats, Shell
from overlapse.rules.physics.placed import Placed, lay_out


def placed(molecule: Any) -> list[Placed]:
    """The atoms of a molecule (or cell) with their functions."""
    blocks: dict[str, Block] = {}
    atoms = []
    for index in range(molecule.natm):
        symbol = molecule.atom_symbol(index)
        if symbol not in blocks:
            shells = []
            for l, *rows in molecule._basis[symbol]:
                table = np.array(rows, dtype=float)
                shells.append(Shell((l,), table[:, 0], table[:, 1:]))
            number = number_of(symbol.rstrip("0123456789"))
            assert number is not None
            blocks[symbol] = Block(number, tuple(shells))
        position = tuple(map(float, molecule.atom_coord(index)))
        atoms.append(Placed(blocks[symbol], position, not molecule.cart))  # type: ignore[arg-type]
    return atoms


def in_its_order(matrix: Floats, molecule: Any, atoms: list[Placed]) -> Floats:
    """A matrix of ours in PySCF's order: by l within an atom, p functions as x, y, z."""
    functions = lay_out(atoms)
    component = functions.component.copy()
    if not molecule.cart:
        component += functions.l
        p = functions.l == 1
        component[p] = np.array([1, 2, 0])[component[p]]
    order = np.lexsort((component, functions.column, functions.shell, functions.l, functions.atom))
    result: Floats = matrix[..., order[:, None], order]
    return result


def unit_diagonal(matrix: Floats, molecule: Any) -> Floats:
    """PySCF's matrix with every function normalised; its Cartesian d to i functions are not."""
    scale = 1.0 / np.sqrt(np.diagonal(molecule.intor("int1e_ovlp")))
    result: Floats = matrix * scale[:, None] * scale
    return result
