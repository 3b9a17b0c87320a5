"""The atoms of a set: each block's energy, and how it changes with the block's numbers."""

from collections import OrderedDict
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property
from hashlib import sha256
from typing import Any, NamedTuple, TypeVar

import numpy as np

from overlapse.grammar.model import Block, Floats, Shell
from overlapse.rules.physics.atom import CYCLES, Solution, solve, too_few
from overlapse.rules.physics.configuration import Configuration, configuration, filled, known
from overlapse.rules.physics.onecentre import self_overlap
from overlapse.rules.physics.radial import Integrals, kinetic
from overlapse.rules.physics.response import Handle, Response, gradient, response

Found = TypeVar("Found")

# More primitives of one l than this would take longer than an audit has.
_MOST = 64
_TRIAL = 4  # iterations that tell which of several changes lowers the energy


class _Memory:
    """Results of atoms by their numbers; those unused for longest are forgotten first.

    A set is judged again after every keystroke in an editor, and most of its elements are as they
    were.  most: bytes of second derivatives, by far the largest part, that are kept.
    """

    def __init__(self, most: int) -> None:
        self.most = most
        self.size = 0
        self._kept: OrderedDict[bytes, tuple[int, dict[str, Any]]] = OrderedDict()

    def of(self, key: bytes, size: int) -> dict[str, Any]:
        """The results under a key, where about ``size`` bytes may come to be kept."""
        if key in self._kept:
            self._kept.move_to_end(key)
        else:
            self._kept[key] = (size, {})
            self.size += size
            while self.size > self.most and len(self._kept) > 1:
                self.size -= self._kept.popitem(last=False)[1][0]
        return self._kept[key][1]

    def clear(self) -> None:
        self._kept.clear()
        self.size = 0


MEMORY = _Memory(96_000_000)


class Number(NamedTuple):
    """A printed number of a block: 0-based shell and row, and the column of a coefficient."""

    shell: int
    row: int
    column: int | None = None


