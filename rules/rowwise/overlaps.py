"""Overlaps of the contractions of one l with themselves and with each other, along the row.

Columns of a general contraction are orbitals of the atom: over the complete list of primitives they
are orthonormal, and what a printed set leaves out changes smoothly from element to element.  So do
the overlaps and norms of segmented contractions.  Such integrals carry no noise of single numbers,
since exponents and coefficients that were optimised together compensate each other.  A wrong
coefficient moves several of them at once, and in proportions that tell which coefficient it is.

Formula: S_jk = sum_ab c_ja c_kb <a|b> over normalised primitives; with a coefficient changed by d
S_jk changes by d sum_b c_kb <a|b>, and S_jj by twice that and d**2.
Sources: orbitals as contractions: R. C. Raffenetti, J. Chem. Phys. 58, 4452 (1973); orthonormality
of an atom's orbitals: C. C. J. Roothaan, Rev. Mod. Phys. 23, 69 (1951).
"""

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import BasisSet, Block, Floats, Function
from overlapse.rules.physics.onecentre import primitive_overlap
from overlapse.rules.physics.prediction import FEWEST, Predictions, predictions
from overlapse.rules.rowwise.rows import in_stretches

# Printed digits and rounding leave this much in an overlap.
_FINEST = 2e-5
_REST, _REST_SHARE = 2.0, 0.04
_LEAST_CHANGE = 0.008
# The norm of a single contraction is explained by any of its numbers, so it must be odder by this.
_SINGLE = 2.5


class OddOverlap(NamedTuple):
    """A coefficient that puts overlaps off their row; with another one all are in order.

    left, right: names of the contractions whose overlap departs most; overlap, usual: as it is and
    as the row suggests.  surprise: that departure in units of its spread.  rest: the largest that
    is left with the number ``expected``, which is uncertain by ``spread``.  others: elements that
    suggest it.
    """

    block: Block
    shell: int
    row: int
    column: int
    expected: float
    spread: float
    left: str
    right: str
    overlap: float
    usual: float
    surprise: float
    rest: float
    others: int

    @property
    def is_alone(self) -> bool:
        """Whether the one number explains all departures, and one slip could have made it."""
        value = self.block.shells[self.shell].number(self.row, self.column)
        ratio = value / self.expected if self.expected else 0.0
        is_slip = 0.5 < ratio < 2.0 or any(abs(ratio / r - 1.0) < 0.2 for r in (-1.0, 10.0, 0.1))
        # Sound numbers explain such departures too, by changes of less than this.
        is_large = abs(ratio - 1.0) > _LEAST_CHANGE
        return is_slip and is_large and self.rest < max(_REST, _REST_SHARE * self.surprise)


class _Member(NamedTuple):
    """Contractions of one l: (shell, function) of each, and their overlaps."""

    block: Block
    functions: tuple[tuple[int, Function], ...]
    signs: Floats
    overlap: Floats


def odd_overlaps(members: BasisSet, least: float) -> list[OddOverlap]:
    """Coefficients that put an overlap off its row by at least ``least``; of an l one at most."""
    groups: dict[tuple[int, int, tuple[int, ...]], dict[int, list[tuple[int, Function]]]] = {}
    blocks: dict[int, Block] = {}
    for at, block in in_stretches(members):
        z = block.atomic_number
        blocks[z] = block
        by_l: dict[int, list[tuple[int, Function]]] = {}
        for shell, function in block.contracted:
            if len(function.exponents) > 1:
                by_l.setdefault(function.l, []).append((shell, function))
        for l, functions in by_l.items():
            if all((f.exponents > 0.0).all() for _, f in functions):
                lengths = tuple(len(f.exponents) for _, f in functions)
                groups.setdefault((at, l, lengths), {})[z] = functions
    found: list[OddOverlap] = []
    for group in groups.values():
        if len(group) >= FEWEST:
            found += _of_group(group, blocks, least)
    return found


