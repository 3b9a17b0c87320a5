"""Lists of counts, and the numbers that they announce, cut into exponents and matrices.

Layouts that announce all shells of an element first give their numbers afterwards as one stream:
exponents, then a row of coefficients for each exponent, shell by shell.  The counts say where each
piece ends; lines and blank lines say where a number was lost or added.
"""

import re
from bisect import bisect_left, bisect_right
from functools import lru_cache
from itertools import accumulate, pairwise
from typing import NamedTuple

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Run
from overlapse.grammar.model import LETTERS, Grid, letter_of

WHOLE = re.compile(r"[0-9]{1,15}(?:[ \t]+[0-9]{1,15})*")

_REMEDY = "a number was lost or added, or the lists are wrong: compare with the source"


class Entry(NamedTuple):
    """What is announced for one shell, and which numbers of the lists say so (0-based)."""

    l: int
    primitives: int
    contractions: int
    at_primitives: int
    at_contractions: int


def sizes_of(entries: list[Entry]) -> list[int]:
    """How many exponents and how many coefficients each shell has, one after the other."""
    return [size for _, n, columns, _, _ in entries for size in (n, n * columns)]


class Lists:
    """The lists of one element: a number of shells, then l, contractions and primitives of each.

    ``run`` holds their lines.
    """

    def __init__(self, build: Build, block: BlockDraft, run: Run) -> None:
        self.build = build
        self.block = block
        self.run = run

    def entries(self) -> list[Entry] | None:
        """What is announced, or None, with faults, where that is not clear."""
        whole = self._whole_numbers()
        found = None if whole is None else self._three(whole)
        if found is None:
            self.block.complete = False
            return None
        (momenta, contractions, primitives), start = found
        count = len(momenta)
        places = (
            range(start + 2 * count, start + 3 * count),
            range(start + count, start + 2 * count),
        )
        made = list(map(Entry, momenta, primitives, contractions, *places))
        if max(momenta) < len(LETTERS) and 0 not in contractions and 0 not in primitives:
            return made
        sound = [self._is_sensible(entry, start + at) for at, entry in enumerate(made)]
        return [entry for entry in made if entry.primitives] if all(sound) else None

    def _whole_numbers(self) -> list[list[int]] | None:
        table: list[list[int]] = []
        for row, index in zip(self.run.rows, self.run.lines, strict=True):
            if WHOLE.fullmatch(self.build.bodies[index]):
                table.append(list(map(int, row)))
                continue
            whole = self.build.whole_numbers(row, index, self.block.symbol)
            if whole is None:
                return None
            table.append(whole)
        return table

    def _three(self, table: list[list[int]]) -> tuple[list[list[int]], int] | None:
        """The three lists, and which number the first one begins with; or None, with faults."""
        numbers = [number for row in table for number in row]
        count, found = numbers[0], len(numbers) - 1
        if count and found == 3 * count:
            return [numbers[1 + k * count : 1 + (k + 1) * count] for k in range(3)], 1
        lengths = {len(row) for row in table[-3:]}
        if len(table) == 3 and len(lengths) == 1:
            message = "the number of matrices is missing above this line"
            self.say(0, message, expected=len(table[0]))
            return table, 0
        if len(table) != 4 or len(table[0]) > 1:
            message = (
                f"{count} matrices are announced, which want three lists of {count} numbers; "
                f"{found} numbers follow"
            )
            self.say(0, message, found, 3 * count)
            return None
        if len(lengths) == 1:
            length = max(lengths)
            message = f"{count} matrices are announced, the lists have {length} numbers each"
            self.say(0, message, length, count)
            return table[1:], 1
        at = 1
        for row, what in zip(table[1:], ("l", "contractions", "primitives"), strict=True):
            if len(row) != count:
                message = f"the list of {what} has {len(row)} of {count} numbers"
                self.say(at, message, len(row), count)
            at += len(row)
        return None

    def _is_sensible(self, entry: Entry, at: int) -> bool:
        l, primitives, contractions = entry[:3]
        if l >= len(LETTERS):
            self.say(
                at, f"l = {l} is no angular momentum of a basis function", l, rule="form.letter"
            )
        elif bool(primitives) != bool(contractions):
            message = f"{contractions} contractions of {primitives} primitives are announced"
            self.say(entry.at_contractions, message, contractions)
        else:
            return True
        self.block.complete = False
        return False

    def say(
        self,
        ordinal: int,
        message: str,
        found: int | None = None,
        expected: int | None = None,
        rule: str = "form.count",
    ) -> None:
        """Note a fault in one number of the lists."""
        self.block.complete = False
        row = 0
        while ordinal >= len(self.run.rows[row]):
            ordinal -= len(self.run.rows[row])
            row += 1
        self.build.fault_word(
            rule,
            self.run.lines[row],
            ordinal,
            message,
            element=self.block.symbol,
            measured=found,
            expected=expected,
            remedy=_REMEDY,
        )


