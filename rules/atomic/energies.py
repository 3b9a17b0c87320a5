"""The atoms of a set together: who can be compared with whom."""

import re
from collections.abc import Iterable
from functools import cached_property

from overlapse.grammar.designated import Designation
from overlapse.grammar.elements import period_of, row_of
from overlapse.grammar.model import BasisSet
from overlapse.rules.atomic.atoms import Atom, atom_of
from overlapse.rules.atomic.columns import Column, Stray, columns_of, strays
from overlapse.rules.atomic.stationary import Steps, Usual, explanations, steps_of, usual
from overlapse.rules.case import Case, is_orbital
from overlapse.rules.labels.valence import innermost
from overlapse.rules.physics.trends import quantile

_FOREIGN = 0.5  # units of nuclear charge; published sets stay within 0.2
_ORDINARY = 1.3  # mean square of steps that are like those of the row
_WHOLE = 0.9  # share of 1s that sets for all electrons describe, see `valence`


class Ensemble:
    """The atoms of one set, by rising atomic number, and what is computed for them when asked.

    relativistic: the set was made for relativistic atoms, so ours can only compare neighbours.
    label: what the set is claimed to be, where that is understood.
    """

    def __init__(
        self,
        members: BasisSet,
        atoms: list[Atom],
        relativistic: bool = False,
        label: Designation | None = None,
    ) -> None:
        self.members = members
        self.label = label
        self.atoms = atoms
        self.relativistic = relativistic

    @cached_property
    def _pattern(self) -> dict[int, tuple[object, tuple[int, ...], int]]:
        """What atoms must share to be compared: row, occupation of s shells, numbers in place."""
        forms: dict[tuple[object, ...], int] = {}
        found: dict[int, tuple[object, tuple[int, ...], int]] = {}
        for atom in self.atoms:
            form = (tuple(shell.angular for shell in atom.block.shells), tuple(atom.numbers))
            found[id(atom.block)] = (
                row_of(atom.block.atomic_number),
                atom.shells.electrons[0],
                forms.setdefault(form, len(forms)),
            )
        return found

    def neighbours(self, atom: Atom) -> list[Atom]:
        """The other atoms of the row that have the same numbers in the same places.

        An atom that was found to go with its row beside another configuration has it as well.
        """
        found = self._alike(atom)
        joined = id(atom.block) in self._joined
        return [a for a in found if joined or self._occupied(a) == self._occupied(atom)]

    def _alike(self, atom: Atom) -> list[Atom]:
        """The atoms of the row with the same numbers, whatever they hold."""
        row, _, form = self._pattern[id(atom.block)]
        return [
            other
            for other in self.atoms
            if other.block.atomic_number != atom.block.atomic_number
            and self._pattern[id(other.block)][::2] == (row, form)
        ]

    def _occupied(self, atom: Atom) -> object:
        return self._pattern[id(atom.block)][1]

    def near(self, atom: Atom) -> list[Atom]:
        """The other elements of the row up to three places away."""
        z = atom.block.atomic_number
        return [
            other
            for other in self.atoms
            if 0 < abs(other.block.atomic_number - z) <= 3
            and row_of(other.block.atomic_number) == row_of(z)
        ]

    def foreign(self, atom: Atom) -> int | None:
        """The nuclear charge that a block seems made for, if it is another one by the energy."""
        if atom.scaling is None:
            return None
        z = atom.block.atomic_number
        near = [
            (other.scaling - 1.0) * other.block.atomic_number
            for other in self.near(atom)
            if other.scaling is not None
        ]
        if self.relativistic and len(near) < 2:
            return None
        usual = quantile(near, 0.5) if len(near) >= 2 else 0.0
        away = (atom.scaling - 1.0) * z - usual
        if abs(away) < _FOREIGN:
            return None
        made_for = round(z / (1.0 + away / z))
        return made_for if made_for != z and 1 <= made_for <= 118 else None

    @cached_property
    def ground_steps(self) -> dict[int, Steps]:
        """Steps of the ground states, by the identity of the block."""
        return self._computed(self.atoms)

    def _computed(self, atoms: Iterable[Atom]) -> dict[int, Steps]:
        found = {}
        for atom in atoms:
            steps = steps_of(atom)
            if steps is not None:
                found[id(atom.block)] = steps
            # All that the rules ask of the integrals; those of a whole set are too many to keep.
            _ = atom.uncontracted
            atom.forget()
        return found

    @cached_property
    def _joined(self) -> dict[int, Steps]:
        """Steps of atoms that go with their row, by the identity of the block.

        Of chromium and copper some sets are made for the ground state, others for the configuration
        of their neighbours.  The whole block decides: that one is taken which a single wrong number
        at most leaves with steps like those of the row.
        """
        found = {}
        for atom in self.atoms:
            other = atom.filled
            ground = self.ground_steps.get(id(atom.block))
            if other is None or ground is None:
                continue
            row = [
                self.ground_steps[id(a.block)]
                for a in self._alike(atom)
                if a.filled is None and id(a.block) in self.ground_steps
            ]
            if len(row) < 3:
                continue
            tried = []
            for steps in (ground, *self._computed([other]).values()):
                best = explanations(steps, usual(steps, row, [], []))[0]
                tried.append((best.after, steps))
            least, steps = min(tried, key=lambda each: each[0])
            if least < _ORDINARY * len(steps.numbers):
                found[id(atom.block)] = steps
        return found

    def steps(self, atom: Atom) -> Steps | None:
        """What an atom's energy does with its numbers, in the configuration it was made for."""
        return self._joined.get(id(atom.block)) or self.ground_steps.get(id(atom.block))

    def others(self, atom: Atom) -> list[Steps]:
        """Steps of the neighbours."""
        near = self.neighbours(atom)
        if id(atom.block) in self._joined:
            near = [other for other in near if other.filled is None]
        return [s for other in near if (s := self.steps(other)) is not None]

    def mates(self, atom: Atom) -> list[Steps]:
        """Steps of the other atoms of the period."""
        z = atom.block.atomic_number
        return [
            steps
            for other in self.atoms
            if other.block.atomic_number != z
            and period_of(other.block.atomic_number) == period_of(z)
            and (steps := self.steps(other)) is not None
        ]

    def usual(self, own: Steps) -> Usual:
        """What the steps of an atom should be, by its neighbours or by the whole set."""
        z = own.atom.block.atomic_number
        file = [
            steps
            for other in self.atoms
            if other.block.atomic_number != z and (steps := self.steps(other)) is not None
        ]
        return usual(own, self.others(own.atom), self.mates(own.atom), file)

    @cached_property
    def _columns(self) -> dict[int, list[Column]]:
        found = {}
        for atom in self.atoms:
            steps = self.steps(atom)
            found[id(atom.block)] = columns_of(steps.atom if steps is not None else atom)
        return found

    def strays(self, atom: Atom) -> list[Stray]:
        """Coefficients of an atom that are not their orbital's."""
        return [stray for column, others in self.columns(atom) for stray in strays(column, others)]

    def columns(self, atom: Atom) -> list[tuple[Column, list[Column]]]:
        """The columns of an atom that are its orbitals, each with the same ones of neighbours."""
        near = [
            {column.numbers: column for column in self._columns[id(other.block)]}
            for other in self.neighbours(atom)
        ]
        return [
            (column, [table[column.numbers] for table in near if column.numbers in table])
            for column in self._columns[id(atom.block)]
        ]


