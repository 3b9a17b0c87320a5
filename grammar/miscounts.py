"""What is wrong with a counted table whose numbers are not as many as its heading announces.

The lines tell more than the total: where all rows but one have the announced length, that one is
the fault; where every row fits, the number of rows is.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from itertools import accumulate

from overlapse.grammar.building import BlockDraft, Build, Run
from overlapse.grammar.model import Grid, letter_of
from overlapse.grammar.numbers import read_number

Shape = tuple[int, int]


@dataclass
class Miscount:
    """A table of ``announced`` (nprim, ncontr), its heading on line ``heading`` (0-based)."""

    build: Build
    block: BlockDraft
    l: int
    heading: int
    announced: Shape
    run: Run

    @property
    def name(self) -> str:
        return f"{letter_of(self.l)}-1"

    @property
    def widths(self) -> list[int]:
        """How many numbers stand on each line."""
        return [len(row) for row in self.run.rows]

    @property
    def numbers(self) -> int:
        return self.announced[0] * (1 + self.announced[1])

    def is_misspelt(self) -> bool:
        """Whether numbers run together make up for all that is missing."""
        joined = sum("together" in read_number(w).slip for row in self.run.rows for w in row)
        return joined > 0 and sum(self.widths) + joined == self.numbers

    def say_rows(self) -> tuple[Shape, Grid] | None:
        """Say what is wrong with a table of rows; its shape and grid if it can be kept."""
        count, columns = self.announced
        widths = self.widths
        if set(widths) == {widths[0]} and len(widths) == count and widths[0] > 1:
            return self._say_columns(widths[0])
        pattern = _pattern(widths, columns + 1)
        if pattern is None or len(widths) < len(pattern):
            self._say_total()
            return None
        if odd := _odd_lines(widths, pattern):
            self._say_lines(odd, pattern, 0)
            return None
        found = len(widths) // len(pattern)
        self._say(0, f"{count} primitives", f"{found} rows", found, count)
        width = columns + 1
        return (found, columns), Grid(0, width, 1, width, 1)

    def _say_columns(self, width: int) -> tuple[Shape, Grid]:
        """All rows are of one length, but of another than announced."""
        count, columns = self.announced
        found = width - 1
        each = f"{found} coefficient{'s' * (found != 1)} in each row"
        self._say(1, f"{columns} contractions", each, found, columns)
        self.block.complete = False
        # Columns beyond the announced ones are never used by who reads by the counts.
        return (count, min(found, columns) or found), Grid(0, width, 1, width, 1)

    def say_list(self) -> None:
        """Say what is wrong with a table whose exponents stand above its matrix."""
        count, columns = self.announced
        widths = self.widths
        totals = list(accumulate(widths))
        above = totals.index(count) + 1 if count in totals[:-1] else 0
        tail = next((k for k, width in enumerate(widths[::-1]) if width != columns), len(widths))
        pattern = _pattern(widths[above:], columns)
        if columns < 2 or pattern is None:
            self._say_total()
        elif above and (odd := _odd_lines(widths[above:], pattern)):
            self._say_lines([above + line for line in odd], pattern, above)
        elif above:
            found = (len(widths) - above) // len(pattern)
            self._say(0, f"{count} rows of coefficients", f"{found} rows", found, count)
        elif tail == count:
            found = sum(widths) - tail * columns
            self._say(0, f"{count} exponents", f"{found} above the matrix", found, count)
        else:
            self._say_total()

    def _say_total(self) -> None:
        count, columns = self.announced
        found = sum(self.widths)
        what = f"{count} exponents and {count} x {columns} coefficients, {self.numbers} numbers"
        self._say(0, what, f"{found} numbers", found, self.numbers)

    def _say(self, word: int, what: str, follows: str, found: int, wanted: int) -> None:
        self.build.fault_word(
            "form.count",
            self.heading,
            word,
            f"the heading announces {what}; {follows} follow",
            element=self.block.symbol,
            shell=self.name,
            measured=found,
            expected=wanted,
            remedy="a number or a row was lost or added, or the heading is wrong: compare with "
            "the source",
        )

    def _say_lines(self, odd: Iterable[int], pattern: list[int], first: int) -> None:
        """Say which lines, from line ``first`` of the table on, do not fit the pattern."""
        for line in odd:
            found, wanted = self.widths[line], pattern[(line - first) % len(pattern)]
            self.build.fault_word(
                "form.count",
                self.run.lines[line],
                min(found, wanted) - (found < wanted),
                f"{found} number{'s' * (found != 1)} on this line where its table has {wanted}",
                element=self.block.symbol,
                shell=self.name,
                measured=found,
                expected=wanted,
                remedy="a number was lost, added or run together with its neighbour",
            )


def _pattern(widths: list[int], size: int) -> list[int] | None:
    """How rows of ``size`` numbers are spread over lines: the numbers on each line of a row."""
    if not widths or size < 1:
        return None
    if max(set(widths), key=widths.count) == size:
        return [size]
    for end, total in enumerate(accumulate(widths), 1):
        if total == size:
            # Rows of single numbers are no rows: these are exponents without coefficients.
            return widths[:end] if widths[0] > 1 else None
        if total > size:
            break
    full, rest = divmod(size, max(widths))
    if full and max(widths) > 1 and widths.count(max(widths)) >= full:
        return [max(widths)] * full + [rest] * (rest > 0)
    return None


def _odd_lines(widths: list[int], pattern: list[int]) -> list[int]:
    """Lines that do not fit the pattern; only the first where a line was lost or added."""
    odd = [k for k, width in enumerate(widths) if width != pattern[k % len(pattern)]]
    return odd if len(widths) % len(pattern) == 0 else odd[:1]
