"""From lines to tokens to a tree, and the faults that have a place in the text."""

from collections.abc import Callable, Collection, Iterable, Iterator, Sequence
from functools import cache, cached_property
from typing import Any

from lark import Lark, Token
from lark.exceptions import UnexpectedToken
from lark.lexer import Lexer

from overlapse.grammar.compiled import grammar
from overlapse.grammar.drafts import Node, Run, index_of, integer, shorten
from overlapse.grammar.model import Fault, Remark, Span
from overlapse.grammar.numbers import Reading, looks_numeric, read_number
from overlapse.grammar.source import Source

_ROW_START = frozenset("0123456789+-.")


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


class Lines:
    """The lines of a text without their comments, as tokens, rows and words."""

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
        self.bodies = self._without_comments() if windows is None else self._within(windows)
        self.split: Callable[[str], list[str]] = str.split  # a row into its words
        self.separators = ""  # signs that part numbers as blanks do
        self.leading = ""  # signs that make a line a comment where they lead it
        self._readings: dict[str, Reading] = {}
        self._runs_of_shells: dict[int, list[tuple[int, int, int]]] = {}

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

    # ---- numbers

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
            edits=((span, spelling),) if spelling else (),
        )