def ensembles(case: Case) -> list[Ensemble]:
    """The sets of a document whose atoms can be computed; none unless energies are wanted."""
    if not case.energies:
        return []

    def make() -> list[Ensemble]:
        found = [
            _ensemble(case, members, index)
            for index, members in enumerate(case.sets)
            if is_orbital(members) and not case.is_fitting(index)
        ]
        return [ensemble for ensemble in found if ensemble.atoms]

    return case.shared("atoms", make)


# Labels of sets whose contractions come from relativistic atoms.
_RELATIVISTIC = re.compile(r"DK|RCC|x2c|SARC|dyall|ZORA", re.IGNORECASE)


def _ensemble(case: Case, members: BasisSet, index: int) -> Ensemble:
    atoms = []
    for block in members.blocks:
        if any(case.is_faulty(block, index) for index in range(len(block.shells))):
            continue  # told already, and no number of the block is sure
        atom = atom_of(block)
        if atom is not None:
            atoms.append(atom)
    # Sets that mostly leave out the core are fragments, or stand beside potentials elsewhere.
    if sum(innermost(atom.block) > _WHOLE for atom in atoms) * 2 <= len(atoms):
        atoms = []
    claims = case.claims.get(index, [])
    return Ensemble(
        members,
        sorted(atoms, key=lambda atom: atom.block.atomic_number),
        any(_RELATIVISTIC.search(claim.label) for claim in claims),
        next((claim.designation for claim in claims if claim.designation is not None), None),
    )
