"""One of two blocks under comparison: its functions one by one, and where their numbers stand."""

import re
from functools import cached_property
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Block, Channel, Document, Function
from overlapse.grammar.numbers import FORTRAN, NUMBER
from overlapse.rules.compare.canonical import in_order
from overlapse.rules.compare.printed import Printed, printed
from overlapse.rules.physics.onecentre import self_overlap


class Member(NamedTuple):
    """A contracted function, its primitives by falling exponent, and the index of its shell."""

    shell: int
    function: Function


class Spot(NamedTuple):
    """A number of a text: line and column counted from 1, its spelling and value, its shell."""

    line: int
    column: int
    spelling: str
    value: float
    shell: str


class Difference(NamedTuple):
    """Something that two blocks have differently.

    what: "exponent", "coefficient", "row", "function", or a part of the potential in words.
    left, right: where it stands, None where that side has nothing of the kind.  rounded: the two
    are one number, printed with fewer digits on one side.
    """

    what: str
    left: Spot | None
    right: Spot | None
    rounded: bool = False

    @property
    def apart(self) -> float | None:
        """Right less left, None where one is missing."""
        return None if self.left is None or self.right is None else (
            self.right.value - self.left.value
        )  # fmt: skip


class Side:
    """A block of a document."""

    def __init__(self, document: Document, block: Block) -> None:
        self.document = document
        self.block = block
        self._words: dict[int, tuple[list[str], list[list[str]]]] = {}

    @cached_property
    def members(self) -> dict[int, list[Member]]:
        """For each l, the functions that have a primitive at all."""
        found: dict[int, list[Member]] = {}
        for shell, function in self.block.contracted:
            if len(function.exponents):
                found.setdefault(function.l, []).append(Member(shell, in_order(function)))
        return found

    def name(self, member: Member) -> str:
        """The shell's name, with the column of a general contraction."""
        shell, name = self.block.shells[member.shell], self.block.names[member.shell]
        each = shell.columns_per_l
        return name if each == 1 else f"{name}/{member.function.column % each + 1}"

    def _spelled(self, index: int) -> tuple[list[str], list[list[str]]]:
        if index not in self._words:
            shell = self.block.shells[index]
            shape = (int(shell.coefficients.shape[0]), int(shell.coefficients.shape[1]))
            cells = shell.cells
            self._words[index] = shell.spellings() if cells is None else cells.spellings(shape)
        return self._words[index]

    def exponent(self, member: Member, at: int) -> Printed:
        """Exponent ``at`` of a function, with its spelling."""
        words, _ = self._spelled(member.shell)
        return printed(float(member.function.exponents[at]), words[member.function.rows[at]])

    def coefficient(self, member: Member, at: int) -> Printed:
        """Coefficient ``at`` of a function, with its spelling."""
        _, words = self._spelled(member.shell)
        function = member.function
        word = words[function.rows[at]][function.column]
        return printed(float(function.coefficients[at]), word)

    def spot(self, member: Member, at: int = 0, coefficient: bool = False) -> Spot:
        """Where exponent or coefficient ``at`` of a function stands."""
        function = member.function
        column = function.column if coefficient else None
        place = self.block.shells[member.shell].place(int(function.rows[at]), column)
        number = self.coefficient(member, at) if coefficient else self.exponent(member, at)
        return Spot(place.line, place.column, number.word, number.value, self.name(member))

    def error(self, member: Member) -> float:
        """How uncertain the printed digits leave a function, as a share of its norm.

        Half a unit of the last place in each number.  A primitive whose ln(exponent) is off by x
        is off by x sqrt(l + 3/2) / 2, from the second derivative of the overlap of two primitives.
        """
        function = member.function
        numbers = range(len(function.exponents))
        exponents = [self.exponent(member, at) for at in numbers]
        with np.errstate(all="ignore"):
            steps = np.array([self.coefficient(member, at).step for at in numbers])
            slides = np.array([e.step for e in exponents]) / np.abs(function.exponents)
            moved = function.coefficients * slides * (function.l + 1.5) ** 0.5 / 2
            total = 0.25 * float(steps @ steps + moved @ moved)
            norm = self_overlap(function.exponents, function.coefficients, function.l)
            return float(np.sqrt(total / norm)) if norm > 0 else float("nan")

    def term_spot(self, channel: Channel, value: float, name: str) -> Spot:
        """Where a number of a potential's channel stands: the first of its value from there on."""
        lines = self.document.source.lines
        first = channel.line - 1
        # One text has a term on a line, another each of its numbers.
        for index in range(first, min(len(lines), first + 4 * len(channel.powers) + 12)):
            for match in re.finditer(NUMBER, lines[index]):
                if float(match[0].translate(FORTRAN)) == value:
                    return Spot(index + 1, match.start() + 1, match[0], value, name)
        return Spot(channel.line, 1, repr(value), value, name)
