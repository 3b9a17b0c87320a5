"""Shells and potential terms out of sound JSON objects, and where their numbers stand.

These functions take what the standard library's parser made of objects.  Whatever is not exactly as
the schema wants it gives None: the reader then takes the object apart and says why.
"""

import re
from collections.abc import Iterable, Iterator, Sequence
from contextlib import suppress
from dataclasses import dataclass
from functools import lru_cache
from itertools import chain
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar.drafts import FunctionType
from overlapse.grammar.model import Cells, Channel, Floats, Grid, Shell, Span
from overlapse.grammar.numbers import FORTRAN, has_only_characters
from overlapse.grammar.source import Source

HIGHEST = 20  # angular momentum; no basis comes near
# What the words for kinds of shells say of their functions.
SHELL_KINDS: dict[str, FunctionType | None] = {
    "spherical": "spherical",
    "cartesian": "cartesian",
    "gto": None,
    "gto_spherical": "spherical",
    "gto_cartesian": "cartesian",
}
POTENTIAL_KINDS = ("scalar", "spinorbit", "scalar_ecp", "spinorbit_ecp")
_WORD = re.compile(r'[^\s,\[\]"]+')


# A shell's angular momenta and kind, and how many exponents and columns of coefficients it has;
# several angular momenta have one column each.
Shape = tuple[tuple[int, ...], str, int, int]
# A shell with its numbers: exponents (nprim,) and coefficients (nprim, ncolumns), read-only.
Table = tuple[Shape, Floats, Floats]


class Terms(NamedTuple):
    """Terms of a core potential: shapes (nterms,) and (nterms, ncolumns)."""

    l: int
    kind: str
    powers: tuple[int, ...]
    exponents: Floats
    coefficients: Floats


def table_of(leaf: dict[str, Any]) -> Table | None:
    """The shell that an object describes."""
    found = shapes_of([leaf])
    return next(tables_of(*found)) if found else None


def shapes_of(leaves: Iterable[dict[str, Any]]) -> tuple[list[Shape], Floats] | None:
    """The shells that objects describe, and all their numbers; None where one describes none.

    What can be checked and converted for all together is.
    """
    shapes: list[Shape] = []
    lists: list[list[Any]] = []
    with suppress(KeyError, TypeError):
        for leaf in leaves:
            exponents, columns = leaf["exponents"], leaf["coefficients"]
            kind = leaf.get("harmonic_type") or leaf["function_type"]
            angular = tuple(leaf["angular_momentum"])
            shapes.append((angular, kind, len(exponents), len(columns)))
            lists.append(exponents)
            lists += columns
        if _are_shells(shapes):
            counts = [count for _, _, count, columns in shapes for _ in range(1 + columns)]
            values = _values(lists, counts)
            return None if values is None else (shapes, values)
    return None


def tables_of(shapes: list[Shape], values: Floats) -> Iterator[Table]:
    """The numbers of all shells, cut up."""
    start, column = 0, values[:, None]
    for shape in shapes:
        _, _, count, columns = shape
        first = start + count
        end = first + count * columns
        if columns == 1:
            yield shape, values[start:first], column[first:end]
        else:
            yield shape, values[start:first], values[first:end].reshape(columns, count).T
        start = end


def _are_shells(shapes: list[Shape]) -> bool:
    """Whether angular momenta and kinds are such, and fit the columns."""
    if not set(map(type, chain.from_iterable(angular for angular, _, _, _ in shapes))) <= {int}:
        return False
    return all(
        kind in SHELL_KINDS and _are_angular(angular) and columns and len(angular) in (1, columns)
        for angular, kind, columns in {(l, kind, n) for l, kind, _, n in shapes}
    )


def terms_of(leaf: dict[str, Any]) -> Terms | None:
    """The terms of a core potential that an object describes."""
    with suppress(KeyError, TypeError):
        angular, powers, kind = leaf["angular_momentum"], leaf["r_exponents"], leaf["ecp_type"]
        exponents, columns = leaf["gaussian_exponents"], leaf["coefficients"]
        if not (kind in POTENTIAL_KINDS and _are_angular(angular) and len(angular) == 1):
            return None
        if columns and type(powers) is list and set(map(type, powers)) == {int}:
            count = len(powers)
            values = _values([exponents, *columns], [count] * (1 + len(columns)))
            if values is not None:
                table = values[count:].reshape(len(columns), count).T
                return Terms(angular[0], kind, tuple(powers), values[:count], table)
    return None


