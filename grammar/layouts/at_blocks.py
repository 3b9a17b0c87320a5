"""Reader for the layout whose elements stand between `@ATOMBASIS C` and `@END`."""

import re
from collections.abc import Iterator
from difflib import SequenceMatcher

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, Run, index_of, integer, leading
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Document, Shell, letter_of
from overlapse.grammar.pieces.slips import say_remark, say_unheaded
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, split_shared

PICTURE = """\
@ATOMBASIS C
S 2  1
  4.0e+00  6.0e-01
  5.0e-01  5.0e-01
@END"""

_ELEMENT = re.compile(r"^[ \t]*@ATOMBASIS\b[^\n!]*", re.MULTILINE | re.IGNORECASE)
_NAME = re.compile(r"^[ \t]*@BASIS_SET\b[^\n!]*", re.MULTILINE | re.IGNORECASE)
_SEAL = re.compile(r"[0-9a-fA-F]{32}")
_LETTERS = re.compile(r"[A-Za-z]{1,2}|[Ll]=\d+")


def recognise(source: Source) -> Evidence | None:
    text = source.flat
    if element := _ELEMENT.search(text):
        return Evidence(95, f"`{element[0].strip()}` headings")
    if name := _NAME.search(text):
        return Evidence(85, f"`{name[0].strip()}`, but no `@ATOMBASIS` heading")
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "at-blocks", "!")
        self.label: str | None = None
        self.names = 0
        self.homeless = False  # whether shells without an element have been said already

    def document(self) -> Document:
        tokens = list(self.build.tokens(self.classify, _seal, joined=True))
        self.build.note_letters(self.build.shell_letters(tokens))
        for piece in self.build.parse(self.interruptions(tokens)).children:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
            elif piece.type == "NAME":
                self.name(piece)
        return self.build.document()

    def classify(self, body: str, index: int) -> str:
        words = body.split()
        if body[0] == "@":
            return _at_line(words[0].upper())
        if (
            len(words) > 1
            and _LETTERS.fullmatch(words[0])
            and all(word.isascii() and word.isdigit() for word in words[1:])
        ):
            return "SHELL"
        return _seal(body) or "TEXT"

    def interruptions(self, tokens: list[Token]) -> Iterator[Token]:
        """The tokens, with a TEXT that parts the announced rows of a shell as an INTRUDER."""
        at = 0
        while at < len(tokens):
            token = tokens[at]
            kinds = [token.type for token in tokens[at + 1 : at + 3]]
            at += 1
            if token.type in ("SHELL", "SHELLS") and kinds == ["TEXT", "ROWS"]:
                line, rows = tokens[at : at + 2]
                heading = self.parted(token, rows)
                if heading is not None:
                    if token.type == "SHELLS" and self.build.shells_in(token):
                        yield token
                    yield heading
                    yield Token("INTRUDER", str(line), line=line.line, end_line=line.end_line)
                    at += 2
                    continue
            yield token

    def parted(self, token: Token, rows: Token) -> Token | None:
        """The heading of the last shell, taken out of its run, if ``rows`` make it whole."""
        shells = self.build.shells_in(token) if token.type == "SHELLS" else []
        heading, first, last = shells[-1] if shells else (index_of(token), 0, 0)
        body = self.build.bodies[heading]
        found = sum(len(run.rows) for run in (self.build.rows_between(first, last),
                                               self.build.rows(rows)))  # fmt: skip
        if found != integer(body.split()[1]):
            return None
        if shells:
            shells.pop()
        return Token("SHELL", body, line=heading, end_line=heading + 1)

    # ---- the tree

    def name(self, line: Token) -> None:
        """The set's name; file-name forms such as 6-31G_D_ carry the real one in the comment."""
        words = line.split(None, 1)
        self.names += 1
        self.label = words[1].strip() if len(words) > 1 else None
        remark = self.build.source.lines[index_of(line)].partition("!")[2].split()
        if len(remark) == 1:
            self.label = remark[0]

    def element(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        words = heading.split()
        index = index_of(heading)
        self.homeless = False
        if words[0].upper() != "@ATOMBASIS":
            self.misspelt(index, words[0])
        block = self.build.open_block(
            words[1] if len(words) > 1 else "",
            index,
            section=f"{self.names} {self.label or ''}",
            label=self.label,
            word=1 if len(words) > 1 else 0,
        )
        for piece in pieces:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(block, piece)
        last = node.children[-1]
        if not (isinstance(last, Token) and last.type == "END"):
            self.unclosed(index, block.symbol)

    def misspelt(self, index: int, word: str) -> None:
        self.build.fault_word(
            "form.syntax",
            index,
            0,
            f"{word!r} is read as `@ATOMBASIS`",
            measured=word,
            expected="@ATOMBASIS",
            remedy="write `@ATOMBASIS`",
        )

    def unclosed(self, index: int, symbol: str) -> None:
        self.build.fault_line(
            "form.syntax",
            index,
            f"the block of {symbol} is not closed by `@END`",
            severity="warning",
            element=symbol,
            expected="@END",
            remedy="put a line `@END` after the last row of the block",
        )

    def shells(self, block: BlockDraft, node: Node) -> None:
        token = leading(node)
        build = self.build
        for heading, first, last in build.shells_in(token):
            words = build.bodies[heading].split()
            plain = len(words) == 2 or words[2:] == ["1"]
            if not plain or not build.sound_shell(block, words[0], heading, first, last, words[1]):
                self.shell(block, heading, build.rows_between(first, last))

    def bare(self, block: BlockDraft, node: Node) -> None:
        heading = leading(node)
        self.shell(block, index_of(heading), self.build.rows(None))

    def shell(self, block: BlockDraft, heading: int, run: Run) -> None:
        words = self.build.bodies[heading].split()
        # Without a count there is one column; an sp shell counts in its own way.
        announced = integer(words[2]) if len(words) > 2 else 1
        announced = None if words[0].lower() == "sp" else announced
        if len(words) > 2 and announced is not None and run.rows:
            self.check_columns(block, heading, words[2], run)
        self.build.shell(
            block,
            words[0],
            heading,
            run,
            announced=words[1],
            general=len(words) > 2,
            columns=announced,
        )

    def check_columns(self, block: BlockDraft, heading: int, announced: str, run: Run) -> None:
        wanted = integer(announced)
        if any(len(row) - 1 == wanted for row in run.rows):
            return  # rows that differ are faults of their own
        widths = [len(row) - 1 for row in run.rows]
        found = max(set(widths), key=widths.count)
        if found == 0:
            return
        self.build.fault_word(
            "form.count",
            heading,
            2,
            f"the heading announces {announced} columns of coefficients, the rows have {found}",
            element=block.symbol,
            measured=found,
            expected=wanted,
            remedy="a column was lost or added, or the count is wrong: compare with the source",
        )

    def interrupted(self, block: BlockDraft, node: Node) -> None:
        line = node.children[1]
        assert isinstance(line, Token)
        block.complete = False
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            f"{str(line)!r} stands among the rows of a shell and is no row of numbers",
            element=block.symbol,
            remedy="make it a comment with `!`, or mend the row",
        )

    def unheaded(self, block: BlockDraft, node: Node) -> None:
        first = leading(node)
        block.complete = False
        say_unheaded(self.build, first, block.symbol, "S 3  1", "a letter and the number of rows")

    def remark(self, block: BlockDraft, node: Node) -> None:
        first = leading(node)
        block.complete = False
        say_remark(self.build, first, block.symbol, "S 3  1", "@END", "!")

    def stray(self, node: Node) -> None:
        first = leading(node)
        # Among our blocks a shell with rows has lost its element; elsewhere it is not ours.
        ours = first.type == "SHELLS" and (self.build.blocks or self.names)
        if self.homeless or not ours:
            return
        self.homeless = True
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            "this shell stands outside any element; a line `@ATOMBASIS` with a symbol is missing "
            "above it",
            expected="an element heading such as `@ATOMBASIS C`",
            remedy="write the heading of the element that this belongs to",
        )


