"""Contracted functions against the expansions of Slater functions: which, and of what zeta?"""

from functools import cache
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Block, Floats, Function, letter_of
from overlapse.rules.physics.slater import Expansion, Orbital, expansions

Indices = npt.NDArray[np.intp]


class Match(NamedTuple):
    """A contracted function against the tabulated expansions.

    shell: index in the block.  orbital: n and l that its place stands for.  exponents: expansions
    with its ratios of exponents.  coefficients: expansions with its coefficients, each with the n
    they belong to.  nearest: the expansion of this orbital that comes closest.  zeta: Slater
    exponent, bohr**-1.  order: its primitives by falling exponent.
    """

    block: Block
    shell: int
    function: Function
    orbital: Orbital
    exponents: tuple[Expansion, ...]
    coefficients: tuple[tuple[Expansion, int], ...]
    nearest: Expansion
    zeta: float
    order: Indices

    @property
    def fits(self) -> bool:
        n = self.orbital[0]
        return any(x in self.exponents and m == n for x, m in self.coefficients)


class Limits(NamedTuple):
    """How far ln(exponent ratio) and a coefficient may be from those of an expansion."""

    ratio: float = 1e-3
    coefficient: float = 2e-4


def matches(block: Block, count: int, limits: Limits | None = None) -> list[Match]:
    """All functions of a block that have ``count`` primitives, compared with the expansions."""
    found = []
    seen: dict[int, int] = {}
    for shell, function in block.contracted:
        l = function.l
        seen[l] = seen.get(l, 0) + 1
        if len(function.exponents) == count and function.exponents.min() > 0.0:
            made = _match(block, shell, function, (seen[l] + l, l), limits or Limits())
            if made is not None:
                found.append(made)
    return found


def _orders(function: Function) -> list[Indices]:
    """Orders to try: by falling exponent, and as written, which one wrong exponent leaves alone."""
    falling = np.argsort(-function.exponents)
    written = np.arange(len(falling))
    return [falling] if (falling == written).all() else [falling, written]


def _match(
    block: Block, shell: int, function: Function, orbital: Orbital, limits: Limits
) -> Match | None:
    found = [
        _compared(block, shell, function, orbital, order, limits) for order in _orders(function)
    ]
    # The first that says anything.
    return next((m for m in found if m and (m.exponents or m.coefficients)), found[0])


def _compared(
    block: Block, shell: int, function: Function, orbital: Orbital, order: Indices, limits: Limits
) -> Match | None:
    logs, c = np.log(function.exponents[order]), function.coefficients[order]
    table = expansions(len(order))
    here = [e for e in table if orbital in e.coefficients]
    if not here:
        return None
    shifts = logs - _logarithms(len(order))
    # The middle of the shifts, so that one wrong exponent does not move all others.
    middles = dict(zip(table, _middles(shifts).tolist(), strict=True))
    spread = dict(zip(table, np.abs(shifts - _middles(shifts)[:, None]).max(axis=1), strict=True))
    same_ratios = tuple(e for e in table if spread[e] < limits.ratio)
    owners, values = _columns(len(order), orbital[1])
    apart = np.minimum(np.abs(values - c).max(axis=1), np.abs(values + c).max(axis=1))
    same_coefficients = tuple(owners[at] for at in np.flatnonzero(apart < limits.coefficient))
    near = [e for e in here if e in same_ratios] or [
        e for e in here if (e, orbital[0]) in same_coefficients
    ]
    nearest = min(near or here, key=lambda e: spread[e] + _apart(c, e.coefficients[orbital]))
    zeta = float(np.exp(0.5 * middles[nearest]))
    return Match(
        block, shell, function, orbital, same_ratios, same_coefficients, nearest, zeta, order
    )


@cache
def _logarithms(count: int) -> Floats:
    """ln(exponent) of all expansions in so many Gaussians, shape (expansions, count)."""
    return np.log([e.exponents for e in expansions(count)])


@cache
def _columns(count: int, l: int) -> tuple[list[tuple[Expansion, int]], Floats]:
    """All functions of one l: expansion and n of each, and their coefficients, a row for each."""
    found = [
        ((e, n), values)
        for e in expansions(count)
        for (n, k), values in e.coefficients.items()
        if k == l
    ]
    return [owner for owner, _ in found], np.array([values for _, values in found])


