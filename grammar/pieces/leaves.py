"""Shells and potential terms out of sound JSON objects, and where their numbers stand.

These functions take what the standard library's parser made of one object.  Whatever is not
exactly as the schema wants it gives None: the reader then takes the object apart and says why.
"""

import re
from collections.abc import Sequence
from contextlib import suppress
from dataclasses import dataclass
from itertools import chain
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar.model import Cells, Floats, Grid, Span
from overlapse.grammar.numbers import CHARACTERS, FORTRAN

HIGHEST = 20  # angular momentum; no basis comes near
_WORD = re.compile(r'[^\s,\[\]"]+')


class Table(NamedTuple):
    """A shell: exponents of shape (nprim,), coefficients of shape (nprim, ncolumns).

    Several angular momenta have one column each; ``kind`` is the word for spherical or Cartesian.
    """

    angular: tuple[int, ...]
    kind: str
    exponents: Floats
    coefficients: Floats


class Terms(NamedTuple):
    """Terms of a core potential: shapes (nterms,) and (nterms, ncolumns)."""

    l: int
    kind: str
    powers: tuple[int, ...]
    exponents: Floats
    coefficients: Floats


def table_of(leaf: dict[str, Any]) -> Table | None:
    """The shell that an object describes."""
    with suppress(KeyError, TypeError, ValueError, OverflowError):
        angular, columns = leaf["angular_momentum"], leaf["coefficients"]
        kind = leaf["harmonic_type"] if "harmonic_type" in leaf else leaf["function_type"]
        if type(kind) is str and _are_angular(angular) and len(angular) in (1, len(columns)):
            numbers = _numbers(leaf["exponents"], columns)
            return numbers and Table(tuple(angular), kind, *numbers)
    return None


def terms_of(leaf: dict[str, Any]) -> Terms | None:
    """The terms of a core potential that an object describes."""
    with suppress(KeyError, TypeError, ValueError, OverflowError):
        angular, powers, kind = leaf["angular_momentum"], leaf["r_exponents"], leaf["ecp_type"]
        sound = type(kind) is str and _are_angular(angular) and len(angular) == 1
        if sound and type(powers) is list and set(map(type, powers)) == {int}:
            numbers = _numbers(leaf["gaussian_exponents"], leaf["coefficients"])
            if numbers and len(powers) == len(numbers[0]):
                return Terms(angular[0], kind, tuple(powers), *numbers)
    return None


def _are_angular(values: Sequence[int]) -> bool:
    return (
        bool(values)
        and set(map(type, values)) == {int}
        and min(values) >= 0
        and max(values) <= HIGHEST
        and len(set(values)) == len(values)
    )


def _numbers(
    exponents: list[float | str], columns: list[list[float | str]]
) -> tuple[Floats, Floats] | None:
    """Exponents and coefficients, all spelled as numbers or all as strings."""
    if not (exponents and columns and type(exponents) is list and type(columns) is list):
        return None
    words = [*exponents, *chain.from_iterable(columns)]
    kinds = set(map(type, words))
    if kinds == {str}:
        text = " ".join(map(str, words))
        words = list(map(float, text.translate(FORTRAN).split())) if _is_plain(text) else []
    elif not kinds <= {float, int}:
        return None
    values = np.array(words, dtype=np.float64)
    count = len(exponents)
    if set(map(len, columns)) != {count} or values.size != count * (1 + len(columns)):
        return None
    if not np.isfinite(values).all():
        return None
    values.flags.writeable = False
    return values[:count], values[count:].reshape(len(columns), count).T


def _is_plain(text: str) -> bool:
    return set(text) <= CHARACTERS


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


def cells_of(source: Any, start: int, end: int, count: int, column: int) -> ListCells:
    """Cells of an object's shell whose coefficients begin in some column (0-based)."""
    grid = Grid(0, 1, count * (1 + column), 1, count)
    return ListCells(source, 0, 0, grid, start=start, end=end)