def _at_line(word: str) -> str:
    """Which token a line led by `@` is, by its first word; near misses of `@ATOMBASIS` count."""
    if word in ("@END", "@BASIS_SET"):
        return "END" if word == "@END" else "NAME"
    near = SequenceMatcher(None, word[:20], "@ATOMBASIS").ratio() >= 0.85
    return "ELEMENT" if near else "OTHER"


def _seal(body: str) -> str | None:
    return "SEAL" if len(body) == 32 and _SEAL.fullmatch(body) else None


def write(document: Document) -> Written:
    """A named list of blocks for each set; columns of a shell stay together."""
    losses = Losses()
    lines: list[str] = []
    if any(block.functions for block in document.blocks):
        losses.say("the layout has no flag for spherical or Cartesian functions")
    for members in document.sets:
        blocks = [block for block in members.blocks if block.shells]
        if blocks:
            lines += [f"@BASIS_SET {members.label or 'UNNAMED'}", ""]
        for block in blocks:
            lines.append(f"@ATOMBASIS {block.symbol.upper()}")
            for shell in block.shells:
                lines += _shell_lines(shell, block.symbol, losses)
            lines += ["@END", ""]
    for block in document.blocks:
        if block.potential is not None:
            losses.say("core potentials are left out", block.symbol)
    return Written("\n".join(lines).rstrip("\n") + "\n", losses.lines())


def _shell_lines(shell: Shell, element: str, losses: Losses) -> Iterator[str]:
    if len(shell.angular) > 1:
        losses.say("shared s and p exponents are written as an s and a p shell", element)
    for l, exponents, rows in split_shared(shell):
        yield f"{letter_of(l).upper()} {len(exponents)}  {len(rows[0])}"
        yield from columns([[e, *row] for e, row in zip(exponents, rows, strict=True)], 0)


LAYOUT = Layout(
    name="at-blocks",
    summary="blocks between `@ATOMBASIS C` and `@END`; shells headed `S 3 1`",
    picture=PICTURE,
    comment="!",
    recognise=recognise,
    read=read,
    write=write,
)
