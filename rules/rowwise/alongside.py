"""A ladder of exponents beside that of a neighbouring element, or by itself.

The step of ln(exponent) from one element to the next changes slowly along a shell: tight primitives
take the same step to a few tenths of a per cent, and towards the valence it drifts smoothly.  So a
single number that slipped stands out in the step, also where no row of the periodic table is at
hand: hydrogen and helium, the s block, files of a few elements.  Each step is compared with the
four steps around it, and their own range is the scale.

Where there is no neighbour either, ln(exponent) itself is compared with low-order Legendre
polynomials through the other exponents of its shell.

Sources: G. A. Petersson, S. Zhong, J. A. Montgomery, M. J. Frisch, J. Chem. Phys. 118, 1101 (2003)
(ln(exponent) along a shell in Legendre polynomials of low order); local cubic: the four-point
formula of Lagrange, M. Abramowitz, I. A. Stegun, Handbook of Mathematical Functions, NBS 1964,
25.2.
"""

from collections.abc import Iterator
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import BasisSet, Block, Floats
from overlapse.rules.rowwise.rows import nearest

FEWEST = 4  # exponents that a ladder needs
# Scatter of a step that printed digits and optimisation leave in any case.
_FLOOR = 0.006
# Steps are less even at the ends of a contraction, and least between lone functions.
_AT_END, _LONE = 2.0, 3.0
_REST, _REST_SHARE = 2.5, 0.2
# Largest departure from a Legendre polynomial of third order that published shells show, apart
# from one in five hundred: of four to six exponents, and of more.
_LEGENDRE = (1.2, 2.1)


class Ladder(NamedTuple):
    """The exponents of one l of a block, shell by shell, as they stand.

    places: (shell, row) of each.  lengths: of the shells.  ease: factors on the scale.
    """

    block: Block
    l: int
    lengths: tuple[int, ...]
    places: tuple[tuple[int, int], ...]
    logs: Floats
    ease: Floats


class Step(NamedTuple):
    """An exponent that falls out of its ladder.

    departure: of ln(exponent); spread: its scale; surprise: their ratio.  expected: the exponent
    suggested.  beside: symbols of the elements that the ladder was compared with, none where it was
    compared with itself.  either: the other element that may be at fault as well.
    """

    block: Block
    shell: int
    row: int
    departure: float
    spread: float
    surprise: float
    beside: tuple[str, ...]
    either: str = ""

    @property
    def expected(self) -> float:
        value = float(self.block.shells[self.shell].exponents[self.row])
        return value * float(np.exp(-self.departure))


def odd_steps(members: BasisSet, least: float) -> list[Step]:
    """Exponents that surprise by ``least`` beside each neighbour; of each shell at most one."""
    ladders: dict[tuple[int, tuple[int, ...], bool], dict[int, Ladder]] = {}
    seen: set[int] = set()
    for block in members.blocks:
        if block.atomic_number not in seen:
            seen.add(block.atomic_number)
            for ladder in _ladders(block):
                is_whole = bool(np.isfinite(ladder.ease[-1]))
                row = ladders.setdefault((ladder.l, ladder.lengths, is_whole), {})
                row[block.atomic_number] = ladder
    found: dict[tuple[int, int], Step] = {}
    for row in ladders.values():
        for step in _of_row(row, least):
            key = id(step.block), step.shell
            if key not in found or step.surprise > found[key].surprise:
                found[key] = step
    return list(found.values())


def _ladders(block: Block) -> Iterator[Ladder]:
    shells: dict[int, list[int]] = {}
    for index, shell in enumerate(block.shells):
        shells.setdefault(shell.angular[0], []).append(index)
    for l, indices in shells.items():
        several = [index for index in indices if len(block.shells[index].exponents) > 1]
        yield from _ladder(block, l, indices)
        # Neighbours often have the same contractions and other lone functions.
        if several and several != indices:
            yield from _ladder(block, l, several, is_whole=False)


def _ladder(block: Block, l: int, indices: list[int], is_whole: bool = True) -> Iterator[Ladder]:
    parts = [block.shells[index].exponents for index in indices]
    exponents = np.concatenate(parts)
    if len(exponents) < FEWEST or not (exponents > 0.0).all():
        return
    lengths = tuple(len(part) for part in parts)
    places = tuple(
        (index, at) for index, count in zip(indices, lengths, strict=True) for at in range(count)
    )
    ease = _ease(lengths)
    if not is_whole:
        # What follows the last of these is not the same in the neighbours.
        ease = ease.copy()
        ease[-2:] = np.inf
    yield Ladder(block, l, lengths, places, np.log(exponents), ease)


@lru_cache(maxsize=256)
def _ease(lengths: tuple[int, ...]) -> Floats:
    parts = []
    for count in lengths:
        part = np.ones(count)
        part[-1] = _LONE if count == 1 else _AT_END
        parts.append(part)
    return np.concatenate(parts)


