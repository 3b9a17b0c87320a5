"""The atoms of a set together: who can be compared with whom."""

from collections.abc import Callable
from functools import cached_property
from typing import TypeVar

from overlapse.grammar.elements import row_of
from overlapse.grammar.model import BasisSet
from overlapse.rules.atoms import Atom, atom_of
from overlapse.rules.case import Case, is_orbital
from overlapse.rules.columns import Column, Stray, columns_of, strays
from overlapse.rules.stationary import Steps, Usual, steps_of, usual

Found = TypeVar("Found")


class Ensemble:
    """The atoms of one set, by rising atomic number, and what is computed for them when asked."""

    def __init__(self, members: BasisSet, atoms: list[Atom]) -> None:
        self.members = members
        self.atoms = atoms

    @cached_property
    def _pattern(self) -> dict[int, tuple[object, ...]]:
        """What atoms must share to be compared: row, occupation of s shells, numbers in place."""
        return {
            id(atom): (
                row_of(atom.block.atomic_number),
                atom.shells.electrons[0],
                tuple(shell.angular for shell in atom.block.shells),
                tuple(atom.numbers),
            )
            for atom in self.atoms
        }

    def neighbours(self, atom: Atom) -> list[Atom]:
        """The other atoms of the row that have the same numbers in the same places."""
        own = self._pattern[id(atom)]
        return [
            other
            for other in self.atoms
            if other.block.atomic_number != atom.block.atomic_number
            and self._pattern[id(other)] == own
        ]

    @cached_property
    def _steps(self) -> dict[int, Steps]:
        found = ((atom, steps_of(atom)) for atom in self.atoms)
        return {id(atom): steps for atom, steps in found if steps is not None}

    def steps(self, atom: Atom) -> Steps | None:
        return self._steps.get(id(atom))

    def others(self, atom: Atom) -> list[Steps]:
        """Steps of the neighbours."""
        return [s for other in self.neighbours(atom) if (s := self.steps(other)) is not None]

    def usual(self, own: Steps) -> Usual:
        """What the steps of an atom should be, by its neighbours or by the whole set."""
        z = own.atom.block.atomic_number
        file = [
            steps
            for other in self.atoms
            if other.block.atomic_number != z and (steps := self.steps(other)) is not None
        ]
        return usual(own, self.others(own.atom), file)

    @cached_property
    def _columns(self) -> dict[int, list[Column]]:
        return {id(atom): columns_of(atom) for atom in self.atoms}

    def strays(self, atom: Atom) -> list[Stray]:
        """Coefficients of an atom that are not their orbital's."""
        return [stray for column, others in self.columns(atom) for stray in strays(column, others)]

    def columns(self, atom: Atom) -> list[tuple[Column, list[Column]]]:
        """The columns of an atom that are its orbitals, each with the same ones of neighbours."""
        near = [
            {column.numbers: column for column in self._columns[id(other)]}
            for other in self.neighbours(atom)
        ]
        return [
            (column, [table[column.numbers] for table in near if column.numbers in table])
            for column in self._columns[id(atom)]
        ]


def ensembles(case: Case) -> list[Ensemble]:
    """The sets of a document whose atoms can be computed; none unless energies are wanted."""
    if not case.energies:
        return []

    def make() -> list[Ensemble]:
        found = [_ensemble(case, members) for members in case.sets if is_orbital(members)]
        return [ensemble for ensemble in found if ensemble.atoms]

    return case.shared("atoms", make)


def _ensemble(case: Case, members: BasisSet) -> Ensemble:
    atoms = []
    for block in members.blocks:
        if any(case.is_faulty(block, index) for index in range(len(block.shells))):
            continue  # told already, and no number of the block is sure
        atom = atom_of(block)
        if atom is not None:
            atoms.append(atom)
    return Ensemble(members, sorted(atoms, key=lambda atom: atom.block.atomic_number))


def each(case: Case, judge: Callable[[Ensemble, Atom], Found | None]) -> list[Found]:
    """What a judge finds at the atoms of a document."""
    return [
        found
        for ensemble in ensembles(case)
        for atom in ensemble.atoms
        if (found := judge(ensemble, atom)) is not None
    ]
