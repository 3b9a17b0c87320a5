"""Shells of statements with commas that are plainly sound: told by bulk checks, without tokens."""

import re
from collections.abc import Iterator
from itertools import repeat
from typing import NamedTuple

from overlapse.grammar.building import Build
from overlapse.grammar.model import Grid
from overlapse.grammar.numbers import NUMBER

# First and last exponent of a contraction.
RANGE = re.compile(r"([0-9]{1,6})\.([0-9]{1,6})")

_LETTERS = frozenset("spdfghi")  # those above are counted in two ways
_EXPONENT = re.compile(rf"\s*{NUMBER.pattern}(?![^\s,;])")

# A contraction: the first exponent that it covers and the one past the last (both 0-based), and the
# place of its first coefficient among the fields of the shell.
Column = tuple[int, int, int]


class Opening(NamedTuple):
    """The first two fields of a statement: letter and symbol, or `c` and its range."""

    letter: str
    symbol: str = ""
    first: int = 0
    last: int = 0


class Cut(NamedTuple):
    """A shell of the model out of the fields of a statement and its contractions."""

    shape: tuple[int, int]
    grid: Grid
    unit: bool


# First line and past the last (0-based), letter and symbol, contractions, fields as text and their
# number; letters, symbols and ranges come as zeros.
SoundShell = tuple[int, int, Opening, tuple[Column, ...], list[str], int]


class Plain:
    """Knows the statements that have a line to themselves and a comma between any two fields."""

    def __init__(self, build: Build) -> None:
        self.bodies = bodies = build.bodies
        self.openings: dict[str, Opening] = {}
        self.fields = "\n".join(bodies).replace(",", " ").replace(";", " ").split("\n")
        self.counts = list(map(len, map(str.split, self.fields)))
        self.commas = list(map(str.count, bodies, repeat(",")))
        for sign in "={};":
            for index in build.source.lines_with(sign):
                if sign != ";" or bodies[index].find(sign) != len(bodies[index]) - 1:
                    self.counts[index] = 0

    def shell(self, index: int) -> SoundShell | None:
        """The shell whose statements stand one below the other from a line on."""
        opening, end = self.opening(index)
        if opening.letter in ("", "c") or not _EXPONENT.match(self.bodies[index], end):
            return None
        texts, columns = ["0 0", self.fields[index][end:]], []  # type: list[str], list[Column]
        count, total, past = self.counts[index] - 2, self.counts[index], index + 1
        while past < len(self.bodies) and self.bodies[past][:1] in ("c", "C"):
            column, end = self.opening(past)
            length = column.last - column.first
            if not column.last <= count or not 0 < length == self.counts[past] - 2:
                return None
            columns.append((column.first, column.last, total + 2))
            texts += ("0 0", self.fields[past][end:])
            total += length + 2
            past += 1
        return index, past, opening, tuple(columns), texts, total

    def opening(self, index: int) -> tuple[Opening, int]:
        """What a statement opens with, and where on its line that ends."""
        if self.counts[index] != self.commas[index] + 1 or self.counts[index] < 3:
            return _NOTHING, 0
        body = self.bodies[index]
        end = body.find(",", body.find(",") + 1)
        text = body[:end]
        if (known := self.openings.get(text)) is None:
            known = self.openings[text] = _opening(text)
        return known, end + 1


_NOTHING = Opening("")


def _opening(text: str) -> Opening:
    name, symbol = (field.strip() for field in text.split(","))
    if name.lower() in _LETTERS and symbol.isalpha() and len(symbol) < 4:
        return Opening(name, symbol)
    match = RANGE.fullmatch(symbol) if name.lower() == "c" else None
    if match is None or not 0 < int(match[1]) <= int(match[2]):
        return _NOTHING
    return Opening("c", "", int(match[1]) - 1, int(match[2]))


def cuts(count: int, columns: tuple[Column, ...]) -> Iterator[Cut]:
    """Contractions over the same exponents, evenly spaced in the text, make one shell.

    Without any, each of the ``count`` exponents is a function of its own.
    """
    for at in range(2, 2 + count) if not columns else ():
        yield Cut((1, 1), Grid(at, 1, at, 1, 1), True)
    at = 0
    while at < len(columns):
        (first, last, place), end = columns[at], at + 1
        step = columns[end][2] - place if end < len(columns) else 1
        while (
            end < len(columns)
            and columns[end][:2] == (first, last)
            and columns[end][2] - columns[end - 1][2] == step
        ):
            end += 1
        grid = Grid(2 + first, 1, place, 1, step if end - at > 1 else 1)
        yield Cut((last - first, end - at), grid, False)
        at = end
