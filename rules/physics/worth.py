"""What functions are worth: the energy that a molecule loses without them, in an approximate field.

The occupied orbitals are found in all functions and, with the same operator F = T + v, in those
that are kept.  The loss is the difference of the sums of their energies,

    sum over occupied i of  e_i (kept) - e_i (all),

to second order in what is missing that of the energy itself, but for the response of the field.
Where empty orbitals lie below occupied ones (`superposed.in_order` says why), F is lowered in the
space of the latter, so that they are the lowest and the loss is never negative.  The field is that
of the electron gas: it costs less, and what is asked for is a factor of a few.

It is a measure of what is harmless, no correction.  Of outermost functions, which are worth less
than a millihartree, it was mostly right within a factor of five beside real fields, and never too
small by more than three (tests/published/test_worth.py, tests/bench/pruned.py).

Source: energies in a space that grows, E. A. Hylleraas, B. Undheim, Z. Phys. 65, 759 (1930).
"""

from collections.abc import Sequence

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.molecule import (
    Field,
    affordable,
    filled,
    independent,
    molecular_field,
)
from overlapse.rules.physics.outlook import DIGITS, GAP
from overlapse.rules.physics.placed import Ints, Placed


class Worth:
    """The approximate field of one molecule, ready to tell what is lost without some functions.

    overlap, kinetic: matrices, shape (n, n), hartree, in the order of `placed.lay_out`.
    """

    def __init__(self, overlap: Floats, kinetic: Floats, field: Field) -> None:
        self._overlap = overlap
        x = independent(overlap, DIGITS)
        self._spins = []
        for spin, (fock, count) in enumerate(zip(field.focks, field.electrons, strict=True)):
            if count == 0:
                continue
            energies, orbitals = field.orbitals(spin, x, kinetic)
            occupied = overlap @ (x @ orbitals[:, :count])
            top, bottom = energies[:count].max(), energies[count:].min(initial=np.inf)
            lowered = 0.0 if top < bottom else top - bottom + GAP
            total = float(energies[:count].sum()) - lowered * count
            self._spins.append((fock - lowered * occupied @ occupied.T, count, total))

    def loss(self, kept: Ints) -> float:
        """Energy lost, hartree, where only the functions with these indices, shape (k,), stay.

        Infinite where they cannot hold the electrons.
        """
        part = np.ix_(kept, kept)
        x = independent(self._overlap[part], DIGITS)
        if x.shape[1] < max(count for _, count, _ in self._spins):
            return float("inf")
        return sum(
            max(0.0, float(np.linalg.eigvalsh(x.T @ fock[part] @ x)[:count].sum()) - total)
            for fock, count, total in self._spins
        )


def worth_of(
    atoms: Sequence[Placed],
    overlap: Floats,
    kinetic: Floats,
    *,
    empty: Sequence[int] = (),
    charge: int = 0,
    unpaired: int | None = None,
) -> Worth | None:
    """The field of placed atoms; None where none can be made: too large, a core potential.

    empty: indices of atoms that only carry functions.  charge: of the molecule.  unpaired:
    electrons, the fewest possible where None.
    """
    nuclei, pair = filled(atoms, empty, charge, unpaired)
    if (
        sum(pair) <= 0
        or any(atom.block.potential is not None for atom in atoms)
        or not affordable(atoms, len(overlap))
    ):
        return None
    if (np.linalg.eigvalsh(overlap) > DIGITS).sum() < pair[0]:
        return None
    field = molecular_field(atoms, nuclei, overlap, kinetic, pair, exchange=False)
    return Worth(overlap, kinetic, field)
