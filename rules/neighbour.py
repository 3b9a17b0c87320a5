"""Blocks against those of other elements: are these numbers the element's own?"""

from collections.abc import Iterator
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from overlapse.grammar.elements import row_of
from overlapse.grammar.model import BasisSet, Block, Floats, letter_of
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.physics.onecentre import primitive_overlap
from overlapse.rules.physics.trends import quantile
from overlapse.rules.registry import rule


@rule("shell.neighbour")
def neighbour(case: Case, *, likeness: float = 1e-3, share: float = 0.8) -> Iterator[Finding]:
    """Suspect: a block holds the numbers of another element, or its columns are exchanged.

    When a file is put together by hand a block is copied from the element beside it and its
    numbers are forgotten, or two elements change places.  Everything reads well, every norm is
    right, and every energy is that of a wrong atom.  Exponents rise with the nuclear charge, from
    each element to the next; where nearly all fall, two elements were exchanged.  Columns of a
    general contraction that change places span the same space, but whoever takes the first for 1s
    is misled.

    Formula: sign of the differences of ln(exponent) at the same places of neighbouring elements;
    overlap of each column with those of the neighbours, exponents scaled to each other.

    Source: scaling of exponents with the nuclear charge: W. J. Hehre, R. F. Stewart, J. A. Pople,
    J. Chem. Phys. 51, 2657 (1969).

    Limits: likeness: relative difference below which two numbers count as equal.  share: the part
    of the exponents that must fall from one element to the next.

    Remedy: restore the numbers of the element from the source.

    Bad::

        C 0
        S 2 1.00
          71.6 0.60
          13.0 0.50
        ****
        N 0
        S 2 1.00
          71.6 0.60
          13.0 0.50
        ****

    Good::

        C 0
        S 2 1.00
          71.6 0.60
          13.0 0.50
        ****
        N 0
        S 2 1.00
          99.1 0.60
          18.1 0.50
        ****
    """
    for members in case.sets:
        blocks = {block.atomic_number: block for block in reversed(members.blocks)}
        ordered = [blocks[z] for z in sorted(blocks) if blocks[z].shells]
        copies = dict(_copies(ordered, likeness))
        for at, other in copies.items():
            yield _copied(case, ordered, at, other)
        yield from _pairs(case, ordered, set(copies) | set(copies.values()), share)
        yield from _columns(case, members)


# ---- equal blocks


def _copies(blocks: list[Block], likeness: float) -> Iterator[tuple[int, int]]:
    """Blocks whose contractions are nearly all those of an earlier one: (index, index of it)."""
    seen: dict[tuple[int, str, str], int] = {}
    for at, block in enumerate(blocks):
        ends = [
            (len(shell.exponents), float(shell.exponents[0]), float(shell.exponents[-1]))
            for shell in block.shells
            if len(shell.exponents) > 1
        ]
        keys = [(count, f"{first:.2e}", f"{last:.2e}") for count, first, last in ends]
        # Blocks of lone primitives (fragments, fitting sets) share them in good faith.
        if not keys:
            continue
        same = [seen[key] for key in keys if key in seen]
        if 2 * len(same) > len(keys):
            other = max(set(same), key=same.count)
            if same.count(other) * 2 > len(keys) and _is_alike(block, blocks[other], likeness):
                yield at, other
        for key in keys:
            seen.setdefault(key, at)


def _is_alike(block: Block, other: Block, likeness: float) -> bool:
    """Whether more than half of the contracted shells have equal numbers."""
    shells = [shell for shell in block.shells if len(shell.exponents) > 1]
    return 2 * sum(
        any(
            left.angular == right.angular
            and left.coefficients.shape == right.coefficients.shape
            and np.allclose(left.exponents, right.exponents, likeness, 0.0)
            and np.allclose(left.coefficients, right.coefficients, likeness, 1e-6)
            for right in other.shells
        )
        for left in shells
    ) > len(shells)