def unevenness(steps: Floats) -> tuple[Floats, Floats]:
    """Departure of each step from those around it, and its scale, shapes (..., n), n at least 4.

    Inside: the cubic through two steps on either side; next to an end the mean of the neighbours;
    at an end the line through the next two, drawn half as far.  The scale is a part of the range of
    those that were used.
    """
    step = steps.T
    expected = np.empty_like(step)
    scale = np.empty_like(step)
    expected[1:-1] = 0.5 * (step[:-2] + step[2:])
    if len(step) > 4:
        around = np.array([step[:-4], step[1:-3], step[3:-1], step[4:]])
        expected[2:-2] = (4.0 * (around[1] + around[2]) - around[0] - around[3]) / 6.0
        scale[2:-2] = 0.35 * (around.max(axis=0) - around.min(axis=0))
    expected[0] = 1.5 * step[1] - 0.5 * step[2]
    expected[-1] = 1.5 * step[-2] - 0.5 * step[-3]
    for at, others, part in (
        (0, [1, 2, 3], 0.7), (1, [0, 2, 3], 0.35),
        (-2, [-4, -3, -1], 0.35), (-1, [-4, -3, -2], 1.0),
    ):  # fmt: skip
        used = step[others]
        scale[at] = part * (used.max(axis=0) - used.min(axis=0))
    return steps - expected.T, scale.T + _FLOOR


def _of_row(row: dict[int, Ladder], least: float) -> Iterator[Step]:
    """Judge each ladder against its nearest neighbours of one period."""
    near = {z: nearest(z, row) for z in row}
    pairs: dict[tuple[int, int], tuple[Floats, Floats, Floats]] = {}
    both = [(z, other) for z, others in near.items() for other in others]
    if both:
        departures, spreads = unevenness(
            np.array([row[z].logs - row[other].logs for z, other in both])
        )
        spreads = spreads * next(iter(row.values())).ease
        told_of = zip(departures, spreads, np.abs(departures) / spreads, strict=True)
        pairs = dict(zip(both, told_of, strict=True))
    for z, others in near.items():
        ladder = row[z]
        if not others:
            yield from _by_itself(ladder)
            continue
        told = [pairs[z, other] for other in others]
        surprise = told[0][2]
        if len(told) == 2:
            same = told[0][0] * told[1][0] > 0.0
            surprise = np.minimum(surprise, told[1][2]) * same
        if surprise.max() < least:
            continue
        at = _oddest(ladder, [row[other] for other in others], surprise, told, least)
        if at is None:
            continue
        either = ""
        if len(others) == 1:
            (other,) = others
            beyond = [far for far in near[other] if far != z]
            if beyond:
                # The neighbour is vouched for by its own other neighbour, or is the one at fault.
                if pairs[other, beyond[0]][2][at] > 0.4 * surprise[at]:
                    continue
            elif _is_more_even(ladder.logs, row[other].logs, at):
                continue
            else:
                either = row[other].block.symbol
        best = int(np.argmin([part[1][at] for part in told]))
        yield Step(
            ladder.block, *ladder.places[at], float(told[best][0][at]), float(told[best][1][at]),
            float(surprise[at]), tuple(row[other].block.symbol for other in others), either,
        )  # fmt: skip


def _oddest(
    ladder: Ladder,
    others: list[Ladder],
    surprise: Floats,
    told: list[tuple[Floats, Floats, Floats]],
    least: float,
) -> int | None:
    """The place whose correction leaves the ladder even beside its neighbours."""
    order: list[int] = np.argsort(-surprise)[:2].tolist()
    for at in order:
        if surprise[at] < least:
            return None
        rest = 0.0
        for other, (departure, _, _) in zip(others, told, strict=True):
            steps = ladder.logs - other.logs
            steps[at] -= departure[at]
            left, spread = unevenness(steps)
            rest = max(rest, float((np.abs(left) / (spread * ladder.ease)).max()))
        if rest < max(_REST, _REST_SHARE * float(surprise[at])):
            return at
    return None


def _is_more_even(logs: Floats, others: Floats, at: int) -> bool:
    """Whether a ladder is the more even one of two at a place."""
    return bool(abs(unevenness(logs)[0][at]) < abs(unevenness(others)[0][at]))


@lru_cache(maxsize=64)
def _legendre(count: int, order: int) -> tuple[Floats, Floats]:
    """Hat matrix of Legendre polynomials up to an order at ``count`` even places; 1 - leverage."""
    table = np.polynomial.legendre.legvander(np.linspace(-1.0, 1.0, count), order)
    hat = np.asarray(table @ np.linalg.pinv(table), dtype=np.float64)
    return hat, 1.0 - np.diagonal(hat)


def _order(count: int) -> int:
    return 3 if count > 5 else 2


def _own(logs: Floats) -> Floats:
    """Departure of each from the polynomial through the others of its ladder."""
    hat, free = _legendre(len(logs), _order(len(logs)))
    return np.asarray((logs - hat @ logs) / free)


def _by_itself(ladder: Ladder) -> Iterator[Step]:
    """A contraction that no neighbour shares, against its own progression."""
    shells: dict[int, list[int]] = {}
    for at, (shell, _) in enumerate(ladder.places):
        shells.setdefault(shell, []).append(at)
    for shell, places in shells.items():
        logs = ladder.logs[places]
        if len(logs) < FEWEST + 1:
            continue
        departure = _own(logs)
        limit = _LEGENDRE[len(logs) > 6]
        # At an end little is left of a residual: it is the residuals in their own scale that tell.
        free = _legendre(len(logs), _order(len(logs)))[1]
        at = int((np.abs(departure) * np.sqrt(free)).argmax())
        mended = logs.copy()
        mended[at] -= departure[at]
        if abs(departure[at]) > limit and np.abs(_own(mended)).max() < 0.5 * limit:
            yield Step(
                ladder.block, shell, at, float(departure[at]), limit / 2.0,
                2.0 * abs(float(departure[at])) / limit, (),
            )  # fmt: skip
