"""Corresponding functions of neighbouring elements: what a row of the periodic table shows.

Functions correspond when they have the same l and the same place in blocks of one set and one
stretch of the periodic table whose functions of that l have the same contraction lengths.
"""

from collections.abc import Container, Iterator
from typing import NamedTuple

import numpy as np

from overlapse.grammar.elements import PERIODS
from overlapse.grammar.model import BasisSet, Block, Floats, Function
from overlapse.rules.physics.trends import FEWEST, Deviations, leave_one_out

# Stretches over which a family keeps its pattern and its numbers run smoothly.  The s block is
# left out: two elements show no trend, and their valence does not run on into the p block.
STRETCHES = (
    (5, 10), (13, 18), (21, 30), (31, 36), (39, 48), (49, 54), (58, 71), (72, 80), (81, 86),
    (90, 103), (104, 112), (113, 118),
)  # fmt: skip


class Member(NamedTuple):
    """A contracted function of a block: indices of block, shell, and the function itself."""

    block: int
    shell: int
    function: Function


class Row(NamedTuple):
    """Corresponding functions of several elements, by rising atomic number.

    exponents: deviations of ln(exponent), shape (elements, primitives).  coefficients: those of the
    coefficients.
    """

    numbers: tuple[int, ...]
    members: tuple[Member, ...]
    exponents: Deviations
    coefficients: Deviations


def stretch(z: int, stretches: tuple[tuple[int, int], ...]) -> int:
    """Index of the stretch that holds an element, -1 for none."""
    return next((at for at, (low, high) in enumerate(stretches) if low <= z <= high), -1)


def in_stretches(members: BasisSet) -> Iterator[tuple[int, Block]]:
    """The first block of each element of a stretch, with the index of the stretch."""
    seen: set[int] = set()
    for block in members.blocks:
        at = stretch(block.atomic_number, STRETCHES)
        if at >= 0 and block.atomic_number not in seen:
            seen.add(block.atomic_number)
            yield at, block


def nearest(z: int, group: Container[int], farthest: int = 2) -> list[int]:
    """The nearest element of a group on either side in the same period, where there is one."""
    found = []
    for side in (-1, 1):
        steps = (z + side * far for far in range(1, farthest + 1))
        other = next((other for other in steps if other in group), None)
        if other is not None and stretch(other, PERIODS) == stretch(z, PERIODS):
            found.append(other)
    return found


def rows_of(members: BasisSet, whole_periods: bool = False) -> list[Row]:
    """All rows of a set that have enough elements for a trend.

    ``whole_periods`` joins the s and d blocks to the p block; their numbers run on less smoothly,
    so such a row is good for comparing the numbers of one shell, not for a suspicion.
    """
    stretches = PERIODS if whole_periods else STRETCHES
    groups: dict[tuple[int, int, tuple[int, ...], int], dict[int, Member]] = {}
    for at, block in enumerate(members.blocks):
        part = stretch(block.atomic_number, stretches)
        ordered = _in_order(block)
        lengths: dict[int, tuple[int, ...]] = {}
        for _, function in ordered:
            lengths[function.l] = (*lengths.get(function.l, ()), len(function.exponents))
        seen: dict[int, int] = {}
        for shell, function in ordered:
            l = function.l
            seen[l] = seen.get(l, -1) + 1
            if (function.exponents > 0).all():
                key = (part, l, lengths[l], seen[l])
                groups.setdefault(key, {}).setdefault(
                    block.atomic_number, Member(at, shell, function)
                )
    return [_row(group) for key, group in groups.items() if len(group) >= FEWEST and key[0] >= 0]


def _in_order(block: Block) -> list[tuple[int, Function]]:
    """Contracted functions as they stand, those of one primitive by falling exponent.

    Files list lone primitives in either order.
    """
    used = [(shell, function) for shell, function in block.contracted if len(function.exponents)]
    several = [pair for pair in used if len(pair[1].exponents) > 1]
    lone = [pair for pair in used if len(pair[1].exponents) == 1]
    return several + sorted(lone, key=lambda pair: -float(pair[1].exponents[0]))


def _row(group: dict[int, Member]) -> Row:
    numbers = tuple(sorted(group))
    members = tuple(group[z] for z in numbers)
    logs = np.log([member.function.exponents for member in members])
    coefficients = np.array([_signed(member.function) for member in members])
    return Row(numbers, members, leave_one_out(numbers, logs), leave_one_out(numbers, coefficients))


def _signed(function: Function) -> Floats:
    """Coefficients with the overall sign that makes the loosest large one positive.

    The sign of a whole function is free; a printed set may turn it from element to element.
    """
    weights = np.abs(function.coefficients)
    large = np.flatnonzero(weights > 0.3 * weights.max())[-1]
    return np.asarray(np.sign(function.coefficients[large]) * function.coefficients)
