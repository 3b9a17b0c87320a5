"""Atoms sorted by the functions they carry, and these by their angular momentum."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Block, Floats
from overlapse.rules.physics.placed import Ints, Placed, components, normalised_columns


@dataclass(frozen=True, eq=False)
class Group:
    """The contracted functions of one l of one atom.

    exponents: the union of those they use, shape (P,).  weights: shape (n, P).  place: index of
    each function's first component within the atom, shape (n,).
    """

    l: int
    exponents: Floats
    weights: Floats
    place: Ints
    spherical: bool

    @property
    def components(self) -> int:
        return components(self.l, self.spherical)


class Kind(NamedTuple):
    """Atoms with the same functions.

    members: indices of the atoms.  groups: by rising l.  size: functions of an atom.  order: where
    the functions, taken group by group, stand in the atom; None where that is their order anyway.
    """

    members: Ints
    groups: tuple[Group, ...]
    size: int
    order: Ints | None

    @property
    def top(self) -> int:
        return max((group.l for group in self.groups), default=0)


def kinds(atoms: Sequence[Placed]) -> list[Kind]:
    """The atoms sorted by what functions they carry, in order of first appearance.

    Raises `NotNormalisable` for a function that has no finite positive self-overlap.
    """
    known: dict[int, tuple[object, ...]] = {}
    found: dict[tuple[object, ...], list[int]] = {}
    for index, atom in enumerate(atoms):
        if id(atom.block) not in known:
            known[id(atom.block)] = tuple(
                (shell.angular, shell.exponents.tobytes(), shell.coefficients.tobytes())
                for shell in atom.block.shells
            )
        found.setdefault((atom.spherical, known[id(atom.block)]), []).append(index)
    made = []
    for members in found.values():
        first = atoms[members[0]]
        groups = _groups(first.block, first.spherical)
        order = _order(groups)
        made.append(Kind(np.array(members), groups, len(order), order))
        if np.array_equal(order, np.arange(len(order))):
            made[-1] = made[-1]._replace(order=None)
    return made


def _order(groups: tuple[Group, ...]) -> Ints:
    spread = [(g.place[:, None] + np.arange(g.components)).ravel() for g in groups]
    return np.concatenate(spread) if spread else np.zeros(0, dtype=np.intp)


@lru_cache(maxsize=128)
def _groups(block: Block, spherical: bool) -> tuple[Group, ...]:
    columns: dict[int, list[tuple[Floats, Floats, int]]] = {}
    at = 0
    for index, shell in enumerate(block.shells):
        table = normalised_columns(block, index)
        for column in range(table.shape[1]):
            l = shell.angular[column // shell.columns_per_l]
            used = table[:, column] != 0.0
            columns.setdefault(l, []).append((shell.exponents[used], table[used, column], at))
            at += components(l, spherical)
    groups = []
    for l, members in sorted(columns.items()):
        union = np.unique(np.concatenate([exponents for exponents, _, _ in members]))
        weights = np.zeros((len(members), len(union)))
        for row, (exponents, values, _) in enumerate(members):
            np.add.at(weights[row], np.searchsorted(union, exponents), values)
        places = np.array([place for *_, place in members])
        groups.append(Group(l, union, weights, places, spherical))
    return tuple(groups)
