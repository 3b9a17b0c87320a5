"""Counted tables: what the layouts share that give all functions of one l as one matrix.

A heading `nprim ncontr` is followed by nprim exponents and nprim x ncontr coefficients, either as
rows (each exponent with its coefficients behind it) or as a list (all exponents, then the matrix
row by row).  A row may run over several lines.  Uncontracted tables may hold the exponents alone.

Headings are bare whole numbers, but so may rows be (`1 0`): `Tables.joined` settles which is which
by the counts, before the tokens go to the grammar.
"""

import re
from dataclasses import dataclass, field
from functools import lru_cache
from itertools import accumulate, pairwise
from typing import Literal

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Run, index_of
from overlapse.grammar.model import Grid, letter_of
from overlapse.grammar.numbers import FORTRAN, read_number
from overlapse.grammar.pieces.headings import DIGITS, Heading, heading_of, sensible, spanning
from overlapse.grammar.pieces.miscounts import Miscount

Way = Literal["rows", "list"]

# A number.  Where a sign and a decimal point follow, the next one begins: columns filled up.
ABUTTING = r"[^\s](?:[^\s+\-]|[+\-](?![0-9]*\.)|(?<=[EeDd])[+\-])*"
_ABUTTING = re.compile(ABUTTING)
# From this many on, numbers without a blank between them are a habit of the file and no slip.
_HABIT = 3

_TYPE = re.compile(r"\W*([SPDFGHIKLspdfghikl])[- ]?[Tt][Yy][Pp][Ee]\b")
_TABLE_TOKENS = ("HEAD", "COUNT", "ROWS")
# Beyond this a matrix of ones and zeros would take more room than its table does.
_MANY = 200
# How far to look for the end of a table whose counts do not come out with its first rows.
_FAR = 400