def _middles(shifts: Floats) -> Floats:
    """Median of each row; numpy's own imports more of numpy than an audit needs."""
    ordered, count = np.sort(shifts, axis=1), shifts.shape[1]
    middle: Floats = 0.5 * (ordered[:, (count - 1) // 2] + ordered[:, count // 2])
    return middle


def _apart(left: Floats, right: Floats) -> float:
    """Largest difference of coefficients; the sign of a whole function is free."""
    return float(min(np.abs(left - right).max(), np.abs(left + right).max()))


class Departure(NamedTuple):
    """What is wrong with a function, in words that hold for other elements too.

    row, column: of the number in the shell, where it is one.  expected: its value.
    """

    words: str
    row: int | None = None
    column: int | None = None
    expected: float | None = None


def departure(match: Match) -> Departure:
    """Say how the numbers of a function differ from an expansion of its orbital."""
    n, l = match.orbital
    others = [m for x, m in match.coefficients if x in match.exponents]
    if others:
        place = f"{n}{letter_of(l)}"
        return Departure(
            f"these are the numbers of a {others[0]}{letter_of(l)} where {place} belongs"
        )
    ratios = f"the exponents are in the ratios of {_names(match.exponents)}"
    if match.exponents and match.coefficients:
        named = _names(tuple(x for x, _ in match.coefficients))
        return Departure(f"{ratios}, the coefficients are those of {named}")
    if match.exponents:
        return _wrong_coefficients(match, ratios)
    if match.coefficients:
        return _wrong_exponents(match)
    return Departure(
        f"neither its exponents nor its coefficients are those of an expansion of "
        f"{n}{letter_of(l)} (the nearest is {match.nearest.name})"
    )


def _names(found: tuple[Expansion, ...]) -> str:
    # A shell of several functions says more than one of them alone.
    return f"the {max((e.name for e in found), key=len, default='unknown')} expansion"


def _wrong_coefficients(match: Match, ratios: str) -> Departure:
    """The exponents are sound: which coefficients are not?"""
    c = match.function.coefficients[match.order]
    table = [e for e in expansions(len(c)) if match.orbital in e.coefficients]
    table.sort(key=lambda e: e not in match.exponents)
    for e in table:
        values = _aligned(e.coefficients[match.orbital], c)
        wrong = np.flatnonzero(np.abs(values - c) > 2e-4)
        if len(wrong) == 1 and len(c) > 2:
            at = int(match.order[wrong[0]])
            row, value = int(match.function.rows[at]), float(values[wrong[0]])
            spelled = match.block.shells[match.shell].spelling(row, match.function.column)
            words = f"coefficient {spelled} is {value:.9g} in the {e.name} expansion"
            if e not in match.exponents:
                words = f"{ratios}, the coefficients are those of another but for one: {words}"
            return Departure(words, row, match.function.column, value)
    return Departure(f"{ratios}, the coefficients are those of no expansion")


def _wrong_exponents(match: Match) -> Departure:
    """The coefficients are sound: which exponents are not?"""
    e = next((x for x, m in match.coefficients if m == match.orbital[0]), match.nearest)
    a = match.function.exponents[match.order]
    shift = np.log(a / e.exponents)
    middle = float(_middles(shift[None])[0])
    wrong = np.flatnonzero(np.abs(shift - middle) > 1e-3)
    named = f"the coefficients are those of the {e.name} expansion"
    if len(wrong) == 1 and len(a) > 2:
        at = int(match.order[wrong[0]])
        row = int(match.function.rows[at])
        value = float(e.exponents[wrong[0]] * np.exp(middle))
        spelled = match.block.shells[match.shell].spelling(row)
        return Departure(f"{named}, but exponent {spelled} should be {value:.8g}", row, None, value)
    return Departure(f"{named}, the exponents are in the ratios of none")


def _aligned(values: Floats, like: Floats) -> Floats:
    return values if float(values @ like) >= 0.0 else -values


def exchanged(match: Match, others: list[Match]) -> str:
    """Name the shell whose exponents belong to this one's coefficients, if there is one."""
    for other in others:
        if other.shell != match.shell and _belong(other, match) and _belong(match, other):
            e = next(x for x, _ in match.coefficients if x in other.exponents)
            a = other.function.exponents[other.order]
            zeta = float(np.exp(0.5 * _middles(np.log(a / e.exponents)[None])[0]))
            name = match.block.names[other.shell]
            return f"; with the exponents of {name} it would be one, of zeta {zeta:.3f}: exchanged?"
    return ""


def _belong(exponents: Match, coefficients: Match) -> bool:
    n = coefficients.orbital[0]
    return any((e, n) in coefficients.coefficients for e in exponents.exponents)
