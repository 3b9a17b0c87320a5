"""Shells of statements with commas that are plainly sound: told by bulk checks, without tokens."""

import re
from collections.abc import Iterator, Sequence
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


_NOTHING = Opening("")


class Cut(NamedTuple):
    """A shell of the model out of the fields of a statement and its contractions."""

    shape: tuple[int, int]
    grid: Grid
    unit: bool


# First line and past the last (0-based), what the first statement opens with, the contractions, and
# the place of its first field among those of its run.
SoundShell = tuple[int, int, Opening, list[Column], int]


class SoundRun(NamedTuple):
    """Shells that follow one another, and their fields as text: ``total`` numbers.

    Letters, symbols and ranges come as zeros.
    """

    shells: list[SoundShell]
    texts: list[str]
    total: int


class Plain:
    """Knows the statements that have a line to themselves and a comma between any two fields."""

    def __init__(self, build: Build) -> None:
        self.bodies = bodies = build.bodies
        self.openings: dict[str, Opening] = {}
        lines = "\n".join(bodies).replace(",", " ").replace(";", " ").split("\n")
        counts, commas = map(len, map(str.split, lines)), map(str.count, bodies, repeat(","))
        # Fields of each line, 0 for one that is not whole.
        self.counts = [n if n == m + 1 > 2 else 0 for n, m in zip(counts, commas, strict=True)]
        for sign in "={};":
            for index in build.source.lines_with(sign):
                if sign != ";" or bodies[index].find(sign) != len(bodies[index]) - 1:
                    self.counts[index] = 0

    def run(self, index: int, inside: bool) -> SoundRun | None:
        """The sound shells from a line on; ``inside``: a brace may close them."""
        bodies, counts, end = self.bodies, self.counts, len(self.bodies)
        shells: list[SoundShell] = []
        texts: list[str] = []
        opening = _NOTHING
        columns: list[Column] = []
        first = total = start = mark = 0
        past = -1  # the line below the last statement of the shell at hand
        while index < end and (counts[index] or not bodies[index]):
            if not (count := counts[index]):
                index += 1
                continue
            body = bodies[index]
            comma = body.find(",", body.find(",") + 1)
            said = self.openings.get(body[:comma]) or self.opening(body[:comma])
            if said.symbol:
                if not _EXPONENT.match(body, comma + 1):
                    break
                if opening.symbol:
                    shells.append((first, past, opening, columns, start))
                opening, columns = said, []
                first, start, mark = index, total, len(texts)
            else:
                length = said.last - said.first
                if index != past or not 0 < length == count - 2 or said.last > counts[first] - 2:
                    break
                columns.append((said.first, said.last, total - start + 2))
            texts += ("0 0", body[comma + 1 :])
            total += count
            index = past = index + 1
        if opening.symbol and (index == end or (inside and bodies[index] == "}")):
            shells.append((first, past, opening, columns, start))
        elif opening.symbol:  # the basis does not end here, so what follows may belong to this one
            del texts[mark:]
            total = start
        return SoundRun(shells, texts, total) if shells else None

    def opening(self, text: str) -> Opening:
        """What the first two fields of a statement say."""
        name, symbol = (field.strip() for field in text.split(","))
        match = RANGE.fullmatch(symbol) if name.lower() == "c" else None
        said = _NOTHING
        if name.lower() in _LETTERS and symbol.isalpha() and len(symbol) < 4:
            said = Opening(name, symbol)
        elif match is not None and 0 < int(match[1]) <= int(match[2]):
            said = Opening("c", "", int(match[1]) - 1, int(match[2]))
        self.openings[text] = said
        return said


def cuts(count: int, columns: Sequence[Column]) -> Iterator[Cut]:
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
