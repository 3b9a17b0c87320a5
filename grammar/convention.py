"""Whether coefficients multiply normalised primitives, and how to make them do so.

Nearly every layout means normalised primitives.  Some texts fold the norms into the coefficients
instead: then a coefficient multiplies the bare x**i y**j z**k exp(-a r**2), i + j + k = l, and
holds the factor (2a/pi)**(3/4) (4a)**(l/2) / sqrt((2i-1)!! (2j-1)!! (2k-1)!!) that normalises it.
Which component's factorials were folded in differs from text to text and from l to l, so all are
tried; they scale a whole contraction and leave its shape alone.

Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
chapters 6 and 8.
"""

from collections.abc import Iterable
from dataclasses import replace
from functools import cache
from math import pi
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Block, Document, Floats, Shell, read_only

TOLERANCE = 1e-3


class Count(NamedTuple):
    """How many contracted functions have self-overlap one under each convention.

    normalised, raw: those that have it over normalised, and over raw primitives; of: all.
    """

    normalised: int
    raw: int
    of: int


def raw_norms(exponents: Floats, l: int | Floats) -> Floats:
    """Factors that normalise bare primitives, but for the double factorials.

    Shapes of the two must broadcast; exponents that are not positive give NaN.
    """
    with np.errstate(all="ignore"):
        norms: Floats = (2.0 * exponents / pi) ** 0.75 * (4.0 * exponents) ** (0.5 * l)
    return norms


@cache
def factorials(l: int) -> tuple[float, ...]:
    """The products (2i-1)!! (2j-1)!! (2k-1)!! that occur for i + j + k = l, the smallest first."""
    odd = [1.0]
    for n in range(1, l + 1):
        odd.append(odd[-1] * (2 * n - 1))
    products = {
        odd[i] * odd[j] * odd[l - i - j] for i in range(l + 1) for j in range(i, (l - i) // 2 + 1)
    }
    return tuple(sorted(products))


def count_normalised(shells: Iterable[Shell]) -> Count:
    """Count the contracted functions that are normalised under each convention."""
    normalised = raw = total = 0
    for count, members in _by_length(shells).items():
        momenta = [l for l, _, _ in members]
        l, shape = np.array(momenta), (len(members), count)
        exponents = np.concatenate([values for _, values, _ in members]).reshape(shape)
        coefficients = np.concatenate([values for _, _, values in members]).reshape(shape)
        plain, folded = _self_overlaps(l, exponents, coefficients)
        total += len(members)
        normalised += int(_are_one(plain).sum())
        raw += sum(_count_raw(one, folded[l == one]) for one in set(momenta))
    return Count(normalised, raw, total)


def _by_length(shells: Iterable[Shell]) -> dict[int, list[tuple[int, Floats, Floats]]]:
    """The contractions of shells (l, exponents, coefficients) by their number of primitives."""
    groups: dict[int, list[tuple[int, Floats, Floats]]] = {}
    for shell in shells:
        count, columns = shell.coefficients.shape
        group = groups.setdefault(count, [])
        if columns == 1:
            group.append((shell.angular[0], shell.exponents, shell.coefficients[:, 0]))
            continue
        for column in range(columns):
            l = shell.angular[column // shell.columns_per_l]
            group.append((l, shell.exponents, shell.coefficients[:, column]))
    return groups


def _self_overlaps(l: Floats, exponents: Floats, coefficients: Floats) -> tuple[Floats, Floats]:
    """Self-overlaps of many contractions, over normalised and over raw primitives.

    l: shape (k,); exponents, coefficients: shape (k, n).
    """
    with np.errstate(all="ignore"):
        root = np.sqrt(exponents[:, :, None] / exponents[:, None, :])
        overlap = (2.0 / (root + 1.0 / root)) ** (l[:, None, None] + 1.5)
        both = np.stack([coefficients, coefficients / raw_norms(exponents, l[:, None])], axis=1)
        plain, folded = ((both @ overlap) * both).sum(axis=2).T
    return plain, folded


def _are_one(overlaps: Floats) -> npt.NDArray[np.bool_]:
    return np.abs(overlaps - 1.0) < TOLERANCE


def _count_raw(l: int, overlaps: Floats) -> int:
    """How many self-overlaps over raw primitives are one with some double factorials."""
    with np.errstate(all="ignore"):
        return int(np.any([_are_one(overlaps * factor) for factor in factorials(l)], axis=0).sum())


def _factor(l: int, overlap: float) -> float | None:
    """The product of double factorials that makes a self-overlap over raw primitives one."""
    return next((f for f in factorials(l) if abs(overlap * f - 1.0) < TOLERANCE), None)


def over_normalised(document: Document) -> Document:
    """The document with coefficients that multiply normalised primitives.

    A document that has them already comes back as it is.  Exponents keep their spelling.
    """
    if not document.raw_primitives:
        return document
    sets = tuple(
        replace(members, blocks=tuple(map(_converted_block, members.blocks)))
        for members in document.sets
    )
    return replace(document, sets=sets, raw_primitives=False)


def _converted_block(block: Block) -> Block:
    return replace(block, shells=tuple(map(_converted_shell, block.shells)))


def _converted_shell(shell: Shell) -> Shell:
    table = np.array(shell.coefficients)
    for at, l in enumerate(shell.angular):
        columns = slice(at * shell.columns_per_l, (at + 1) * shell.columns_per_l)
        with np.errstate(all="ignore"):
            table[:, columns] /= raw_norms(shell.exponents, l)[:, None]
        for column in range(columns.start, columns.stop):
            one = (np.array([l]), shell.exponents[None, :], shell.coefficients[None, :, column])
            table[:, column] *= (_factor(l, float(_self_overlaps(*one)[1][0])) or 1.0) ** 0.5
    table[~np.isfinite(table)] = 0.0
    return replace(shell, coefficients=read_only(table))
