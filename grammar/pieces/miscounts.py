"""What is wrong with a counted table whose numbers are not as many as its heading announces.

The lines tell more than the total: where all rows but one have the announced length, that one is
the fault; where every row fits, the number of rows is.
"""

from dataclasses import dataclass
from itertools import accumulate

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Run
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
        found, rest = divmod(len(widths), len(pattern)) if pattern else (0, 0)
        if pattern and (odd := _odd_lines(widths, pattern)):
            self._say_lines(odd, 0)
        elif found == 0 or rest:
            self._say_total()
        else:
            self._say(0, f"{count} primitives", f"{found} rows", found, count)
            width = columns + 1
            return (found, columns), Grid(0, width, 1, width, 1)
        return None

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
            self._say_lines(odd, above)
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

    def _say_lines(self, odd: dict[int, int], first: int) -> None:
        """Say which lines, counted from line ``first`` of the table, do not fit their table."""
        for line, wanted in odd.items():
            found = self.widths[first + line]
            self.build.fault_word(
                "form.count",
                self.run.lines[first + line],
                min(found, wanted) - (found < wanted) if found - wanted in (-1, 1) else 0,
                f"{found} number{'s' * (found != 1)} on this line where its table has {wanted}",
                element=self.block.symbol,
                shell=self.name,
                measured=found,
                expected=wanted,
                remedy="a number or a line was lost or added, or numbers are run together",
            )


def _pattern(widths: list[int], size: int) -> list[int] | None:
    """How rows of ``size`` numbers are spread over lines: the numbers on each line of a row."""
    longest = max(widths, default=0)
    if size < 1 or longest < 2 < size or not longest:
        return None  # single numbers are no rows: these are exponents without coefficients
    likely = [[size]] if size in widths else []
    totals = list(accumulate(widths))
    if size in totals:
        likely.append(widths[: totals.index(size) + 1])
    common = [width for width in widths if 3 * widths.count(width) >= len(widths)]
    for full_line in {longest, max(common, default=longest)}:
        full, rest = divmod(size, full_line)
        if widths.count(full_line) >= full > 0:
            likely.append([full_line] * full + [rest] * (rest > 0))
    return min(likely, key=lambda pattern: (len(_odd_lines(widths, pattern)), len(pattern)),
               default=None)  # fmt: skip


def _odd_lines(widths: list[int], pattern: list[int]) -> dict[int, int]:
    """Lines that do not fit the pattern, and how many numbers each should have.

    Where the line below a wrong one does not fit either, a line was lost or added above: what
    follows is counted from the place that the line fits.
    """
    odd: dict[int, int] = {}
    at = 0
    for line, width in enumerate(widths):
        below = (at + 1) % len(pattern)
        if width != pattern[at]:
            odd[line] = pattern[at]
            if width in pattern and widths[line + 1 : line + 2] not in ([], [pattern[below]]):
                below = (pattern.index(width) + 1) % len(pattern)
        at = below
    return odd