def _are_angular(values: Sequence[int]) -> bool:
    if len(values) == 1:
        return type(values[0]) is int and 0 <= values[0] <= HIGHEST
    return (
        set(map(type, values)) == {int}
        and min(values) >= 0
        and max(values) <= HIGHEST
        and len(set(values)) == len(values)
    )


def _values(lists: list[list[Any]], counts: list[int]) -> Floats | None:
    """The numbers of lists of given lengths, all spelled as such or all as strings; read-only."""
    if set(map(type, lists)) != {list} or list(map(len, lists)) != counts or 0 in counts:
        return None
    words = list(chain.from_iterable(lists))
    kinds = set(map(type, words))
    with suppress(ValueError, OverflowError):
        if kinds == {str}:
            words = _unquoted(words)
        elif not kinds <= {float, int}:
            return None
        values = np.array(words, dtype=np.float64)
        if np.isfinite(values).all():
            values.flags.writeable = False
            return values
    return None


def _unquoted(words: list[str]) -> list[float]:
    text = " ".join(words)
    found = text.translate(FORTRAN).split()
    if not (has_only_characters(text) and text.count(" ") == len(words) - 1 == len(found) - 1):
        raise ValueError("some string is not one plain number")
    return list(map(float, found))


def shells_of(table: Table, source: Source, line: int, start: int, end: int) -> list[Shell]:
    """The shells of an object that stands between two offsets and begins on some line (from 1).

    The model shares exponents between s and p only; for others there is one shell for each l.
    """
    (angular, _, count, _), exponents, coefficients = table
    if len(angular) == 1 or angular == (0, 1):
        cells = ListCells(source, 0, 0, _grid(count, 0), "", "", 0, "", start, end)
        return [Shell.checked(angular, exponents, coefficients, line, cells)]
    found = []
    for at, l in enumerate(angular):
        cells = ListCells(source, 0, 0, _grid(count, at), "", "", 0, "", start, end)
        column = coefficients[:, at : at + 1]
        found.append(Shell.checked((l,), exponents, column, line, cells))
    return found


@lru_cache(256)
def _grid(count: int, column: int) -> Grid:
    """Places of so many exponents, and of the coefficients from a column (0-based) on."""
    return Grid(0, 1, count * (1 + column), 1, count)


def channels_of(parts: list[tuple[int, Terms]]) -> Iterator[Channel]:
    """Channels of a potential, each part with its line; the local one is that of the highest l."""
    scalar = [part.l for _, part in parts if part.kind.startswith("scalar")]
    for line, part in parts:
        spin_orbit = part.kind.startswith("spinorbit")
        for column in part.coefficients.T:
            yield Channel(
                part.l,
                not spin_orbit and part.l == max(scalar),
                part.powers,
                part.exponents,
                column,
                line,
                kind="spin-orbit" if spin_orbit else "scalar",
            )


@dataclass(slots=True)
class ListCells(Cells):
    """The numbers of an object: its list of exponents, then its lists of coefficients.

    ``start`` and ``end`` are the offsets of the object in the text.
    """

    start: int = 0
    end: int = 0

    def _spans(self) -> list[Span]:
        return [
            span for name in ("exponents", "coefficients") for span in self._spans_of(f'"{name}"')
        ]

    def _spans_of(self, key: str) -> list[Span]:
        text = self.source.text
        found = re.compile(rf"{key}\s*:\s*").search(text, self.start, self.end)
        if found is None:
            return []
        depth, end = 0, found.end()
        for bracket in re.compile(r"[\[\]]").finditer(text, found.end(), self.end):
            depth += 1 if bracket[0] == "[" else -1
            end = bracket.end()
            if depth <= 0:
                break
        return [word.span() for word in _WORD.finditer(text, found.end(), end)]