def _copied(case: Case, blocks: list[Block], at: int, other: int) -> Finding:
    # Of two equal blocks that one is the copy whose step to the element beyond is the odder one.
    first, second = sorted((at, other))
    steps = [
        _step(blocks[left], blocks[right])
        for left, right in ((first - 1, first), (second, second + 1))
        if left >= 0 and right < len(blocks)
    ]
    known = [abs(step - _USUAL_STEP) for step in steps if step is not None]
    told = ""
    if len(known) == 2 and max(known) > 2.0 * min(known) + 0.2:
        copy, origin = (first, second) if known[0] > known[1] else (second, first)
        told = f"; they fit {blocks[origin].symbol}"
    else:
        copy, origin = second, first
    block, source = blocks[copy], blocks[origin]
    return case.at_line(
        block.line,
        "warning",
        f"suspect: {block.symbol} holds the numbers of {source.symbol} (line {source.line}){told}",
        element=block.symbol,
        measured=0.0,
        witnesses=("equal exponents and coefficients",),
        remedy=f"restore the numbers of {block.symbol} from the source",
    )


# ---- elements exchanged

# ln(exponent) rises about twice as fast as ln Z.
_USUAL_STEP = 2.2


def _step(left: Block, right: Block) -> float | None:
    """Rise of ln(exponent) for ln Z from one block to the next; None where they do not match."""
    rises = _rises(left, right)
    if rises is None:
        return None
    return quantile(rises.tolist(), 0.5)


def _rises(left: Block, right: Block) -> Floats | None:
    """Rise of ln(exponent) for ln Z, place by place, in the contractions that both have."""
    there = dict(zip(right.names, right.shells, strict=True))
    parts = []
    for least in (2, 1):
        for name, shell in zip(left.names, left.shells, strict=True):
            other = there.get(name)
            if other is None or len(other.exponents) != len(shell.exponents):
                continue
            positive = (shell.exponents > 0.0).all() and (other.exponents > 0.0).all()
            if len(shell.exponents) >= least and positive:
                parts.append(np.log(other.exponents / shell.exponents))
        if parts:
            break
    if not parts:
        return None
    return np.asarray(
        np.concatenate(parts) / np.log(right.atomic_number / left.atomic_number), dtype=np.float64
    )


