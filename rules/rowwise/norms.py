"""Self-overlaps of the contractions of a set, and what its own numbers say about one that is off.

Half of all published contractions are printed unnormalised, so a self-overlap other than one proves
nothing by itself.  It is evidence where the same contraction of the neighbours in the row, or
nearly all of the set, is normalised and one is not.
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from math import sqrt
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import BasisSet, Block, Floats, Function, Shell
from overlapse.grammar.numbers import NUMBER
from overlapse.rules.physics.onecentre import primitive_overlap, self_overlap
from overlapse.rules.physics.trends import quantile
from overlapse.rules.rowwise.rows import Row

NORMALISED = 1e-3  # closer to one than this counts as meant to be normalised


@dataclass(frozen=True, slots=True, eq=False)
class Norm:
    """A contraction of two or more primitives and its self-overlap."""

    block: Block
    shell: int
    function: Function
    overlap: float

    @property
    def deviation(self) -> float:
        return abs(self.overlap - 1.0)


class Culprit(NamedTuple):
    """The one number whose change would explain a self-overlap that is off.

    row: of the shell.  exponent: whether the exponent is meant, else the coefficient.  value: the
    number with which the self-overlap is one.  why: what points at it.  clear: whether no other
    number comes near it as an explanation.
    """

    row: int
    exponent: bool
    value: float
    why: str
    clear: bool = True


def norms_of(members: BasisSet) -> list[Norm]:
    """Self-overlaps of all contractions of a set that have several primitives."""
    found = []
    for block in members.blocks:
        for index, function in block.contracted:
            if len(function.exponents) > 1 and (function.exponents > 0.0).all():
                value = self_overlap(function.exponents, function.coefficients, function.l)
                found.append(Norm(block, index, function, value))
    return found


def rounding(norm: Norm) -> float:
    """How far the printed digits alone can move the self-overlap of a contraction.

    First-order propagation of half a unit in the last place of each coefficient and exponent, as
    if all errors added up.
    """
    shell = norm.block.shells[norm.shell]
    exponents, coefficients = shell.spellings()
    function = norm.function
    a, c = function.exponents, function.coefficients
    overlap = primitive_overlap(a, a, function.l)
    half_c = np.array([half_unit(coefficients[row][function.column]) for row in function.rows])
    half_a = np.array([half_unit(exponents[row]) for row in function.rows])
    by_c = 2.0 * np.abs(overlap @ c) * half_c
    # d S_ij / d ln a_i = -(l + 3/2)/2 * (a_i - a_j)/(a_i + a_j) * S_ij
    tilt = (a[:, None] - a[None, :]) / (a[:, None] + a[None, :])
    by_a = (function.l + 1.5) * np.abs(c * ((tilt * overlap) @ c)) * half_a / a
    return float(by_c.sum() + by_a.sum())


def is_vouched(
    norms: Iterable[Norm], block: Block, shell: int, row: int, column: int | None, expected: float
) -> bool:
    """Whether a norm speaks for a number that is suspected to stand for another one.

    A contraction that is normalised as it stands, and would not be with the number expected, holds
    no single wrong number.
    """
    for norm in norms:
        function = norm.function
        if norm.block is not block or norm.shell != shell or norm.deviation > 1e-4:
            continue
        if row not in function.rows or column not in (None, function.column):
            continue
        exponents, coefficients = function.exponents.copy(), function.coefficients.copy()
        at = int(np.flatnonzero(function.rows == row)[0])
        (exponents if column is None else coefficients)[at] = expected
        mended = abs(self_overlap(exponents, coefficients, function.l) - 1.0)
        if not mended < 3.0 * max(norm.deviation, 1e-5):
            return True
    return False


def half_unit(word: str) -> float:
    """Half a unit in the last printed place of a number; zeros at its end may be mere padding."""
    if not NUMBER.fullmatch(word):
        return 0.0
    mantissa, _, power = word.upper().replace("D", "E").partition("E")
    decimals = len(mantissa.partition(".")[2].rstrip("0"))
    return float(0.5 * 10.0 ** (int(power or 0) - decimals))


def root_coefficient(norm: Norm, at: int, near: float) -> float | None:
    """The coefficient ``at`` (in the function) that makes the self-overlap one, closest to near."""
    a, c = norm.function.exponents, norm.function.coefficients
    overlap = primitive_overlap(a, a, norm.function.l)
    others = c.copy()
    others[at] = 0.0
    half, rest = float(overlap[at] @ others), float(others @ overlap @ others) - 1.0
    inside = float(half * half - rest)
    if inside < 0.0:
        return None
    reach = sqrt(inside)
    roots = (-half + reach, -half - reach)
    return min(roots, key=lambda root: abs(root - near))


class LeftOut(NamedTuple):
    """A primitive that a segmented form left out of a contraction, since it also stands alone.

    shell: name of the function that stands alone.  coefficient: with which it makes the norm one.
    """

    shell: str
    exponent: float
    coefficient: float


def left_out(norm: Norm) -> LeftOut | None:
    """The lone primitive that restores the norm of a contraction, where one is near enough.

    It follows on the loosest exponent of the contraction, in steps like those inside it and with no
    other primitive of the block between, and its coefficient is no larger than the largest.
    """
    function = norm.function
    loosest = float(function.exponents.min())
    ratio = (float(function.exponents.max()) / loosest) ** (1.0 / (len(function.exponents) - 1))
    others = list(norm.block.functions_of(function.l))
    looser = (float(a) for _, other in others for a in other.exponents if a < loosest)
    following = max(looser, default=0.0)
    for index, other in others:
        if len(other.exponents) > 1 or norm.overlap >= 1.0:
            continue
        exponent = float(other.exponents[0])
        if exponent != following or exponent < loosest / (ratio * ratio):
            continue
        lone = np.array([exponent])
        half = float((primitive_overlap(lone, function.exponents, function.l)
                      @ function.coefficients)[0])  # fmt: skip
        reach = sqrt(half * half + 1.0 - norm.overlap)
        largest = float(np.abs(function.coefficients).max())
        coefficient = min(-half + reach, -half - reach, key=abs)
        if abs(coefficient) < 1.2 * largest:
            return LeftOut(norm.block.names[index], exponent, coefficient)
    return None


def culprit(norm: Norm, rows: Sequence[Row], finest: float = 2e-3) -> Culprit | None:
    """Find the number that put a contraction off its norm.

    First a number that one simple slip explains (a sign, the decimal point); then the one that
    departs most from the row of the periodic table, provided that it departs clearly.
    """
    function = norm.function
    if (slip := _simple_slip(norm)) is not None:
        return slip
    for row in rows:
        for place, member in enumerate(row.members):
            if member.function is function:
                return _by_row(norm, row, place, finest)
    return None


# Sign, decimal point: the slips that leave all digits as they are.
_SLIPS = ((-1.0, "sign"), (0.1, "decimal point"), (10.0, "decimal point"))


def _simple_slip(norm: Norm) -> Culprit | None:
    """The one number that a simple slip explains, or None if none or several could."""
    function = norm.function
    a, c = function.exponents, function.coefficients
    tolerance = max(3.0 * rounding(norm), 3e-7)
    found = []
    for at in range(len(a)):
        row = int(function.rows[at])
        for factor, what in _SLIPS:
            changed = c.copy()
            changed[at] *= factor
            if abs(self_overlap(a, changed, function.l) - 1.0) < tolerance:
                why = f"with the {what} changed the self-overlap is one"
                found.append(Culprit(row, False, float(changed[at]), why))
            if factor > 0.0:
                changed = a.copy()
                changed[at] *= factor
                if abs(self_overlap(changed, c, function.l) - 1.0) < tolerance:
                    why = f"with the {what} moved the self-overlap is one"
                    found.append(Culprit(row, True, float(changed[at]), why))
    return found[0] if len(found) == 1 else None


def _by_row(norm: Norm, row: Row, place: int, finest: float) -> Culprit | None:
    """The number whose change restores the norm and most improves the agreement with the row.

    For each number, ``root`` restores the norm and ``near`` is what the row suggests, give or take
    ``blur``.  If that number is the wrong one, chi squared falls by
    ((value - near)**2 - (root - near)**2) / blur**2; for a sound number the root is one that
    nobody suggests, and it rises.
    """
    function = norm.function
    others = len(row.members) - 1
    found: list[tuple[float, Culprit]] = []
    departure, scatter, reach = (part[place] for part in row.coefficients)
    for at, value in enumerate(function.coefficients.tolist()):
        near = float(value - departure[at])
        root = root_coefficient(norm, at, near)
        if root is not None:
            blur = max(float(scatter[at] * reach[at]), finest * max(abs(value), abs(near)))
            gain = ((value - near) ** 2 - (root - near) ** 2) / blur**2
            why = f"the coefficients of {others} neighbours suggest about {near:.3g} in this place"
            found.append((gain, Culprit(int(function.rows[at]), False, root, why)))
    departure, scatter, reach = (part[place] for part in row.exponents)
    shift = quantile(departure.tolist(), 0.5)
    for at, value in enumerate(function.exponents.tolist()):
        near = float(value * np.exp(shift - departure[at]))
        root = _root_exponent(norm, at, near)
        if root is not None:
            blur = max(float(scatter[at] * reach[at]), finest)
            gain = float(np.log(value / near) ** 2 - np.log(root / near) ** 2) / blur**2
            why = f"the exponents of {others} neighbours suggest about {near:.3g} in this place"
            guess = Culprit(int(function.rows[at]), True, root, why)
            if explains(guess, norm.block.shells[norm.shell]):
                found.append((gain, guess))
    found.sort(key=lambda pair: -pair[0])
    if not found or found[0][0] <= 0.0:
        return None
    clear = found[0][0] > 4.0 and (len(found) < 2 or found[0][0] > 1.5 * found[1][0])
    return found[0][1]._replace(clear=clear)


def explains(guess: Culprit, shell: Shell) -> bool:
    """Whether the guessed exponent brings all contractions of the shell to norm."""
    exponents = shell.exponents.copy()
    exponents[guess.row] = guess.value
    for function in shell.functions():
        if len(function.exponents) > 1 and guess.row in function.rows:
            changed = exponents[function.rows]
            if abs(self_overlap(changed, function.coefficients, function.l) - 1.0) > NORMALISED:
                return False
    return True


def _root_exponent(norm: Norm, at: int, near: float) -> float | None:
    """The exponent around ``near`` that makes the self-overlap one, by bisection; None if none."""
    function = norm.function

    def excess(value: float) -> float:
        exponents = function.exponents.copy()
        exponents[at] = value
        return self_overlap(exponents, function.coefficients, function.l) - 1.0

    low, high = near / 1.3, near * 1.3
    if excess(low) * excess(high) > 0.0:
        return None
    for _ in range(60):
        middle = (low * high) ** 0.5
        if excess(low) * excess(middle) <= 0.0:
            high = middle
        else:
            low = middle
    return low


def look_alike(norm: Norm, sound: Sequence[Norm]) -> tuple[str, int | None, float | None]:
    """What the sound contractions of the set say about one that is off.

    Returns a sentence ("" for none), and the row and the value of the coefficient that is wrong,
    where it is one coefficient.  Expansions of one Slater function differ by a scale factor only,
    so a sound contraction with the same ratios of exponents should have the same coefficients.
    """
    function = norm.function
    ratios = np.log(function.exponents / function.exponents[0])
    others = [
        other
        for other in sound
        if other.function.l == function.l and len(other.function.exponents) == len(ratios)
    ]
    for other in others:
        if not _same_ratios(other.function, ratios):
            continue
        differ = np.flatnonzero(
            np.abs(other.function.coefficients - function.coefficients)
            > 1e-5 * np.abs(other.function.coefficients) + 1e-7
        )
        if len(differ) == 1:
            at = int(differ[0])
            names = _elements(o for o in others if _same(o.function, other.function))
            return (
                f"{names} have the same ratios of exponents and the same other coefficients, "
                f"but {other.function.coefficients[at]:.10g} in this place",
                int(function.rows[at]),
                float(other.function.coefficients[at]),
            )
    same = [o for o in others if np.allclose(o.function.coefficients, function.coefficients, 1e-5)]
    if not same:
        return "", None, None
    told = (
        f"{_elements(same)} have the same coefficients with exponents in the ratios "
        f"{_ratios(same[0].function)}, here they are {_ratios(function)}"
    )
    strangers = [o for o in others if _same_ratios(o.function, ratios)]
    if strangers:
        told += (
            f"; these are the ratios of {strangers[0].block.names[strangers[0].shell]} of "
            f"{_elements(strangers)}: exponents of two shells exchanged?"
        )
    return told, None, None


def _same_ratios(function: Function, ratios: Floats) -> bool:
    own = np.log(function.exponents / function.exponents[0])
    return bool(np.abs(own - ratios).max() < 2e-3)


def _same(left: Function, right: Function) -> bool:
    return bool(np.allclose(left.coefficients, right.coefficients, 1e-5))


def _ratios(function: Function) -> str:
    return " : ".join(f"{r:.4g}" for r in function.exponents / function.exponents[0])


def _elements(norms: Iterable[Norm]) -> str:
    symbols = list(dict.fromkeys(norm.block.symbol for norm in norms))
    return ", ".join(symbols[:4]) + (f" and {len(symbols) - 4} more" if len(symbols) > 4 else "")
