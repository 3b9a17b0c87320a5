"""From lines to a document: what all readers share.

A reader goes three steps.  `Build.tokens` turns lines into few, large tokens: headings, and runs
of numeric rows that stay unsplit.  `parse` puts them through the layout's LALR grammar, whose tree
states the layout (and its common slips) on a page.  The reader walks the tree and hands what it
finds to `Build.open_block`, `Build.shell` and their kin; `Build.document` then converts all numbers
of the file in one go and makes the model.  Positions of single numbers are worked out only for
faults.
"""

from collections.abc import Callable, Collection, Iterable, Iterator, Sequence
from contextlib import suppress
from dataclasses import dataclass, field
from functools import cache, cached_property
from itertools import groupby
from math import isfinite
from typing import Any, Literal, NamedTuple

import numpy as np
from lark import Lark, Token, Tree
from lark.exceptions import UnexpectedToken
from lark.lexer import Lexer

from overlapse.grammar.compiled import grammar
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.model import (
    BasisSet,
    Block,
    Cells,
    Channel,
    Document,
    Fault,
    Floats,
    Grid,
    Potential,
    Remark,
    Shell,
    Span,
    letter_of,
    read_only,
)
from overlapse.grammar.numbers import (
    FORTRAN,
    Reading,
    has_only_characters,
    looks_numeric,
    read_number,
)
from overlapse.grammar.source import Source

Role = Literal["orbital", "fitting", "unstated"]
FunctionType = Literal["spherical", "cartesian"]
Node = Tree[Token]

MOST = 2_000  # primitives of a shell, or functions of an element; published sets stay below 500
_ROW_START = frozenset("0123456789+-.")
# With a j shell present the letters run on without a gap; else j is left out, as in spectroscopy.
_WITHOUT_J = "spdfghiklmnoqrtuv"
_WITH_J = "spdfghijklmnoqrtuv"
_ONE = ("1.00", "1.0", "1.000000")  # usual spellings of a scale factor that changes nothing
_ABOVE_I = frozenset("jJkK")
_ORDINALS = tuple(f"{number} " for number in range(1, 100))


class _OurTokens(Lexer):
    """Stands in for lark's lexer: the tokens are fed by `parse`."""

    def __init__(self, _configuration: object) -> None:
        pass

    def lex(self, _text: Any) -> Iterator[Token]:  # type: ignore[override]
        return iter(())


@cache
def parser_of(name: str) -> Lark:
    """The LALR parser for ``layouts/<name>.lark``, compiled once per process."""
    return grammar(f"layouts/{name}", lexer=_OurTokens)


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


