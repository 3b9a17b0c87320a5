"""The one model that every layout is read into and every rule looks at.

Units: exponents in bohr**-2.  Coefficients are as written; they multiply normalised primitives
unless a document says otherwise (`Document.raw_primitives`).  Everything here is frozen, is
checked once when it is made, and holds read-only arrays.  Things that hold arrays are equal only
to themselves: whether two of them say the same is a question of its own.
"""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from math import isfinite
from typing import Literal, NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.numbers import FORTRAN, NUMBER
from overlapse.grammar.source import Place, Source

Floats = npt.NDArray[np.float64]
Span = tuple[int, int]
Severity = Literal["error", "warning", "note"]

LETTERS = "spdfghiklmnoqrtuvwxyz"  # spectroscopic order: no j, and p and s not twice


def letter_of(l: int) -> str:
    """Spectroscopic letter of an angular momentum: s, p, d, f, g, h, i, k, l ..."""
    return LETTERS[l] if l < len(LETTERS) else f"l={l}"


class Grid(NamedTuple):
    """Where in a run of numbers exponent i and coefficient (i, j) stand.

    The exponent is number ``e0 + i*es``, the coefficient number ``c0 + i*ci + j*cj``.  Ordinary
    rows of w numbers are ``Grid(0, w, 1, w, 1)``; a list of n exponents followed by an n x m
    matrix is ``Grid(0, 1, n, m, 1)``.
    """

    e0: int
    es: int
    c0: int
    ci: int
    cj: int


@dataclass(slots=True)  # not frozen, which would double the cost of the thousands that are made
class Cells:
    """The numbers of a shell where they stand in the text; found only when somebody asks.

    ``first`` and ``last`` are 0-based line indices, ``last`` past the end; ``comment`` is the sign
    that ends the readable part of a line ("" for none), ``leading`` holds signs that make a whole
    line a comment where they lead it.
    """

    source: Source
    first: int
    last: int
    grid: Grid
    comment: str = ""
    pattern: str = r"\S+"
    skip: int = 0
    leading: str = ""

    def _spans(self) -> list[Span]:
        found: list[Span] = []
        for index in range(self.first, self.last):
            line = self.source.lines[index]
            if self.leading and line.lstrip()[:1] in self.leading:
                continue
            for sign in self.comment:
                line = line.split(sign, 1)[0]
            start = self.source.starts[index]
            found += ((start + m.start(), start + m.end()) for m in re.finditer(self.pattern, line))
        return found[self.skip :]

    def spellings(self, shape: tuple[int, int]) -> tuple[list[str], list[list[str]]]:
        """All numbers as typed: exponents, and coefficients row by row; 1.0 where none is written.

        ``shape`` is (nprim, ncontr).
        """
        text, grid = self.source.text, self.grid
        words = [text[start:end] for start, end in self._spans()]
        exponents = [words[grid.e0 + row * grid.es] for row in range(shape[0])]
        coefficients = []
        for row in range(shape[0]):
            at = [grid.c0 + row * grid.ci + column * grid.cj for column in range(shape[1])]
            coefficients.append([words[k] if k < len(words) else "1.0" for k in at])
        return exponents, coefficients

    def span(self, row: int, column: int | None = None) -> Span:
        """Offsets of exponent ``row``, or of its coefficient in ``column`` (all 0-based)."""
        grid = self.grid
        ordinal = (
            grid.e0 + row * grid.es
            if column is None
            else grid.c0 + row * grid.ci + column * grid.cj
        )
        spans = self._spans()
        if 0 <= ordinal < len(spans):
            return spans[ordinal]
        # A number that the layout leaves unwritten (a lone 1.0) has the place of its exponent.
        return spans[min(max(grid.e0 + row * grid.es, 0), len(spans) - 1)] if spans else (0, 0)

    def at(self, line: int, column: int, shape: tuple[int, int]) -> tuple[int, int | None] | None:
        """Row and coefficient column (None: the exponent) of the number at a place, if any.

        line, column: counted from 1; ``shape`` is (nprim, ncontr).
        """
        if not self.first < line <= self.last:
            return None
        grid, offset = self.grid, self.source.starts[line - 1] + column - 1
        found = [k for k, (start, end) in enumerate(self._spans()) if start <= offset < end]
        for row in range(shape[0]):
            if grid.e0 + row * grid.es in found:
                return row, None
            for j in range(shape[1]):
                if grid.c0 + row * grid.ci + j * grid.cj in found:
                    return row, j
        return None

    def spelling(self, row: int, column: int | None = None) -> str:
        """The number as it was typed."""
        start, end = self.span(row, column)
        return self.source.text[start:end]