def _of_group(
    group: dict[int, list[tuple[int, Function]]], blocks: dict[int, Block], least: float
) -> Iterator[OddOverlap]:
    numbers = tuple(sorted(group))
    reference = [function for _, function in group[numbers[0]]]
    members = [_member(blocks[z], group[z], reference) for z in numbers]
    upper = np.triu_indices(len(reference))
    values = np.array([member.overlap[upper] for member in members])
    if not np.isfinite(values).all():
        return
    told = predictions(numbers, values, [], _FINEST, 1e-9, alike=False)
    limit = least * (_SINGLE if len(reference) == 1 else 1.0)
    for at in np.flatnonzero(told.surprise.max(axis=1) >= limit).tolist():
        if (odd := _explained(members[at], told, at, upper, len(numbers) - 1)) is not None:
            yield odd


def _member(
    block: Block, functions: list[tuple[int, Function]], reference: list[Function]
) -> _Member:
    """Overlaps with the signs that make the functions most like those of a reference element."""
    count = len(functions)
    signs = np.ones(count)
    for at, ((_, function), other) in enumerate(zip(functions, reference, strict=True)):
        if (np.sign(function.coefficients) * np.sign(other.coefficients)).sum() < 0.0:
            signs[at] = -1.0
    exponents = np.concatenate([function.exponents for _, function in functions])
    weights = np.zeros((count, len(exponents)))
    start = 0
    for at, (_, function) in enumerate(functions):
        end = start + len(function.exponents)
        weights[at, start:end] = signs[at] * function.coefficients
        start = end
    overlap = weights @ primitive_overlap(exponents, exponents, functions[0][1].l) @ weights.T
    return _Member(block, tuple(functions), signs, overlap)


def _explained(
    member: _Member,
    told: Predictions,
    at: int,
    upper: tuple[npt.NDArray[np.intp], ...],
    others: int,
) -> OddOverlap | None:
    """The coefficient whose change puts all overlaps of an element in order best."""
    count = len(member.functions)
    departure, spread = np.zeros((count, count)), np.zeros((count, count))
    departure[upper] = departure.T[upper] = told.departure[at]
    spread[upper] = spread.T[upper] = told.spread[at]
    surprise = np.abs(departure) / spread
    j0, k0 = np.unravel_index(int(surprise.argmax()), surprise.shape)
    best: tuple[float, int, int, float, float] | None = None
    for j in {int(j0), int(k0)}:
        _, own = member.functions[j]
        slopes = np.array(
            [
                member.signs[j] * member.signs[k]
                * (primitive_overlap(own.exponents, f.exponents, own.l) @ f.coefficients)
                for k, (_, f) in enumerate(member.functions)
            ]
        )  # fmt: skip
        slopes[j] *= 2.0
        weight = 1.0 / spread[j] ** 2
        size = (weight[:, None] * slopes**2).sum(axis=0)
        change = (weight[:, None] * slopes * departure[j][:, None]).sum(axis=0) / size
        for _ in range(3):
            # The square of the change in the norm.
            right = departure[j][:, None].repeat(len(change), axis=1)
            right[j] += change**2
            change = (weight[:, None] * slopes * right).sum(axis=0) / size
        left = departure[j][:, None] - slopes * change
        left[j] += change**2
        rest = np.abs(left / spread[j][:, None]).max(axis=0)
        elsewhere = np.delete(np.delete(surprise, j, axis=0), j, axis=1).max(initial=0.0)
        place = int(rest.argmin())
        found = (
            max(float(rest[place]), float(elsewhere)), j, place, float(change[place]),
            float(1.0 / np.sqrt(size[place])),
        )  # fmt: skip
        if best is None or found < best:
            best = found
    assert best is not None
    rest_left, j, place, by, error = best
    shell, function = member.functions[j]
    names = [
        f"{member.block.names[index]}/{f.column + 1}"
        if member.block.shells[index].coefficients.shape[1] > 1
        else member.block.names[index]
        for index, f in (member.functions[int(j0)], member.functions[int(k0)])
    ]
    return OddOverlap(
        member.block, shell, int(function.rows[place]), function.column,
        float(function.coefficients[place]) - by, error, names[0], names[1],
        float(member.overlap[j0, k0]), float(member.overlap[j0, k0] - departure[j0, k0]),
        float(surprise.max()), rest_left, others,
    )  # fmt: skip
