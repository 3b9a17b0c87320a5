"""From lines to a document: what all readers share.

A reader goes three steps.  `Build.tokens` turns lines into few, large tokens: headings, and runs
of numeric rows that stay unsplit.  `parse` puts them through the layout's LALR grammar, whose tree
states the layout (and its common slips) on a page.  The reader walks the tree and hands what it
finds to `Build.open_block`, `Build.shell` and their kin; `Build.document` then converts all numbers
of the file in one go and makes the model.  Positions of single numbers are worked out only for
faults.
"""

from collections.abc import Collection, Iterable
from contextlib import suppress
from math import isfinite
from typing import Literal

import numpy as np
from lark import Token

from overlapse.grammar.checks import WITHOUT_J
from overlapse.grammar.drafts import BlockDraft, FunctionType, Role, Run, ShellDraft
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.making import Making
from overlapse.grammar.model import Channel, Grid, letter_of
from overlapse.grammar.numbers import FORTRAN, has_only_characters, read_number
from overlapse.grammar.repairing import first_word_span
from overlapse.grammar.source import Source

_ONE = ("1.00", "1.0", "1.000000")  # usual spellings of a scale factor that changes nothing
_ORDINALS = tuple(f"{number} " for number in range(1, 100))


class Build(Making):
    """Collects what a reader finds and makes the document of it."""

    def __init__(
        self,
        source: Source,
        layout: str,
        comment: str = "",
        word_pattern: str = r"\S+",
        windows: Collection[range] | None = None,
    ) -> None:
        """As `Lines`."""
        super().__init__(source, layout, comment, word_pattern, windows)
        self.letters = {}
        self.blocks = []
        self.pieces = []
        self.count = 0
        self._grids: dict[tuple[int, int], Grid] = {}

    def open_block(
        self,
        symbol: str,
        index: int,
        *,
        section: str = "",
        label: str | None = None,
        functions: FunctionType | None = None,
        role: Role = "unstated",
        word: int = 0,
    ) -> BlockDraft:
        """Begin the block of an element whose heading is line ``index`` (0-based).

        ``section`` keeps sets of one file apart: blocks of one section belong to one set.
        """
        number = number_of(symbol)
        if number is None:
            from difflib import get_close_matches

            near = get_close_matches(
                symbol.capitalize(), [symbol_of(z) for z in range(1, 119)], 1, 0.4
            )
            self.fault_word(
                "form.element",
                index,
                word,
                f"{symbol!r} is no element's symbol",
                measured=symbol,
                expected=near[0] if near else None,
                remedy="write the symbol of the element that this block describes",
            )
        block = BlockDraft(symbol, number, index, section, label, functions, role, end=index)
        self.blocks.append(block)
        return block

    # ---- shells

    def take_rows(self, first: int, last: int, width: int) -> int | None:
        """Take in lines ``first`` up to ``last``, if all have ``width`` words.

        The place of their first number is for `even_shell`.
        """
        if self.widths[first:last].count(width) != last - first:
            return None
        return self.take(self.bodies[first:last], (last - first) * width)

    def take(self, texts: list[str], count: int) -> int:
        """Take in texts that hold ``count`` numbers: the place of the first."""
        self.pieces += texts
        self.count += count
        return self.count - count

    def sound_shell(
        self,
        block: BlockDraft,
        letters: str,
        heading: int,
        first: int,
        last: int,
        announced: str | None,
        general: bool = False,
        scale: float = 1.0,
        lead: int = 0,
    ) -> bool:
        """Add a shell that is just what its heading announces, and say whether it was one.

        The quick way past `shell` for what nearly all shells are: known letters, rows of one
        fitting width, and as many as announced.  Rows are lines ``first`` up to ``last``;
        ``lead`` is 1 where they begin with their number.
        """
        angular = self.letters.get(letters)
        if angular is None or angular == (8,):
            return False
        count, width = last - first, self.widths[first]
        if announced is not None and announced != str(count):
            return False
        if width != lead + 1 + len(angular) and not (general and len(angular) == 1 < width):
            return False
        if lead and not _are_numbered(self.bodies[first:last]):
            return False
        if general and width > 2 and _is_index(row.split() for row in self.bodies[first:last]):
            return False
        start = self.take_rows(first, last, width)
        if start is None:
            return False
        grid = self._grids.get((width, lead))
        if grid is None:
            grid = self._grids[width, lead] = Grid(lead, width, lead + 1, width, 1)
        shape = (count, width - lead - 1)
        self.even_shell(block, angular, heading, first, last, start, shape, grid, scale)
        return True

    def even_shell(
        self,
        block: BlockDraft,
        angular: tuple[int, ...],
        heading: int,
        first: int,
        last: int,
        start: int,
        shape: tuple[int, int],
        grid: Grid,
        scale: float = 1.0,
        unit: bool = False,
    ) -> None:
        """Add a shell whose numbers `take` has taken; several may share them."""
        name = block.next_name("sp" if len(angular) > 1 else letter_of(angular[0]))
        block.shells.append(
            ShellDraft(name, angular, heading, None, start, shape, grid, scale, unit, first, last)
        )
        block.end = last - 1

    def scaled_shells(self, block: BlockDraft, token: Token) -> None:
        """Add a run of shells headed by letter, number of rows and scale factor (`S 3 1.00`)."""
        for heading, first, last in self.shells_in(token):
            letters, announced, *more = self.bodies[heading].split()
            scale = 1.0
            if more and more[0] not in _ONE:
                scale = read_number(more[0]).value or 1.0
            elif self.sound_shell(block, letters, heading, first, last, announced):
                continue
            run = self.rows_between(first, last)
            self.shell(block, letters, heading, run, announced=announced, scale=scale)

    def shell(
        self,
        block: BlockDraft,
        letters: str,
        heading: int,
        run: Run,
        *,
        announced: str | None = None,
        announced_word: int = 1,
        letters_word: int = 0,
        scale: float = 1.0,
        general: bool = False,
        columns: int | None = None,
    ) -> None:
        """Add a shell whose heading is line ``heading`` (0-based) to a block.

        ``announced`` is the count of rows as the heading spells it; ``general`` allows more than
        one coefficient column for a single letter, ``columns`` says how many to expect if the
        rows differ.
        """
        angular = self.angular_of(letters, heading, letters_word)
        width = self.usual_width(run)
        if angular is not None and self._is_indexed(angular, run, width, general):
            self._say_index(block, run)
            self._keep_indexed(block, angular, heading, run, scale)
            return
        if columns is not None and any(len(row) == columns + 1 for row in run.rows):
            width = columns + 1
        if angular == (8,) and width == 3 and letters.lower() == "l" and not general:
            letters, angular = "sp", (0, 1)
        name = block.next_name("".join(WITHOUT_J[l] for l in angular) if angular else letters)
        block.end = max(block.end, heading, *run.lines[-1:])
        self.check_count(block, name, announced, announced_word, heading, run)
        if not run.rows or angular is None:
            block.complete = False
            self.check_words(block, name, run)
            return
        if not self.check_widths(block, name, angular, width, run, general):
            block.complete = False
            self.check_words(block, name, run)
            return
        shape, grid = (len(run.rows), width - 1), Grid(0, width, 1, width, 1)
        self.keep(block, ShellDraft(name, angular, heading, run, 0, shape, grid, scale))

    @staticmethod
    def _is_indexed(angular: tuple[int, ...], run: Run, width: int, general: bool) -> bool:
        """Whether 1, 2, 3 ... stand in front of rows that would be whole without them."""
        if not run.rows or any(len(row) != width for row in run.rows) or not _is_index(run.rows):
            return False
        return width > 2 and len(run.rows) > 1 if general else width == 2 + len(angular)

    def _say_index(self, block: BlockDraft, run: Run) -> None:
        self.fault_word(
            "form.index-column",
            run.lines[0],
            0,
            "1, 2, 3 ... stand where the exponents belong: the numbers of the rows were carried "
            "over from another layout",
            element=block.symbol,
            measured=run.rows[0][0],
            expected=run.rows[0][1],
            remedy="take the first column out; it was passed over here",
            edits=tuple((first_word_span(self.source, index), "") for index in run.lines),
        )

    def _keep_indexed(
        self,
        block: BlockDraft,
        angular: tuple[int, ...],
        heading: int,
        run: Run,
        scale: float,
    ) -> None:
        name = block.next_name("".join(WITHOUT_J[l] for l in angular))
        width = len(run.rows[0])
        block.end = max(block.end, heading, run.lines[-1])
        shape, grid = (len(run.rows), width - 2), Grid(1, width, 2, width, 1)
        self.keep(block, ShellDraft(name, angular, heading, run, 0, shape, grid, scale))

    def matrix(
        self,
        block: BlockDraft,
        l: int,
        heading: int,
        run: Run,
        shape: tuple[int, int],
        grid: Grid,
        *,
        unit: bool = False,
        name: str | None = None,
    ) -> None:
        """Add a shell of one l whose numbers are not laid out as one row for each primitive.

        The words of ``run``, in the order of the text, hold nprim exponents and nprim x ncontr
        coefficients as ``grid`` says (``unit``: the exponents alone, each one a function).  The
        caller has checked that there are enough of them.  Several shells in a row may share one
        run.  ``name``: as `BlockDraft.next_name` gave it, if the caller has asked already.
        """
        name = name or block.next_name(letter_of(l))
        block.end = max(block.end, heading, run.lines[-1] if run.lines else 0)
        self.keep(block, ShellDraft(name, (l,), heading, run, 0, shape, grid, 1.0, unit))

    def keep(self, block: BlockDraft, draft: ShellDraft) -> None:
        """Add a shell whose numbers the caller has counted; its place is set here."""
        before = block.shells[-1] if block.shells else None
        block.shells.append(draft)
        assert draft.run is not None
        draft.first, draft.last = draft.run.lines[0], draft.run.lines[-1] + 1
        if before is not None and before.run is draft.run:
            draft.start = before.start
            return
        draft.start = self.count
        for row in draft.run.rows:
            self.pieces += row
            self.count += len(row)

    # ---- potentials

    def channel(
        self,
        block: BlockDraft,
        l: int,
        local: bool,
        heading: int,
        run: Run,
        *,
        order: str = "power exponent coefficient",
        title: str = "",
        spin_orbit: bool = False,
    ) -> Channel | None:
        """One channel of a core potential, or None where its numbers cannot be read."""
        columns = order.split()
        terms: dict[str, list[float]] = {column: [] for column in columns}
        plain = self._plain_columns(run, len(columns))
        if plain is not None:
            terms = dict(zip(columns, plain, strict=True))
        for at, (row, index) in enumerate(
            zip(run.rows, run.lines, strict=True) if plain is None else ()
        ):
            values = [
                self.number(word, index, ordinal, block.symbol, None)
                for ordinal, word in enumerate(row, run.before[at] if run.before else 0)
            ]
            if len(values) < 3:
                self.fault_line(
                    "form.count",
                    index,
                    f"{len(values)} numbers in a row of a core potential; "
                    f"it has three: {', '.join(columns)}",
                    element=block.symbol,
                    measured=len(values),
                    expected=3,
                    remedy="restore the missing number from the source",
                )
            for column, value in zip(columns, values, strict=False):
                terms[column].append(float("nan") if value is None else value)
        table = [terms[column] for column in ("power", "exponent", "coefficient")]
        block.end = max(block.end, heading, *run.lines[-1:])
        if len({len(column) for column in table}) > 1 or not np.isfinite(table).all():
            return None
        powers = tuple(int(power) for power in table[0])
        kind: Literal["scalar", "spin-orbit"] = "spin-orbit" if spin_orbit else "scalar"
        return Channel(
            l, local, powers, np.array(table[1]), np.array(table[2]), heading + 1, title, kind
        )

    @staticmethod
    def _plain_columns(run: Run, width: int) -> list[list[float]] | None:
        """The columns of rows of one width whose numbers are all sound; None where one is not."""
        words = [word for row in run.rows for word in row]
        if not has_only_characters("".join(words)) or any(len(row) != width for row in run.rows):
            return None
        with suppress(ValueError):
            values = [float(word.translate(FORTRAN)) for word in words]
            if all(map(isfinite, values)):
                return [values[column::width] for column in range(width)]
        return None


def _is_index(rows: Iterable[list[str]]) -> bool:
    """Whether the first words of rows are 1, 2, 3 ... without a point."""
    return all(row[0] == str(at) for at, row in enumerate(rows, 1))


def _are_numbered(rows: list[str]) -> bool:
    """As `_is_index`, for rows that are not split; says no where they are very many, or tabbed."""
    return len(rows) < 100 and all(map(str.startswith, rows, _ORDINALS))