def cut_by_lines(build: Build, block: BlockDraft, entries: list[Entry], lines: range) -> bool:
    """Hand shells to the build whose exponents and matrices all begin with lines, if they do.

    ``lines`` (0-based) hold all their numbers, and no others.
    """
    above = list(accumulate(build.widths[lines.start : lines.stop], initial=0))
    bounds = list(accumulate(sizes_of(entries), initial=0))
    ends = [bisect_left(above, bound) for bound in bounds]
    if above[-1] != bounds[-1] or [above[end] for end in ends] != bounds:
        return False
    start = build.take(build.bodies[lines.start : lines.stop], above[-1])
    for entry, bound, end in zip(entries, bounds[::2], ends[2::2], strict=False):
        l, count, columns, _, _ = entry
        # Blank lines have as many numbers above them as the line behind them.
        first, last = lines.start + bisect_right(above, bound) - 1, lines.start + end
        shape, grid = (count, columns), _grid(count, columns)
        build.even_shell(block, (l,), first, first, last, start + bound, shape, grid)
    return True


@lru_cache(256)
def _grid(exponents: int, columns: int) -> Grid:
    """Places of a list of exponents and the matrix behind it."""
    return Grid(0, 1, exponents, columns, 1)


class Cutting:
    """The numbers of one element, in the rows of ``run``, and the shells announced for it."""

    def __init__(self, lists: Lists, entries: list[Entry], run: Run) -> None:
        self.build = lists.build
        self.block = lists.block
        self.lists = lists
        self.entries = entries
        self.run = run
        # How many numbers stand above each line, and in all.
        self.above = list(accumulate(map(len, run.rows), initial=0))

    def cut(self) -> None:
        """Hand the shells to the build, or say what is wrong with them."""
        bounds = list(accumulate(sizes_of(self.entries), initial=0))
        fits = bounds[-1] == self.above[-1]
        paragraphs = [] if fits and set(self.above).issuperset(bounds) else self._paragraphs()
        if not self.run.rows:
            self._say_line(self.lists.run.lines[-1], "no numbers follow these lists", 0, bounds[-1])
        elif len(paragraphs) == 2 * len(self.entries):
            for entry, top, matrix in zip(
                self.entries, paragraphs[::2], paragraphs[1::2], strict=True
            ):
                self._pair(entry, top, matrix)
        elif fits:
            for entry, first, second in zip(self.entries, bounds[::2], bounds[1::2], strict=False):
                self._add(entry, first, second)
        else:
            self._by_lines(bounds)

    def _paragraphs(self) -> list[range]:
        """Rows that follow one another without a blank line between them."""
        lines = self.run.lines
        starts = [at for at in range(len(lines)) if at == 0 or lines[at] > lines[at - 1] + 1]
        return [range(first, last) for first, last in pairwise([*starts, len(lines)])]

    def _add(self, entry: Entry, first: int, second: int, rows: int = 0, columns: int = 0) -> None:
        """A shell whose exponents and coefficients begin at the given numbers of the stream."""
        shape = rows or entry.primitives, columns or entry.contractions
        run = self._part(first, second + shape[0] * shape[1])
        grid = Grid(0, 1, second - first, shape[1], 1)
        self.build.matrix(self.block, entry.l, run.lines[0], run, shape, grid)

    def _part(self, first: int, last: int) -> Run:
        """The numbers from one to before another, as a run of their own."""
        top = bisect_right(self.above, first) - 1
        end = bisect_left(self.above, last)
        rows, skip = self.run.rows[top:end], first - self.above[top]
        if last < self.above[end]:
            rows[-1] = rows[-1][: last - self.above[end]]
        if not skip:
            return Run(rows, self.run.lines[top:end])
        rows[0] = rows[0][skip:]
        return Run(rows, self.run.lines[top:end], [skip, *[0] * (end - top - 1)])

    def _rows(self, first: int, last: int | None = None) -> Run:
        return Run(self.run.rows[first:last], self.run.lines[first:last])

    def _pass_over(self, first: int, last: int | None = None) -> None:
        """Rows that make no shell: only their spelling is looked at."""
        self.build.check_words(self.block, "", self._rows(first, last))

    # ---- what does not fit

    def _pair(self, entry: Entry, top: range, matrix: range) -> None:
        """A shell whose exponents and matrix are paragraphs of their own."""
        first, second = self.above[top.start], self.above[matrix.start]
        exponents, coefficients = self.above[top.stop] - first, self.above[matrix.stop] - second
        wanted, columns, letter = entry.primitives, entry.contractions, letter_of(entry.l)
        rows = self._rows(matrix.start, matrix.stop)
        widths = set(map(len, rows.rows))
        if (exponents, coefficients) == (wanted, wanted * columns):
            self._add(entry, first, second)
        elif exponents != wanted and coefficients == exponents * columns:
            message = f"{wanted} primitives of {letter} are announced, {exponents} follow"
            self.lists.say(entry.at_primitives, message, exponents, wanted)
            self._add(entry, first, second, rows=exponents)
        elif exponents == wanted == len(matrix) > 1 and len(widths) == 1:
            found = max(widths)
            message = f"{columns} contractions of {letter} are announced, rows have {found} numbers"
            self.lists.say(entry.at_contractions, message, found, columns)
            self._add(entry, first, second, columns=found)
        else:
            self._say_pair(entry, self._rows(top.start, top.stop), rows)
            self._pass_over(top.start, matrix.stop)

    def _say_pair(self, entry: Entry, top: Run, matrix: Run) -> None:
        """What is wrong with exponents and matrix that make no shell."""
        self.block.complete = False
        wanted, columns, letter = entry.primitives, entry.contractions, letter_of(entry.l)
        exponents, coefficients = sum(map(len, top.rows)), sum(map(len, matrix.rows))
        if exponents != wanted:
            message = f"{exponents} exponents of {letter} where {wanted} are announced"
            self._say_line(top.lines[0], message, exponents, wanted)
        elif len(matrix.rows) != wanted:
            message = (
                f"{coefficients} coefficients of {letter} in {len(matrix.rows)} rows where "
                f"{wanted} rows of {columns} are announced"
            )
            self._say_line(matrix.lines[0], message, coefficients, wanted * columns)
        else:
            name, holds = self.block.next_name(letter), f"the matrix of {letter} has {columns}"
            self.build.check_rows(self.block, name, matrix, columns, holds)

    def _by_lines(self, bounds: list[int]) -> None:
        """Shells up to the first one that does not end with a line; then what is wrong."""
        ends = set(self.above)
        for entry, first, second, last in zip(
            self.entries, bounds[::2], bounds[1::2], bounds[2::2], strict=False
        ):
            for what, bound in ("exponents", second), ("coefficients", last):
                if bound not in ends:
                    self._say_break(f"{what} of {letter_of(entry.l)}", bound, bounds[-1])
                    self._pass_over(bisect_left(self.above, first))
                    return
            self._add(entry, first, second)
        left = self.above[-1] - bounds[-1]
        after = bisect_left(self.above, bounds[-1])
        message = f"{left} number{'s' * (left > 1)} too many from here on: all matrices are full"
        self._say_line(self.run.lines[after], message, self.above[-1], bounds[-1])
        self._pass_over(after)

    def _say_break(self, what: str, bound: int, wanted: int) -> None:
        total = self.above[-1]
        if bound > total:
            line = self.run.lines[-1]
            message = f"the numbers end among the {what}: {wanted} are announced, {total} follow"
        else:
            line = self.run.lines[bisect_right(self.above, bound) - 1]
            message = f"this line begins among the {what} and runs on behind them"
        self._say_line(line, message, total, wanted)

    def _say_line(self, index: int, message: str, found: int, wanted: int) -> None:
        self.block.complete = False
        self.build.fault_line(
            "form.count",
            index,
            message,
            element=self.block.symbol,
            measured=found,
            expected=wanted,
            remedy=_REMEDY,
        )