@dataclass(eq=False)
class Atom:
    """A block whose atom can be computed.

    exponents: for each occupied l the distinct ones, falling, bohr**-2.  functions: normalised
    contractions over them, shape (nprim, ncontr).  owners: shell and column of each function.
    start: orbitals over the functions to begin with, where some are at hand.
    """

    block: Block
    shells: Configuration
    exponents: dict[int, Floats]
    functions: dict[int, Floats]
    owners: dict[int, list[tuple[int, int]]]
    start: dict[int, Floats] | None = None

    def value(self, number: Number) -> float:
        """A printed number's value in the model."""
        return self.block.shells[number.shell].number(number.row, number.column)

    def changed(self, number: Number, value: float) -> "Atom | None":
        """The same atom with another value for one number; None where none can be computed."""
        old = self.block.shells[number.shell]
        exponents, coefficients = old.exponents.copy(), old.coefficients.copy()
        if number.column is None:
            exponents[number.row] = value
        else:
            coefficients[number.row, number.column] = value
        shells = list(self.block.shells)
        shells[number.shell] = Shell(old.angular, exponents, coefficients, old.line)
        made = atom_of(replace(self.block, shells=tuple(shells)), self.shells)
        if made is None:
            return None
        if self._same_places(made):
            made.__dict__["numbers"] = self.numbers
        elif list(made.numbers) != list(self.numbers):
            return None
        if number.column is not None:
            made.__dict__["integrals"] = self.integrals
        if self.solution is not None and self.solution.converged:
            made.start = self.solution.orbitals
        return made

    def _same_places(self, made: "Atom") -> bool:
        """Whether an atom with one number changed has every primitive in its old place."""
        return made.owners == self.owners and all(
            len(made.exponents[l]) == len(old) and np.count_nonzero(made.exponents[l] != old) < 2
            for l, old in self.exponents.items()
        )

    def tried(self, number: Number, value: float) -> float | None:
        """About the energy with another value for one number: a few iterations from our orbitals.

        hartree; None where there is no such atom.
        """
        made = self.changed(number, value)
        found = made and made._solved(made.functions, made.start, _TRIAL)
        return found.energy if found else None

    @cached_property
    def integrals(self) -> Integrals:
        return Integrals(self.exponents, self.shells)

    def forget(self) -> None:
        """Give the integrals' memory back; they are made again where they are needed."""
        self.__dict__.pop("integrals", None)

    @cached_property
    def _memory(self) -> dict[str, Any]:
        """What was found for an atom of just these numbers."""
        digest = sha256(f"{self.shells.charge} {self.shells.text}".encode())
        numbers = 0
        for shell in self.block.shells:
            digest.update(repr((shell.angular, shell.coefficients.shape)).encode())
            digest.update(shell.exponents.tobytes())
            digest.update(shell.coefficients.tobytes())
            numbers += len(shell.exponents) + int(np.count_nonzero(shell.coefficients))
        return MEMORY.of(digest.digest(), 4000 + 8 * numbers**2)

    def once(self, name: str, make: Callable[[], Found]) -> Found:
        """A result that is remembered for all atoms of the same numbers."""
        if name not in self._memory:
            self._memory[name] = make()
        return self._memory[name]  # type: ignore[no-any-return]

    @cached_property
    def solution(self) -> Solution | None:
        """The atom in the functions of the block; None where they are dependent or absurd."""
        if self.start is not None:
            return self._solved(self.functions, self.start)
        return self.once("solution", lambda: self._solved(self.functions))

    @cached_property
    def uncontracted(self) -> Solution | None:
        """The atom in the block's primitives, each by itself."""
        each = {l: np.eye(len(a)) for l, a in self.exponents.items()}
        return self.once("uncontracted", lambda: self._solved(each))

    def _solved(
        self,
        functions: dict[int, Floats],
        start: dict[int, Floats] | None = None,
        cycles: int = CYCLES,
    ) -> Solution | None:
        try:
            return solve(self.integrals, functions, start, cycles)
        except (ValueError, np.linalg.LinAlgError, FloatingPointError):
            return None

    @property
    def energy(self) -> float | None:
        """Energy of the ground term in the block's functions, hartree, if it was found."""
        found = self.solution
        return found.energy if found is not None and found.converged else None

    @cached_property
    def loss(self) -> float | None:
        """What contraction costs, hartree: the energy less that of the primitives by themselves."""
        bare = self.uncontracted
        if self.energy is None or bare is None or not bare.converged:
            return None
        return max(0.0, self.energy - bare.energy)

    @property
    def gap(self) -> float | None:
        """How far the energy lies above the Hartree-Fock limit, as a share of it."""
        if self.energy is None:
            return None
        return (self.energy - self.shells.limit) / abs(self.shells.limit)

    @property
    def share_lost(self) -> float | None:
        """What contraction costs, as a share of the Hartree-Fock limit."""
        return None if self.loss is None else self.loss / abs(self.shells.limit)

    @cached_property
    def scaling(self) -> float | None:
        """Factor on all lengths' inverse that would lower the energy most; 1 by the virial theorem.

        E(f) = f**2 T + f V is least at f = -V / 2T, the exponents being scaled by f**2.  Functions
        that were made for the nuclear charge Z' have f near Z / Z'.  Source: P.-O. Loewdin, J. Mol.
        Spectrosc. 3, 46 (1959).
        """
        return self.once("scaling", self._scaling)

    def _scaling(self) -> float | None:
        if self.energy is None or self.solution is None:
            return None
        moving = 0.0
        for l, over in self.solution.orbitals.items():
            v = self.functions[l] @ over
            matrix = kinetic(self.exponents[l], self.exponents[l], l)
            moving += float(np.einsum("ai,ab,bi,i", v, matrix, v, self.shells.electrons[l]))
        return (moving - self.energy) / (2.0 * moving) if moving > 0.0 else None

    @cached_property
    def filled(self) -> "Atom | None":
        """The same functions with a full 4s shell, where the ground state has it half empty."""
        shells = filled(self.shells.charge)
        return None if shells is None else atom_of(self.block, shells)

    @cached_property
    def numbers(self) -> dict[Number, Handle]:
        """The printed numbers that the energy depends on."""
        found: dict[Number, Handle] = {}
        acting: dict[Number, dict[tuple[int, int], list[int]]] = {}
        for l, owners in self.owners.items():
            places = {value: at for at, value in enumerate(self.exponents[l].tolist())}
            for function, (index, column) in enumerate(owners):
                shell = self.block.shells[index]
                used = np.flatnonzero(shell.coefficients[:, column]).tolist()
                for row in used:
                    place = places[float(shell.exponents[row])]
                    parts = acting.setdefault(Number(index, row), {})
                    parts.setdefault((l, place), []).append(function)
                    if len(used) > 1:
                        parts = acting.setdefault(Number(index, row, column), {})
                        parts.setdefault((l, place), []).append(function)
        for number, placed in acting.items():
            parts_of = tuple((l, place, tuple(who)) for (l, place), who in placed.items())
            found[number] = Handle(number.column is None, parts_of)
        return found

    @cached_property
    def response(self) -> Response | None:
        """Derivatives of the energy by all `numbers`."""
        found = self.solution
        if self.energy is None or found is None:
            return None
        handles = list(self.numbers.values())
        return self.once(
            "response",
            lambda: response(self.integrals, self.functions, found.orbitals, handles),
        )

    @cached_property
    def gradient(self) -> Floats | None:
        """First derivatives of the energy by all `numbers`, several times as fast as both."""
        if self.energy is None or self.solution is None:
            return None
        handles = list(self.numbers.values())
        return gradient(self.integrals, self.functions, self.solution.orbitals, handles)


def atom_of(block: Block, shells: Configuration | None = None) -> Atom | None:
    """The atom of a block, or None where there is none to compute; ``shells``: not those of its
    ground state.

    There is none beyond krypton, beside a core potential, for a block that was not read whole or
    lacks functions, and for numbers that no energy can be computed from.
    """
    z = block.atomic_number
    if not known(z) or block.potential is not None or not block.complete:
        return None
    shells = shells or configuration(z)
    exponents: dict[int, Floats] = {}
    functions: dict[int, Floats] = {}
    owners: dict[int, list[tuple[int, int]]] = {}
    for l in shells.electrons:
        members = [(s, f) for s, f in block.functions_of(l) if len(f.exponents)]
        if not members:
            return None
        every = np.concatenate([f.exponents for _, f in members])
        if not (every.min() > 1e-8 and every.max() < 1e14):
            return None
        distinct = np.unique(every)[::-1]
        table = np.zeros((len(distinct), len(members)))
        for column, (_, f) in enumerate(members):
            norm = self_overlap(f.exponents, f.coefficients, l)
            if not (np.isfinite(norm) and norm > 0.0):
                return None
            # Positions in falling order; an exponent that stands twice adds up.
            places = len(distinct) - 1 - np.searchsorted(distinct[::-1], f.exponents)
            np.add.at(table[:, column], places, f.coefficients / np.sqrt(norm))
        exponents[l], functions[l] = distinct, table
        owners[l] = [(s, f.column) for s, f in members]
    if too_few(functions, shells) is not None or max(map(len, exponents.values())) > _MOST:
        return None
    return Atom(block, shells, exponents, functions, owners)