def read_only(values: object) -> Floats:
    """A float array that cannot be written to; shares memory where that is already so."""
    array = np.asarray(values, dtype=np.float64)
    if array.flags.writeable:
        array = array.copy()
        array.flags.writeable = False
    return array


def _all_finite(array: Floats) -> bool:
    # Most shells are small, and then numpy's start-up costs more than the work.
    if array.size < 32:
        return all(map(isfinite, array.ravel().tolist()))
    return bool(np.isfinite(array).all())


class Function(NamedTuple):
    """One contracted function of a shell.

    ``exponents`` shape (n,), ``coefficients`` shape (n,): only primitives with a coefficient other
    than zero.  ``rows`` are their rows in the shell, ``column`` the coefficient column.
    """

    l: int
    exponents: Floats
    coefficients: Floats
    rows: npt.NDArray[np.intp]
    column: int


@dataclass(frozen=True, slots=True, eq=False)
class Shell:
    """Contracted functions that share one list of primitives.

    angular: angular momenta, ``(l,)``, or ``(0, 1)`` for a shell whose s and p functions share
        their exponents; then the first half of the columns is s, the second half p.
    exponents: shape (nprim,), bohr**-2, as the program that reads the file would use them.
    coefficients: shape (nprim, ncontr), as written.
    line: line of the heading (or of the first row), counted from 1.
    cells: the numbers' places in the text, or None for a shell that was made by hand.
    """

    angular: tuple[int, ...]
    exponents: Floats
    coefficients: Floats
    line: int = 1
    cells: Cells | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "exponents", read_only(self.exponents))
        object.__setattr__(self, "coefficients", read_only(self.coefficients))
        e, c = self.exponents, self.coefficients
        if e.ndim != 1 or c.ndim != 2 or e.shape[0] != c.shape[0] or not e.size:
            raise ValueError(f"exponents of shape {e.shape} do not fit coefficients {c.shape}")
        if not (_all_finite(e) and _all_finite(c)):
            raise ValueError("exponents and coefficients must be finite")
        if not self.angular or min(self.angular) < 0 or c.shape[1] % len(self.angular):
            raise ValueError(f"angular momenta {self.angular} do not fit {c.shape[1]} columns")

    @classmethod
    def checked(
        cls,
        angular: tuple[int, ...],
        exponents: Floats,
        coefficients: Floats,
        line: int,
        cells: Cells | None,
    ) -> "Shell":
        """A shell of parts that are known to be sound and read-only, made without checking again.

        A file holds thousands of shells; their numbers are checked together before they are cut
        into arrays.
        """
        shell = cls.__new__(cls)
        _put_angular(shell, angular)
        _put_exponents(shell, exponents)
        _put_coefficients(shell, coefficients)
        _put_line(shell, line)
        _put_cells(shell, cells)
        return shell

    @property
    def letters(self) -> str:
        """The shell's letter or letters: "s", "d", "sp"."""
        return "".join(letter_of(l) for l in self.angular)

    @property
    def columns_per_l(self) -> int:
        """Number of contracted functions for each of the shell's angular momenta."""
        return int(self.coefficients.shape[1]) // len(self.angular)

    def functions(self) -> Iterator[Function]:
        """The contracted functions one by one, without the primitives they do not use."""
        each = self.columns_per_l
        for column in range(self.coefficients.shape[1]):
            used = np.flatnonzero(self.coefficients[:, column])
            yield Function(
                self.angular[column // each],
                self.exponents[used],
                self.coefficients[used, column],
                used,
                column,
            )

    def normalised(self) -> Floats:
        """Coefficients scaled so that every contracted function has self-overlap one.

        Shape (nprim, ncontr).  A column that cannot be normalised (all zero, or an exponent that
        is not positive) comes back as NaN.  Formula: `overlapse.rules.physics.onecentre`, stated
        here again in its simplest form because the model may not import the rules.
        """
        scaled = np.array(self.coefficients)
        with np.errstate(all="ignore"):
            ratio = self.exponents[:, None] / self.exponents[None, :]
            lean = 2.0 / (np.sqrt(ratio) + 1.0 / np.sqrt(ratio))
            for column in range(scaled.shape[1]):
                power = self.angular[column // self.columns_per_l] + 1.5
                norm = scaled[:, column] @ lean**power @ scaled[:, column]
                scaled[:, column] /= np.sqrt(norm)
        scaled[~np.isfinite(scaled)] = np.nan
        return read_only(scaled)

    def number(self, row: int, column: int | None = None) -> float:
        """An exponent, or a coefficient of a column (0-based)."""
        return float(self.exponents[row] if column is None else self.coefficients[row, column])

    def place(self, row: int | None = None, column: int | None = None) -> Place:
        """Where the shell stands, or one of its numbers (0-based row and column)."""
        if row is None or self.cells is None:
            return Place(self.line, 1)
        return self.cells.source.place(self.cells.span(row, column)[0])

    def spellings(self) -> tuple[list[str], list[list[str]]]:
        """Exponents (nprim) and coefficients (nprim x ncontr) as they were typed.

        A number whose typed form does not give the model's value (a scale factor was applied, a
        slip was read as the likely number, a lone 1.0 was left out) comes as its shortest exact
        decimal form instead.
        """
        shape = (int(self.coefficients.shape[0]), int(self.coefficients.shape[1]))
        if self.cells is None:
            return list(map(repr, self.exponents.tolist())), [
                list(map(repr, row)) for row in self.coefficients.tolist()
            ]
        exponents, coefficients = self.cells.spellings(shape)
        return (
            list(map(_exact, exponents, self.exponents.tolist())),
            [
                list(map(_exact, words, row))
                for words, row in zip(coefficients, self.coefficients.tolist(), strict=True)
            ],
        )

    def spelling(self, row: int, column: int | None = None) -> str:
        """An exponent, or a coefficient, as it was typed."""
        if self.cells is not None:
            return self.cells.spelling(row, column)
        value = self.exponents[row] if column is None else self.coefficients[row, column]
        return repr(float(value))


# The quick way into the slots of a frozen shell.
_put_angular, _put_exponents, _put_coefficients, _put_line, _put_cells = (
    getattr(Shell, name).__set__ for name in Shell.__slots__
)


def _exact(word: str, value: float) -> str:
    """The word if it is a spelling of the value, else the value's shortest exact spelling."""
    return (
        word if NUMBER.fullmatch(word) and float(word.translate(FORTRAN)) == value else repr(value)
    )


@dataclass(frozen=True, slots=True, eq=False)
class Channel:
    """One angular part of a core potential: the sum of c * r**(power-2) * exp(-exponent * r**2).

    l: angular momentum of the projector; the local part carries the highest l and ``local``.
    powers, exponents, coefficients: shape (nterms,).  Powers are as written: the usual habit
    counts r**n / r**2, so 0, 1 and 2 stand for r**-2, r**-1 and r**0.
    """

    l: int
    local: bool
    powers: tuple[int, ...]
    exponents: Floats
    coefficients: Floats
    line: int = 1
    title: str = ""
    kind: Literal["scalar", "spin-orbit"] = "scalar"

    def __post_init__(self) -> None:
        object.__setattr__(self, "exponents", read_only(self.exponents))
        object.__setattr__(self, "coefficients", read_only(self.coefficients))
        if not len(self.powers) == len(self.exponents) == len(self.coefficients):
            raise ValueError("powers, exponents and coefficients must have one length")


@dataclass(frozen=True, slots=True, eq=False)
class Potential:
    """An effective core potential: how many electrons it replaces, and its channels."""

    electrons: int
    channels: tuple[Channel, ...]
    line: int = 1

    def __post_init__(self) -> None:
        if self.electrons < 0:
            raise ValueError("a core potential cannot replace fewer than no electrons")


@dataclass(frozen=True, eq=False)
class Block:
    """What one set says about one element.

    atomic_number: Z.  label: the set's name as the block claims it, or None.  functions:
    "spherical", "cartesian", or None where the file does not say.  complete: False when the
    reader had to leave something out, so that counting what is missing would mislead.
    line: line of the block's heading, counted from 1; end: its last line.
    """

    atomic_number: int
    shells: tuple[Shell, ...]
    potential: Potential | None = None
    label: str | None = None
    functions: Literal["spherical", "cartesian"] | None = None
    complete: bool = True
    line: int = 1
    end: int = 1

    def __post_init__(self) -> None:
        if not 1 <= self.atomic_number <= 118:
            raise ValueError(f"no element has the atomic number {self.atomic_number}")

    @property
    def symbol(self) -> str:
        return symbol_of(self.atomic_number)

    @cached_property
    def names(self) -> tuple[str, ...]:
        """Name of each shell: its letter and its place among the shells of that letter."""
        seen: dict[str, int] = {}
        names = []
        for shell in self.shells:
            seen[shell.letters] = seen.get(shell.letters, 0) + 1
            names.append(f"{shell.letters}-{seen[shell.letters]}")
        return tuple(names)

    def functions_of(self, l: int) -> list[tuple[int, Function]]:
        """Contracted functions of one angular momentum, each with the index of its shell."""
        return [found for found in self.contracted if found[1].l == l]

    @cached_property
    def contracted(self) -> tuple[tuple[int, Function], ...]:
        """All contracted functions, each with the index of its shell."""
        return tuple(
            (index, function)
            for index, shell in enumerate(self.shells)
            for function in shell.functions()
        )

    @cached_property
    def counts(self) -> dict[int, int]:
        """Number of contracted functions for each angular momentum that occurs."""
        counts: dict[int, int] = {}
        for shell in self.shells:
            for l in shell.angular:
                counts[l] = counts.get(l, 0) + shell.columns_per_l
        return dict(sorted(counts.items()))


@dataclass(frozen=True, eq=False)
class BasisSet:
    """Blocks that belong together: one name, each element once.

    role: "orbital" or "fitting" where the layout says so, else "unstated".
    """

    blocks: tuple[Block, ...]
    label: str | None = None
    role: Literal["orbital", "fitting", "unstated"] = "unstated"
    line: int = 1


class Remark(NamedTuple):
    """A comment: its text without the comment sign, and its line, counted from 1."""

    text: str
    line: int


@dataclass(frozen=True, slots=True)
class Fault:
    """Something about the form of the text that the reader had to say; becomes a finding.

    edits: spans of the text and what to put there, which would mend it.
    """

    rule: str
    message: str
    span: Span
    severity: Severity = "error"
    element: str | None = None
    shell: str | None = None
    measured: float | str | None = None
    limit: float | str | None = None
    expected: float | str | None = None
    remedy: str = ""
    edits: tuple[tuple[Span, str], ...] = ()


@dataclass(frozen=True, eq=False)
class Document:
    """A text and what it says.

    layout: name of the layout it was read as, "" if none was recognised; reason: why that one.
    raw_primitives: True where the coefficients multiply primitives that are not normalised; they
        stay as written, and `overlapse.grammar.convention.over_normalised` converts them.
    """

    source: Source
    layout: str
    sets: tuple[BasisSet, ...] = ()
    remarks: tuple[Remark, ...] = ()
    faults: tuple[Fault, ...] = ()
    reason: str = ""
    raw_primitives: bool = False

    @property
    def path(self) -> str:
        return self.source.path

    @property
    def blocks(self) -> tuple[Block, ...]:
        """All blocks of all sets, in the order of the text."""
        found = [block for members in self.sets for block in members.blocks]
        return tuple(sorted(found, key=lambda block: block.line))