def _pairs(case: Case, blocks: list[Block], told: set[int], share: float) -> Iterator[Finding]:
    """Neighbours whose exponents nearly all fall where they should rise."""
    falling = []
    judged = 0
    for at in range(len(blocks) - 1):
        left, right = blocks[at], blocks[at + 1]
        z = left.atomic_number
        if right.atomic_number - z > 2 or row_of(z) != row_of(right.atomic_number):
            continue
        rises = _rises(left, right)
        if rises is None or len(rises) < 3:
            continue
        judged += 1
        # Exchanged exponents fall as steeply as they ought to rise; half of all published
        # neighbours rise by more than 2.4, one in a hundred by more than 5.
        is_steep = -2.2 * _USUAL_STEP < quantile(rises.tolist(), 0.5) < -0.6 * _USUAL_STEP
        if is_steep and (rises < 0.0).mean() >= share and not {at, at + 1} & told:
            falling.append((left, right, float((rises < 0.0).mean()), len(rises)))
    if not falling or len(falling) > max(1, judged // 8):
        return
    for left, right, part, count in falling:
        for block, partner in ((left, right), (right, left)):
            yield case.at_line(
                block.line,
                "warning",
                f"suspect: {100 * part:.0f} % of {count} exponents fall from {left.symbol} to "
                f"{right.symbol} where they should rise with the nuclear charge: "
                f"{block.symbol} and {partner.symbol} (line {partner.line}) exchanged?",
                element=block.symbol,
                measured=round(part, 3),
                limit=share,
                witnesses=("exponents of other neighbours rise",),
                remedy="compare both blocks with the source",
            )


# ---- columns


class _Shape(NamedTuple):
    """The columns of one l of a general contraction, normalised: exponents and coefficients."""

    block: Block
    shell: int
    l: int
    exponents: Floats
    coefficients: Floats


def _columns(case: Case, members: BasisSet) -> Iterator[Finding]:
    """Columns that resemble another column of the neighbours, or lone ones out of order."""
    places: dict[tuple[int, str], dict[int, _Shape]] = {}
    for block in members.blocks:
        for index, shell in enumerate(block.shells):
            if shell.columns_per_l < 2 or len(shell.angular) > 1:
                continue
            if not (shell.exponents > 0.0).all():
                continue
            shape = _Shape(block, index, shell.angular[0], shell.exponents, shell.normalised())
            if np.isfinite(shape.coefficients).all():
                key = shape.l, block.names[index]
                places.setdefault(key, {}).setdefault(block.atomic_number, shape)
    shapes = [shape for row in places.values() for shape in row.values()]
    is_ordered = [_lone_in_order(shape) for shape in shapes]
    strict = len(is_ordered) >= 5 and sum(is_ordered) >= 0.9 * len(is_ordered)
    for row in places.values():
        for z, shape in row.items():
            near = sorted((y for y in row if y != z and abs(y - z) <= 8), key=lambda y: abs(y - z))
            alike = [y for y in near if row[y].coefficients.shape == shape.coefficients.shape]
            pair = _crossed(shape, [row[y] for y in (alike if len(alike) > 1 else near)[:4]])
            if pair is None and strict:
                pair = _lone_crossed(shape)
            if pair is not None:
                yield _exchanged(case, shape, pair)


def _crossed(shape: _Shape, others: list[_Shape]) -> tuple[int, int] | None:
    """Two columns each of which is the other in at least two neighbours, and itself in none."""
    votes: dict[tuple[int, int], int] = {}
    straight: set[int] = set()
    for other in others:
        # The tightest primitives scale with the square of the charge; so do all others nearly.
        scale = shape.exponents.max() / other.exponents.max()
        overlap = np.abs(
            shape.coefficients.T
            @ primitive_overlap(shape.exponents, other.exponents * scale, shape.l)
            @ other.coefficients
        )
        best = overlap.argmax(axis=1)
        for i, j in enumerate(best.tolist()):
            if i == j:
                straight.add(i)
            elif i < j < len(best) and best[j] == i and min(overlap[i, j], overlap[j, i]) > 0.8:
                votes[i, j] = votes.get((i, j), 0) + 1
    for (i, j), count in votes.items():
        if count >= 2 and i not in straight and j not in straight:
            return i, j
    return None


def _lone_rows(shape: _Shape) -> list[tuple[int, int]]:
    """(row, column) of the columns that hold one primitive only."""
    used = shape.coefficients != 0.0
    return [
        (int(used[:, column].argmax()), column)
        for column in range(used.shape[1])
        if used[:, column].sum() == 1
    ]


def _lone_in_order(shape: _Shape) -> bool:
    return _lone_crossed(shape) is None


def _lone_crossed(shape: _Shape) -> tuple[int, int] | None:
    lone = _lone_rows(shape)
    for (row, column), (after, next_column) in pairwise(lone):
        if shape.exponents[row] < shape.exponents[after]:
            return column, next_column
    return None


def _exchanged(case: Case, shape: _Shape, pair: tuple[int, int]) -> Finding:
    return case.at_shell(
        shape.block,
        shape.shell,
        "warning",
        f"suspect: columns {pair[0] + 1} and {pair[1] + 1} of these {letter_of(shape.l)} functions "
        "stand in another order than in the other elements",
        row=0,
        column=pair[0],
        measured=pair[0] + 1,
        expected=pair[1] + 1,
        witnesses=("each of the two is like the other one of the neighbours",),
        remedy="put the columns in the order of the other elements",
    )
