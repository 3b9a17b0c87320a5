"""What has been read so far and is not yet converted: rows, shells and blocks."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Literal, NamedTuple

from lark import Token, Tree

from overlapse.grammar.model import Grid, Potential, Shell

Role = Literal["orbital", "fitting", "unstated"]
FunctionType = Literal["spherical", "cartesian"]
Node = Tree[Token]


class Run(NamedTuple):
    """Numeric rows that follow one another: their words, and the 0-based line of each.

    ``before`` says how many words stand left of each row on its line, where that is not 0.
    """

    rows: list[list[str]]
    lines: Sequence[int]
    before: Sequence[int] = ()

    def words(self) -> Iterator[tuple[str, int, int]]:
        """Each word with its line and its place on that line (both 0-based)."""
        for at, (row, index) in enumerate(zip(self.rows, self.lines, strict=True)):
            for ordinal, word in enumerate(row, self.before[at] if self.before else 0):
                yield word, index, ordinal


@dataclass(slots=True)
class ShellDraft:
    """A shell whose numbers still are words.

    ``run`` is None for a sound shell, whose rows need not be split.  ``start`` is the place of its
    first word among all words of the file; ``shape`` is (nprim, ncontr); ``grid`` tells exponents
    from coefficients; ``unit`` marks a shell whose coefficients are not written at all because
    every exponent is a function of its own.  ``first`` and ``last`` are its lines (0-based, past
    the end).
    """

    name: str
    angular: tuple[int, ...]
    heading: int
    run: Run | None
    start: int
    shape: tuple[int, int]
    grid: Grid
    scale: float = 1.0
    unit: bool = False
    first: int = 0
    last: int = 0

    def places(self) -> Iterator[int]:
        """Which numbers of the run (0-based) are this shell's exponents and coefficients."""
        (count, columns), grid = self.shape, self.grid
        for row in range(count):
            yield grid.e0 + row * grid.es
            for column in () if self.unit else range(columns):
                yield grid.c0 + row * grid.ci + column * grid.cj


@dataclass
class BlockDraft:
    """What has been read of one element so far."""

    symbol: str
    number: int | None
    line: int
    section: str
    label: str | None = None
    functions: FunctionType | None = None
    role: Role = "unstated"
    shells: list[ShellDraft] = field(default_factory=list)
    potential: Potential | None = None
    complete: bool = True
    end: int = 0
    ready: list[Shell] = field(default_factory=list)  # made by the reader itself
    _names: dict[str, int] = field(default_factory=dict)

    def next_name(self, letters: str) -> str:
        self._names[letters] = self._names.get(letters, 0) + 1
        return f"{letters}-{self._names[letters]}"


def leading(node: Node) -> Token:
    """The token that begins a node, for productions that always begin with one."""
    first = node.children[0]
    assert isinstance(first, Token)
    return first


def index_of(token: Token) -> int:
    """0-based line of a token."""
    return token.line or 0


def shorten(word: str, limit: int = 40) -> str:
    """A word short enough to print."""
    return word if len(word) <= limit else word[: limit - 3] + "..."


def integer(word: str) -> int | None:
    """Value of a word that is an unsigned whole number in ASCII digits of sensible length."""
    return int(word) if word.isascii() and word.isdigit() and len(word) < 16 else None
