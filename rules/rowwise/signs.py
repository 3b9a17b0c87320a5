"""Signs of the coefficients of a contraction beside those of the same one in neighbouring elements.

The signs along a contraction tell the nodes of an orbital, and these are the same in corresponding
contractions of neighbouring elements.  The sign of a whole function is free.

Source: R. C. Raffenetti, J. Chem. Phys. 58, 4452 (1973) (contractions as the atom's orbitals).
"""

from collections import Counter
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar.elements import PERIODS
from overlapse.grammar.model import BasisSet, Block, Floats
from overlapse.rules.physics.prediction import FEWEST
from overlapse.rules.rowwise.rows import STRETCHES, nearest, stretch

# Coefficients smaller than this part of the largest have signs by chance.
_SMALL = 0.01
# How far ln|c| may lie from what the rows beside it suggest; larger, it is another number.
_ALIKE = 0.7


class OddSign(NamedTuple):
    """A coefficient whose sign breaks the pattern; beside: symbols of those that keep it."""

    block: Block
    shell: int
    row: int
    column: int
    beside: tuple[str, ...]


def odd_signs(members: BasisSet) -> list[OddSign]:
    """Coefficients that alone in their contraction have another sign than the neighbours' have.

    Only of elements that no row is there for; in a row a wrong sign falls out of its trend.
    """
    groups: dict[Any, dict[int, tuple[Block, int]]] = {}
    for block in members.blocks:
        z = block.atomic_number
        period = stretch(z, PERIODS)
        seen: dict[tuple[int, ...], int] = {}
        for index, shell in enumerate(block.shells):
            kind = shell.angular
            seen[kind] = seen.get(kind, -1) + 1
            if len(shell.exponents) < 3:
                continue
            used = (shell.coefficients != 0.0).tobytes()
            key = (period, kind, seen[kind], shell.coefficients.shape, used)
            groups.setdefault(key, {}).setdefault(z, (block, index))
    found: list[OddSign] = []
    for group in groups.values():
        if len(group) >= 2:
            found += _of_group(group)
    return found


def _of_group(group: dict[int, tuple[Block, int]]) -> list[OddSign]:
    tables = {z: block.shells[index].coefficients for z, (block, index) in group.items()}
    near = {z: nearest(z, group) for z in group}
    parts = {z: stretch(z, STRETCHES) for z in group}
    rows_there = Counter(part for part in parts.values() if part >= 0)
    in_rows = {z for z, part in parts.items() if rows_there[part] >= FEWEST}
    found = []
    for column in range(next(iter(tables.values())).shape[1]):
        rows = np.flatnonzero(next(iter(tables.values()))[:, column])
        if len(rows) < 3:
            continue
        values = {z: table[rows, column] for z, table in tables.items()}
        for z, others in near.items():
            if z in in_rows:
                continue
            at = _odd_one(z, others, values, near)
            if at is not None:
                beside = tuple(group[other][0].symbol for other in others)
                found.append(OddSign(*group[z], int(rows[at]), column, beside))
    return found


def _odd_one(
    z: int, others: list[int], values: dict[int, Floats], near: dict[int, list[int]]
) -> int | None:
    """The row (of those used) whose sign all neighbours contradict, where it is just one."""
    places = {_differing(values[z], values[other]) for other in others}
    if len(places) != 1 or None in places:
        return None
    (at,) = places
    assert at is not None
    if abs(values[z][at]) < _SMALL * np.abs(values[z]).max():
        return None
    if len(others) == 1:
        (other,) = others
        beyond = [far for far in near[other] if far != z]
        if beyond:
            # The neighbour is at fault where the one beyond contradicts it in the same place.
            return at if _differing(values[other], values[beyond[0]]) is None else None
        if _changes(values[z]) <= _changes(values[other]):
            return None
    return at


def _differing(values: Floats, others: Floats) -> int | None:
    """The one place where the signs differ though the sizes agree; None for none or several."""
    product = np.sign(values) * np.sign(others)
    if product.sum() < 0.0:
        product = -product
    places = np.flatnonzero(product < 0.0)
    if len(places) != 1:
        return None
    at = int(places[0])
    ratio = np.log(np.abs(values / others))
    around = [ratio[i] for i in (at - 1, at + 1) if 0 <= i < len(ratio)]
    return at if abs(ratio[at] - sum(around) / len(around)) < _ALIKE else None


def _changes(values: Floats) -> int:
    return int((np.diff(np.sign(values)) != 0.0).sum())