@dataclass
class Tables:
    """The tables of one text: tells headings from rows, checks counts, hands shells to the build.

    ``way`` is how the tables of the layout are laid out, None where their numbers have to tell;
    ``last`` then serves for tables that leave it open.  ``alone``: whether exponents may stand
    alone under a heading that announces as many contractions; ``lonely`` tells that they do so in
    this text, where it matters: a lone exponent may have lost its coefficient.
    """

    build: Build
    way: Way | None
    alone: bool = False
    last: Way = "rows"
    lonely: bool = False
    abutting: list[tuple[int, int, str]] = field(default_factory=list)
    stated: dict[int, int] = field(default_factory=dict)

    def __post_init__(self) -> None:
        # The l that comments such as "p-type functions" speak of, by their 0-based line.
        for remark in self.build.remarks:
            if match := _TYPE.match(remark.text):
                self.stated[remark.line - 1] = "spdfghikl".index(match[1].lower())

    # ---- which numeric lines are headings

    def run(self, token: Token | None) -> Run:
        """The words in the lines of a token."""
        return self.build.rows(token)

    def size(self, token: Token | None) -> int:
        """How many numbers stand in the lines of a token."""
        return 0 if token is None else sum(self.build.widths[token.line or 0 : token.end_line])

    def joined(self, tokens: list[Token]) -> list[Token]:
        """The tokens, with whole-number lines inside tables made part of their rows.

        A TEXT that interrupts the rows of a table becomes an INTRUDER and takes the rows with it.
        Where a comment says that rows belong to the next l, a LOST token stands for the heading
        they have lost.
        """
        tokens = sensible(tokens)
        done: list[Token] = []
        at = 0
        while at < len(tokens):
            done.append(tokens[at])
            at += 1
            if done[-1].type == "HEAD":
                end = self._table_end(tokens, at - 1)
                done += self._table(tokens[at - 1], tokens[at:end])
                at = end
        return done

    def _table_end(self, tokens: list[Token], at: int) -> int:
        """Index past the last token of the table whose heading is ``tokens[at]``."""
        wanted, end = heading_of(tokens[at]).numbers, at + 1
        first = end + (end < len(tokens) and tokens[end].type == "ROWS")
        found = others = 0
        while end < min(len(tokens), at + _FAR) and found < wanted:
            token = tokens[end]
            following = tokens[end + 1] if end + 1 < len(tokens) else None
            rows_follow = following is not None and following.type == "ROWS"
            if token.type == "TEXT" and rows_follow:
                others += len(token.split())  # perhaps a row that nobody would take for one
            elif token.type not in _TABLE_TOKENS or self._heads(token, following):
                break
            else:
                found += self.size(token)
            end += 1
        complete = not {found, found + others}.isdisjoint(self._sizes(heading_of(tokens[at])))
        goes_on = end < len(tokens) and tokens[end].type == "ROWS"
        return end if complete and not goes_on else first

    def _heads(self, token: Token, following: Token | None) -> bool:
        """Whether just as many numbers follow as a token announces."""
        if following is None or (token.type, following.type) != ("HEAD", "ROWS"):
            return False
        return self.size(following) in self._sizes(heading_of(token))

    def _sizes(self, heading: Heading) -> tuple[int, ...]:
        """How many numbers a table may hold as announced."""
        lone = self.alone and heading.primitives == heading.contractions
        return (heading.numbers, heading.primitives) if lone else (heading.numbers,)

    def _table(self, heading: Token, pieces: list[Token]) -> list[Token]:
        """The rows of a table as one token, or what stands for them where something is wrong."""
        if intruders := [piece for piece in pieces if piece.type == "TEXT"]:
            return [
                Token("INTRUDER", str(text), line=text.line, end_line=text.end_line)
                for text in intruders
            ]
        if not pieces:
            return []
        rows = spanning(pieces[0], pieces[-1])
        announced, size = heading_of(heading), self.size(rows)
        if self.alone and size == announced.primitives == announced.contractions:
            self.lonely = self.lonely or size > 1
        elif size != announced.numbers and (start := self._next_table(rows, announced)):
            return [
                Token("ROWS", "", line=rows.line, end_line=start),
                Token("LOST", "", line=start, end_line=start + 1),
                Token("ROWS", "", line=start, end_line=rows.end_line),
            ]
        return [rows]

    def _next_table(self, rows: Token, heading: Heading) -> int:
        """The line in wrong rows where the table below begins that has lost its heading, or 0.

        A comment may speak of it, or lines of another length follow when all numbers are there.
        """
        run, seen = self.run(rows), 0
        for above, below in pairwise(range(len(run.rows))):
            first, second = run.lines[above], run.lines[below]
            if any(line in self.stated for line in range(first + 1, second)):
                return second
            seen += len(run.rows[above])
            other = len(run.rows[above]) != len(run.rows[below]) and below + 1 < len(run.rows)
            if seen == heading.numbers and other:
                return second
        return 0

    def cut_after(self, rows: Token, numbers: int) -> Token:
        """The first lines of a run, up to so many numbers."""
        run, seen = self.run(rows), 0
        for row, index in zip(run.rows, run.lines, strict=True):
            if seen >= numbers:
                return Token("ROWS", "", line=rows.line, end_line=index)
            seen += len(row)
        return rows

    def stated_above(self, index: int) -> int | None:
        """The l that the comments right above a line speak of, if any."""
        for above in range(index - 1, -1, -1):
            if above in self.stated:
                return self.stated[above]
            if self.build.bodies[above]:
                return None
        return None

    # ---- one table

    def add(self, block: BlockDraft, l: int, token: Token, rows: Token | None) -> None:
        """Add the table headed by ``token`` to a block, or say what is wrong with it."""
        heading = heading_of(token)
        self._check_spelling(block, token)
        size = self.size(rows)
        if rows is None or not size:
            if heading.primitives:
                self._say_empty(block, l, token, heading)
        elif size == heading.numbers and heading.contractions:
            self._add_whole(block, l, token, rows)
        else:
            self._add_odd(block, l, token, self.run(rows), size)

    def _add_whole(self, block: BlockDraft, l: int, token: Token, rows: Token) -> None:
        """A table of just the numbers that its heading announces."""
        heading, build = heading_of(token), self.build
        way = self.way or self._way(heading, self.run(rows))
        first, last = index_of(rows), rows.end_line or 0
        while not build.bodies[last - 1]:
            last -= 1
        start = build.take(build.bodies[first:last], heading.numbers)
        shape, grid = heading[:2], _grid(way, *heading[:2])
        build.even_shell(block, (l,), index_of(token), first, last, start, shape, grid)

    def _add_odd(self, block: BlockDraft, l: int, token: Token, run: Run, size: int) -> None:
        """A table whose heading announces another number than ``size``, or no contractions."""
        heading = heading_of(token)
        if size < heading.numbers:
            run = self._parted(run)
            size = sum(map(len, run.rows))
        count, columns = heading.primitives, heading.contractions
        if self._is_uncontracted(heading, run, size):
            self._add_uncontracted(block, l, index_of(token), run, count, size // count)
        elif size == heading.numbers and columns:
            grid = _grid(self.way or self._way(heading, run), count, columns)
            self.build.matrix(block, l, index_of(token), run, (count, columns), grid)
        else:
            self._miscounted(block, l, token, heading, run)

    def _add_uncontracted(
        self, block: BlockDraft, l: int, heading: int, run: Run, count: int, step: int
    ) -> None:
        """Exponents that each are a function; ``step`` numbers are written for each."""
        size = count * step  # no coefficient has a place among them
        if count <= _MANY:
            grid = Grid(0, step, size, 0, 0)
            self.build.matrix(block, l, heading, run, (count, count), grid, unit=True)
            return
        for at in range(0, size, step):
            self.build.matrix(block, l, heading, run, (1, 1), Grid(at, 1, size, 0, 0), unit=True)

    def _is_uncontracted(self, heading: Heading, run: Run, size: int) -> bool:
        count = heading.primitives
        if count and heading.contractions == 0:
            # Some files write the 1.0 behind each exponent all the same.
            return size == count or (
                size == 2 * count
                and all(len(row) == 2 and read_number(row[1]).value == 1.0 for row in run.rows)
            )
        alone = self.alone and size == count == heading.contractions
        return alone and (count > 1 or self.lonely)

    def _way(self, heading: Heading, run: Run) -> Way:
        """Whether a table is rows or a list: as a rule only one has sensible exponents.

        Three numbers in the heading speak for rows.
        """
        if heading.flagged or heading.primitives == 1:
            return "rows"
        count, columns = heading.primitives, heading.contractions
        words = [word for row in run.rows for word in row]
        ends = set(accumulate(map(len, run.rows)))
        width = columns + 1
        rows = *_likeness(words[::width]), ends.issuperset(range(width, len(words), width))
        listed = *_likeness(words[:count]), count in ends
        if rows != listed:
            self.last = "rows" if rows > listed else "list"
        return self.last

    def _parted(self, run: Run) -> Run:
        """The run with abutting numbers parted at the sign of the second."""
        rows = []
        for row, index in zip(run.rows, run.lines, strict=True):
            parted: list[str] = []
            for word in row:
                pieces = _ABUTTING.findall(word)
                if len(pieces) > 1:
                    self.abutting.append((index, len(parted), word))
                parted += pieces
            rows.append(parted)
        return Run(rows, run.lines)

    def close(self) -> None:
        """Say what concerns the whole text."""
        habit = len(self.abutting) >= _HABIT
        for index, ordinal, word in self.abutting[: 1 if habit else None]:
            pieces = _ABUTTING.findall(word)
            self.build.fault_word(
                "form.number",
                index,
                ordinal,
                f"{word!r} is numbers run together, read as {' and '.join(pieces)}"
                + (f"; so are {len(self.abutting) - 1} more words in this text" if habit else ""),
                severity="note" if habit else "warning",
                measured=word,
                expected=" ".join(pieces),
                remedy="put a blank between the numbers",
            )

    # ---- what is wrong with a table

    def _check_spelling(self, block: BlockDraft, token: Token) -> None:
        if token.translate(DIGITS) == token:
            return
        for ordinal, word in enumerate(token.split()[:3]):
            likely = word.translate(DIGITS)
            if likely != word and likely.isdigit():
                self.build.fault_word(
                    "form.number",
                    index_of(token),
                    ordinal,
                    f"{word!r} in this heading has a letter for a digit",
                    element=block.symbol,
                    measured=word,
                    expected=int(likely),
                    remedy=f"write {likely}",
                )

    def _say_empty(self, block: BlockDraft, l: int, token: Token, heading: Heading) -> None:
        block.complete = False
        self.build.fault_line(
            "form.count",
            index_of(token),
            f"no numbers follow this heading, which announces {heading.primitives} primitives",
            element=block.symbol,
            shell=f"{letter_of(l)}-1",
            measured=0,
            expected=heading.primitives,
            remedy="restore the table, or write `0 0` where there is no function of this l",
        )

    def _miscounted(
        self, block: BlockDraft, l: int, token: Token, heading: Heading, run: Run
    ) -> None:
        """Say what a table has too many or too few of; keep it where its rows are clear."""
        table = Miscount(self.build, block, l, index_of(token), heading[:2], run)
        listed = self.way == "list" or (not heading.flagged and self.last == "list")
        if listed and not table.is_misspelt():
            table.say_list()
        elif not table.is_misspelt() and (found := table.say_rows()) is not None:
            shape, grid = found
            self.build.matrix(block, l, index_of(token), run, shape, grid)
            return
        block.complete = False
        self.build.check_words(block, table.name, run)


@lru_cache(256)
def _grid(way: Way, count: int, columns: int) -> Grid:
    """Places of so many exponents and columns of coefficients."""
    width = columns + 1
    return Grid(0, width, 1, width, 1) if way == "rows" else Grid(0, 1, count, columns, 1)


def _likeness(words: list[str]) -> tuple[bool, bool, bool]:
    """How much words are like a list of exponents: positive, falling, and never twice the same."""
    try:
        values = [float(word.translate(FORTRAN)) for word in words]
    except ValueError:
        return False, False, False
    if not all(value > 0.0 for value in values):
        return False, False, False
    falling = all(a >= b for a, b in pairwise(values))
    return True, falling, falling and len(set(values)) == len(values)