class Build:
    """Collects what a reader finds and makes the document of it."""

    def __init__(
        self,
        source: Source,
        layout: str,
        comment: str = "",
        word_pattern: str = r"\S+",
        windows: Collection[range] | None = None,
    ) -> None:
        """``comment`` holds the signs that begin a comment, ``word_pattern`` matches a number.

        ``windows``: the only lines (0-based) to look at, for a layout that is a part of its file.
        """
        self.source = source
        self.layout = layout
        self.comment = comment
        self.word_pattern = word_pattern
        self.faults: list[Fault] = []
        self.remarks: list[Remark] = []
        self.blocks: list[BlockDraft] = []
        self.bodies = self._without_comments() if windows is None else self._within(windows)
        self.split: Callable[[str], list[str]] = str.split  # a row into its words
        self.separators = ""  # signs that part numbers as blanks do
        self.leading = ""  # signs that make a line a comment where they lead it
        self._pieces: list[str] = []  # of text, whose words are the numbers of the shells
        self._count = 0  # of these numbers
        self._readings: dict[str, Reading] = {}
        self._letters: dict[str, tuple[int, ...]] = {}
        self._grids: dict[tuple[int, int], Grid] = {}
        self._runs_of_shells: dict[int, list[tuple[int, int, int]]] = {}
        self._has_holes = False  # whether a number of a shell cannot be read
        self._j_is_used = False

    # ---- lines and tokens

    def _without_comments(self) -> list[str]:
        lines = self.source.lines
        bodies = list(map(str.strip, lines))
        signs = [sign for sign in self.comment if sign in self.source.text]
        concerned = {index for sign in signs for index in self.source.lines_with(sign)}
        for index in sorted(concerned):
            line = lines[index]
            for sign in self.comment:
                if sign in line:
                    line, remark = line.split(sign, 1)
                    self.remarks.append(Remark(remark.strip(), index + 1))
            bodies[index] = line.strip()
        return bodies

    @cached_property
    def widths(self) -> list[int]:
        """How many words each of the bodies has."""
        return list(map(len, map(str.split, self.bodies)))

    def _within(self, windows: Collection[range]) -> list[str]:
        if not windows:
            return []
        lines = self.source.lines
        bodies = [""] * len(lines)
        for window in windows:
            bodies[window.start : window.stop] = [
                line.strip() for line in lines[window.start : window.stop]
            ]
        return bodies

    def tokens(
        self,
        classify: Callable[[str, int], str],
        heading: Callable[[str], str | None] | None = None,
        *,
        joined: bool = False,
    ) -> Iterator[Token]:
        """Few, large tokens: one for each heading, one ROWS for each run of numeric rows.

        ``classify(body, index)`` names the token of a line that does not begin like a number;
        "TEXT" means it knows none, and the line is then taken for a damaged row if its first word
        was most likely meant as a number.  ``heading(body)`` names the token of a line that begins
        with a number and yet is a heading, else None.  Token lines are 0-based.

        ``joined``: headings of the kind "SHELL" and the rows right below them are passed on
        unsplit as well, a whole run of such shells as one token SHELLS (see `shells_in`); a SHELL
        is then a heading without rows, and ROWS are rows without a shell heading.
        """
        lines = self._lines(classify, heading)
        if joined:
            yield from self.joined(lines)
        else:
            for kind, first, last in lines:
                yield self._token(kind, first, last)

    def joined(self, lines: Iterable[tuple[str, int, int]]) -> Iterator[Token]:
        """Tokens out of kinds and lines (0-based, past the last), runs of shells as one token."""
        waiting: int | None = None  # a shell heading whose rows may follow
        shells: list[tuple[int, int, int]] = []
        for kind, first, last in lines:
            if kind == "ROWS" and waiting is not None:
                shells.append((waiting, first, last))
                waiting = None
                continue
            if waiting is not None or kind != "SHELL":
                if shells:
                    yield self._joined(shells)
                    shells = []
                if waiting is not None:
                    yield self._token("SHELL", waiting, waiting + 1)
                    waiting = None
            if kind == "SHELL":
                waiting = first
            else:
                yield self._token(kind, first, last)
        if shells:
            yield self._joined(shells)
        if waiting is not None:
            yield self._token("SHELL", waiting, waiting + 1)

    def _token(self, kind: str, first: int, last: int) -> Token:
        text = "" if kind == "ROWS" else self.bodies[first]
        return Token(kind, text, line=first, end_line=last)

    def _joined(self, shells: list[tuple[int, int, int]]) -> Token:
        first, last = shells[0][0], shells[-1][2]
        self._runs_of_shells[first] = shells
        return Token("SHELLS", "", line=first, end_line=last)

    def shells_in(self, token: Token) -> list[tuple[int, int, int]]:
        """The shells of a token SHELLS: heading line, first row line, and past the last (0-based).

        Rows may have blank lines between them.
        """
        return self._runs_of_shells[index_of(token)]

    def _lines(
        self,
        classify: Callable[[str, int], str],
        heading: Callable[[str], str | None] | None,
    ) -> Iterator[tuple[str, int, int]]:
        """Kind, first line and past the last line of each heading and of each run of rows."""
        first: int | None = None
        last = 0
        for index, body in enumerate(self.bodies):
            if not body:
                continue
            kind: str | None = None
            if body[0] in _ROW_START:
                kind = heading(body) if heading is not None else None
                if kind is None:
                    if first is None:
                        first = index
                    last = index
                    continue
            else:
                kind = classify(body, index)
                if kind == "TEXT" and self.is_damaged_row(body, first is not None):
                    first = index if first is None else first
                    last = index
                    continue
            if first is not None:
                yield "ROWS", first, last + 1
                first = None
            yield kind, index, index + 1
        if first is not None:
            yield "ROWS", first, last + 1

    @staticmethod
    def is_damaged_row(body: str, in_run: bool) -> bool:
        """Whether a line was most likely meant as numbers; ``in_run``: rows stand above it."""
        words = body.split()
        numeric = [looks_numeric(word) for word in words]
        return numeric[0] if not in_run else numeric[0] or (len(words) > 1 and all(numeric[1:]))

    def parse(self, tokens: Iterable[Token]) -> Node:
        """Put tokens through the layout's grammar.

        The grammars take every sequence of tokens that their readers make, so that one fault never
        hides the next; should one refuse a token all the same, that is a finding and the token is
        passed over.
        """
        left = list(tokens)
        refused: set[int] = set()
        while True:
            parser = parser_of(self.layout.replace("-", "_")).parse_interactive()
            for token in left:
                try:
                    parser.feed_token(token)
                except UnexpectedToken as refusal:
                    self._refuse(token, refusal, refused)
            try:
                tree = parser.feed_eof()  # type: ignore[no-untyped-call]
            except UnexpectedToken as refusal:
                self._refuse(left.pop(), refusal, refused)  # it ends in the middle of something
                continue
            return tree  # type: ignore[no-any-return]

    def _refuse(self, token: Token, refusal: UnexpectedToken, refused: set[int]) -> None:
        if index_of(token) not in refused:
            refused.add(index_of(token))
            expected = ", ".join(sorted(refusal.accepts or refusal.expected)).lower()
            self.fault_line(
                "form.syntax",
                index_of(token),
                f"{str(token)!r} does not belong here; expected: {expected}",
            )

    def rows(self, token: Token | None) -> Run:
        """The words of a run of rows, line by line; blank lines and comments are left out."""
        if token is None:
            return Run([], [])
        return self.rows_between(token.line or 0, token.end_line or 0)

    def rows_between(self, first: int, last: int) -> Run:
        """As `rows`, for lines ``first`` up to ``last`` (0-based, past the end)."""
        lines: Sequence[int] = range(first, last)
        rows = list(map(self.split, self.bodies[first:last]))
        if [] in rows:
            lines = [index for index, row in zip(lines, rows, strict=True) if row]
            rows = [row for row in rows if row]
        return Run(rows, lines)

    # ---- faults

    def fault(self, rule: str, span: Span, message: str, **details: Any) -> None:
        """Note a fault at a span of the text; ``details`` are the other fields of `Fault`."""
        self.faults.append(Fault(rule, message, span, **details))

    def fault_line(self, rule: str, index: int, message: str, **details: Any) -> None:
        """Note a fault that concerns a whole line (0-based)."""
        self.fault(rule, self.source.span_of_line(index), message, **details)

    def fault_word(self, rule: str, index: int, ordinal: int, message: str, **details: Any) -> None:
        """Note a fault in one word of a line (both 0-based)."""
        span = self.source.span_of_word(index, ordinal, self.word_pattern)
        self.fault(rule, span, message, **details)

    # ---- blocks

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

    def angular_of(self, letters: str, index: int, word: int = 0) -> tuple[int, ...] | None:
        """Angular momenta for the letters of a shell heading, or None with a fault.

        "sp" gives (0, 1); a shell "l" stays (8,) here and becomes s+p where its rows say so.
        """
        if (known := self._letters.get(letters)) is not None:
            return known
        angular = self._angular_of(letters, index, word)
        if angular is not None:
            self._letters[letters] = angular
        return angular

    def _angular_of(self, letters: str, index: int, word: int) -> tuple[int, ...] | None:
        low = letters.lower()
        if low == "sp":
            return (0, 1)
        if low.startswith("l=") and low[2:].isdigit() and int(low[2:]) < len(_WITHOUT_J):
            return (int(low[2:]),)
        alphabet = _WITH_J if self._j_is_used else _WITHOUT_J
        if len(low) == 1 and low in alphabet:
            return (alphabet.index(low),)
        self.fault_word(
            "form.letter",
            index,
            word,
            f"{letters!r} is no letter of an angular momentum",
            measured=letters,
            expected="one of S P D F G H I, or SP",
            remedy="write the letter of the shell's angular momentum",
        )
        return None

    def shell_letters(self, tokens: Iterable[Token], word: int = 0) -> Iterator[tuple[str, int]]:
        """Letters and line (0-based) of shell headings, for `note_letters`.

        ``word`` is the letters' place in a heading (0-based).
        """
        for token in tokens:
            if token.type == "SHELLS":
                for heading, _, _ in self.shells_in(token):
                    body = self.bodies[heading]
                    if word or body[0] in _ABOVE_I:  # others tell nothing
                        yield body.split(None, word + 1)[word], heading
            elif token.type == "SHELL":
                yield token.split()[word], index_of(token)

    def note_letters(self, headings: Iterable[tuple[str, int]]) -> None:
        """Look at all shell letters of a file first: whether j is used, and where k begins."""
        above = [(letters, index) for letters, index in headings if letters in _ABOVE_I]
        self._j_is_used = any(letters.lower() == "j" for letters, _ in above)
        if above:
            letters, index = above[0]
            alphabet = _WITH_J if self._j_is_used else _WITHOUT_J
            order = "with" if self._j_is_used else "without"
            self.fault_line(
                "form.letter",
                index,
                f"letters above i are counted in two ways; read here {order} j, "
                f"so {letters.upper()} is l = {alphabet.index(letters.lower())}",
                severity="note",
                measured=letters,
                expected=f"L={alphabet.index(letters.lower())}",
                remedy="write the number (L=7) where the layout allows it",
            )

    def take_rows(self, first: int, last: int, width: int) -> int | None:
        """Take in lines ``first`` up to ``last``, if all have ``width`` words.

        The place of their first number is for `even_shell`.
        """
        if self.widths[first:last].count(width) != last - first:
            return None
        return self.take(self.bodies[first:last], (last - first) * width)

    def take(self, texts: list[str], count: int) -> int:
        """Take in texts that hold ``count`` numbers: the place of the first."""
        self._pieces += texts
        self._count += count
        return self._count - count

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
        angular = self._letters.get(letters)
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
        width = self._width(run)
        if angular is not None and self._is_indexed(angular, run, width, general):
            self._say_index(block, run)
            self._keep_indexed(block, angular, heading, run, scale)
            return
        if columns is not None and any(len(row) == columns + 1 for row in run.rows):
            width = columns + 1
        if angular == (8,) and width == 3 and letters.lower() == "l" and not general:
            letters, angular = "sp", (0, 1)
        name = block.next_name("".join(_WITHOUT_J[l] for l in angular) if angular else letters)
        block.end = max(block.end, heading, *run.lines[-1:])
        self.check_count(block, name, announced, announced_word, heading, run)
        if not run.rows or angular is None:
            block.complete = False
            self.check_words(block, name, run)
            return
        if not self._check_widths(block, name, angular, width, run, general):
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
        )

    def _keep_indexed(
        self,
        block: BlockDraft,
        angular: tuple[int, ...],
        heading: int,
        run: Run,
        scale: float,
    ) -> None:
        name = block.next_name("".join(_WITHOUT_J[l] for l in angular))
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
        draft.start = self._count
        for row in draft.run.rows:
            self._pieces += row
            self._count += len(row)

    @staticmethod
    def _width(run: Run) -> int:
        """The number of words that most rows have."""
        widths = [len(row) for row in run.rows]
        return max(set(widths), key=widths.count, default=0)

    def check_count(
        self, block: BlockDraft, name: str, announced: str | None, word: int, heading: int, run: Run
    ) -> None:
        found = len(run.rows)
        if announced is not None and found and integer(announced) != found:
            block.complete = False
            self.fault_word(
                "form.count",
                heading,
                word,
                f"the heading announces {announced} rows, {found} follow",
                element=block.symbol,
                shell=name,
                measured=found,
                expected=int(announced) if len(announced) < 16 else announced,
                remedy="a row was lost or added, or the count is wrong: compare with the source",
            )
        elif not found:
            self.fault_line(
                "form.count",
                heading,
                "no rows of numbers follow this heading"
                + (f", which announces {announced}" if announced else ""),
                element=block.symbol,
                shell=name,
                measured=0,
                expected=int(announced) if announced and len(announced) < 16 else None,
                remedy="restore the shell's rows or take its heading out",
            )

    def _check_widths(
        self,
        block: BlockDraft,
        name: str,
        angular: tuple[int, ...],
        width: int,
        run: Run,
        general: bool,
    ) -> bool:
        """Whether all rows have one exponent and the same, fitting number of coefficients."""
        needed = 1 + len(angular)
        fits = width > 1 and (width - 1) % len(angular) == 0 if general else width == needed
        wanted = width if fits else needed
        what = "sp shell" if len(angular) == 2 else "shell"
        holds = f"the {what} has {wanted} (an exponent and {wanted - 1} coefficient" + (
            "s)" if wanted != 2 else ")"
        )
        hint = "; perhaps an SP shell was meant" if wanted == 2 else ""
        return self.check_rows(block, name, run, wanted, holds, hint)

    def check_rows(
        self, block: BlockDraft, name: str, run: Run, wanted: int, holds: str, hint: str = ""
    ) -> bool:
        """Whether all rows have ``wanted`` numbers.

        ``holds`` says who wants them and why, ``hint`` what a row with one more might be.
        """
        wrong = [at for at, row in enumerate(run.rows) if len(row) != wanted]
        if len(wrong) == len(run.rows):
            wrong = wrong[:1]
        for at in wrong:
            count = len(run.rows[at])
            if count + sum("together" in read_number(word).slip for word in run.rows[at]) == wanted:
                continue  # nothing is lost: the word itself is the fault
            self.fault_word(
                "form.count",
                run.lines[at],
                min(count, wanted) - (count < wanted),
                f"{count} number{'s' * (count != 1)} in this row where {holds}"
                + (hint if count == wanted + 1 else ""),
                element=block.symbol,
                shell=name,
                measured=count,
                expected=wanted,
                remedy="a number was lost, added or run together with its neighbour",
            )
        return not wrong

    def check_words(self, block: BlockDraft, name: str | None, run: Run) -> None:
        """Find misspelt numbers in rows that make no shell."""
        for word, index, ordinal in run.words():
            self.number(word, index, ordinal, block.symbol, name)

    def number(
        self, word: str, index: int, ordinal: int, element: str | None, shell: str | None
    ) -> float | None:
        reading = self._readings.get(word)
        if reading is None:
            reading = self._readings[word] = read_number(word)
        if reading.slip:
            span = self.source.span_of_word(index, ordinal, self.word_pattern)
            self.slip(reading, word, span, element, shell)
        return reading.value

    def whole_numbers(
        self, words: Sequence[str], index: int, element: str | None
    ) -> list[int] | None:
        """The counts on a line (0-based), or None where a word is none; says what is misspelt."""
        whole: list[int] = []
        for ordinal, word in enumerate(words):
            value: float | None = integer(word)
            if value is None:
                value = self.number(word, index, ordinal, element, None)
            if value is None or value < 0 or value != int(value):
                return None
            whole.append(int(value))
        return whole

    def slip(
        self, reading: Reading, word: str, span: Span, element: str | None, shell: str | None
    ) -> None:
        """Note a misspelt number that stands at a span of the text."""
        value, slip, spelling = reading
        self.fault(
            "form.number",
            span,
            f"{shorten(word)!r} {slip}" + (f"; {spelling} was probably meant" if spelling else ""),
            element=element,
            shell=shell,
            measured=shorten(word),
            expected=value,
            remedy=f"write {spelling}" if spelling else "restore the number from the source",
        )

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

    # ---- the document

    def document(self, reason: str = "", raw_primitives: bool = False) -> Document:
        """Convert all numbers and make the model of what was collected."""
        values = self._convert()
        if not self.blocks and not self.faults:
            self.fault(
                "form.syntax",
                (0, 0),
                "nothing was found here that describes an element",
                severity="warning",
                remedy="check that this is the file you meant, and that it is whole",
            )
        blocks = [block for block in self.blocks if block.number is not None]
        made = [self._block(block, values) for block in blocks]
        return Document(
            self.source,
            self.layout,
            tuple(self._sets(blocks, made)),
            tuple(self.remarks),
            tuple(sorted(self.faults, key=lambda fault: fault.span)),
            reason,
            raw_primitives,
        )

    def _convert(self) -> Floats:
        """All numbers of all shells as one read-only array; NaN where one cannot be read."""
        text = " ".join(self._pieces)
        for sign in self.separators:
            text = text.replace(sign, " ")
        if "D" in text or "d" in text:
            text = text.translate(FORTRAN)
        values = np.array([np.nan])
        if has_only_characters(text):
            with suppress(ValueError):  # a slip among the numbers; found below
                values = np.fromiter(map(float, text.split()), np.float64)
        if not np.isfinite(values).all():
            values = self._convert_one_by_one()
        self._has_holes = bool(np.isnan(values).any())
        values.flags.writeable = False
        return values

    def _convert_one_by_one(self) -> Floats:
        values = np.full(self._count, np.nan)
        for block in self.blocks:
            for start, sharing in groupby(block.shells, key=lambda shell: shell.start):
                shells = list(sharing)
                names = {place: shell.name for shell in shells[::-1] for place in shell.places()}
                run = shells[0].run or self.rows_between(shells[0].first, shells[0].last)
                for at, (word, index, ordinal) in enumerate(run.words()):
                    name = names.get(at, shells[-1].name)
                    value = self.number(word, index, ordinal, block.symbol, name)
                    values[start + at] = np.nan if value is None else value
        return values

    def _block(self, block: BlockDraft, values: Floats) -> Block:
        shells = list(block.ready)
        complete = block.complete
        source, comment = self.source, self.comment
        pattern, leading = self.word_pattern, self.leading
        for draft in block.shells:
            exponents, coefficients = self._table(draft, values)
            if self._has_holes and np.isnan(np.append(exponents, coefficients)).any():
                complete = False
                continue
            skip = draft.run.before[0] if draft.run is not None and draft.run.before else 0
            cells = Cells(
                source, draft.first, draft.last, draft.grid, comment, pattern, skip, leading
            )
            if draft.scale != 1.0:
                with np.errstate(over="ignore"):
                    exponents = exponents * np.square(draft.scale)
                if not np.isfinite(exponents).all():
                    complete = False
                    self._say_overflow(block, draft)
                    continue
            # Shapes are right by the way the tables were cut, and all numbers are finite.
            shells.append(
                Shell.checked(draft.angular, exponents, coefficients, draft.heading + 1, cells)
            )
        if self._is_absurd(block, shells):
            complete, shells = False, []
        if block.number is None:
            raise AssertionError("only blocks of known elements are made")
        return Block(
            block.number,
            tuple(shells),
            block.potential,
            block.label,
            block.functions,
            complete,
            block.line + 1,
            block.end + 1,
        )

    def _is_absurd(self, block: BlockDraft, shells: list[Shell]) -> bool:
        """Whether a block is so large that it is none; matrices over it would burst the memory."""
        drafts = block.shells
        if drafts and not block.ready:
            count, columns = drafts[-1].shape
            if drafts[-1].start + count * (1 + columns) - drafts[0].start <= MOST:
                return False  # so few numbers cannot make so many functions
        longest = max((len(shell.exponents) for shell in shells), default=0)
        functions = sum(shell.coefficients.shape[1] for shell in shells)
        if max(longest, functions) <= MOST:
            return False
        count, what = (longest, "primitives in one shell")
        if functions > longest:
            count, what = (functions, "contracted functions")
        self.fault_line(
            "form.count",
            block.line,
            f"{count:,} {what} of {block.symbol}: no basis set has so many; not judged",
            element=block.symbol,
            measured=count,
            limit=MOST,
            remedy="check that this is the file you meant, and that it is whole",
        )
        return True

    def _say_overflow(self, block: BlockDraft, draft: ShellDraft) -> None:
        self.fault_line(
            "form.number",
            draft.heading,
            f"the scale factor {draft.scale:g} makes an exponent too large for a double-precision "
            "number",
            element=block.symbol,
            shell=draft.name,
            measured=draft.scale,
            expected=1.0,
            remedy="mend the scale factor: exponents are multiplied by its square",
        )

    @staticmethod
    def _table(draft: ShellDraft, values: Floats) -> tuple[Floats, Floats]:
        """Exponents (nprim,) and coefficients (nprim, ncontr) of a draft, views where possible."""
        (count, columns), start = draft.shape, draft.start
        e0, es, c0, ci, cj = draft.grid
        if draft.unit:
            first = start + e0
            return values[first : first + es * count : es], read_only(np.eye(count))
        if es == 1 and cj == 1 and ci == columns:  # a list and a matrix
            first, matrix = start + e0, start + c0
            end = matrix + count * columns
            if columns == 1:
                return values[first : first + count], values[matrix:end, None]
            return values[first : first + count], values[matrix:end].reshape(count, columns)
        if cj == 1 and e0 < ci == es >= c0 + columns:  # rows
            end = start + count * es
            if columns == 1:
                return values[start + e0 : end : es], values[start + c0 : end : es, None]
            table = values[start:end].reshape(count, es)
            return table[:, e0], table[:, c0 : c0 + columns]
        rows = np.arange(count)
        cells = start + c0 + ci * rows[:, None] + cj * np.arange(columns)
        return read_only(values[start + e0 + es * rows]), read_only(values[cells])

    def _sets(self, drafts: list[BlockDraft], made: list[Block]) -> Iterator[BasisSet]:
        """Group blocks into sets: by section, and anew where the list of elements starts again."""
        sections: dict[str, list[int]] = {}
        for at, draft in enumerate(drafts):
            sections.setdefault(draft.section, []).append(at)
        for members in sections.values():
            for group in self._restarts(members, made):
                first = drafts[group[0]]
                yield BasisSet(
                    tuple(made[at] for at in group), first.label, first.role, first.line + 1
                )

    def _restarts(self, members: list[int], made: list[Block]) -> Iterator[list[int]]:
        """Split the blocks of a section where several elements in a row come a second time."""
        group: list[int] = []
        seen: dict[int, Block] = {}
        for position, at in enumerate(members):
            block = made[at]
            if block.atomic_number in seen:
                following = [
                    made[other].atomic_number for other in members[position : position + 3]
                ]
                from_the_start = block.atomic_number == made[group[0]].atomic_number
                if from_the_start and len(set(following)) > 1 and all(z in seen for z in following):
                    self._say_restart(block, seen[block.atomic_number])
                    yield group
                    group, seen = [], {}
                else:
                    self._say_repeat(block, seen[block.atomic_number])
            seen.setdefault(block.atomic_number, block)
            group.append(at)
        if group:
            yield group

    def _say_restart(self, block: Block, before: Block) -> None:
        self.fault_line(
            "form.repeat",
            block.line - 1,
            f"the list of elements starts again here ({block.symbol} was on line {before.line}): "
            "judged as a second set",
            severity="note",
            element=block.symbol,
            remedy="keep one set per file, or name the sets",
        )

    def _say_repeat(self, block: Block, before: Block) -> None:
        equal = len(block.shells) == len(before.shells) and all(
            a.angular == b.angular
            and np.array_equal(a.exponents, b.exponents)
            and np.array_equal(a.coefficients, b.coefficients)
            for a, b in zip(block.shells, before.shells, strict=False)
        )
        how = "with the same numbers" if equal else "with other numbers"
        self.fault_line(
            "form.repeat",
            block.line - 1,
            f"{block.symbol} was already given on line {before.line}, {how}",
            element=block.symbol,
            measured=2,
            expected=1,
            remedy="keep one of the two: a reader may add them up, or take either",
        )


def _is_index(rows: Iterable[list[str]]) -> bool:
    """Whether the first words of rows are 1, 2, 3 ... without a point."""
    return all(row[0] == str(at) for at, row in enumerate(rows, 1))


def _are_numbered(rows: list[str]) -> bool:
    """As `_is_index`, for rows that are not split; says no where they are very many, or tabbed."""
    return len(rows) < 100 and all(map(str.startswith, rows, _ORDINALS))


def index_of(token: Token) -> int:
    """0-based line of a token."""
    return token.line or 0


def shorten(word: str, limit: int = 40) -> str:
    """A word short enough to print."""
    return word if len(word) <= limit else word[: limit - 3] + "..."


def integer(word: str) -> int | None:
    """Value of a word that is an unsigned whole number in ASCII digits of sensible length."""
    return int(word) if word.isascii() and word.isdigit() and len(word) < 16 else None
