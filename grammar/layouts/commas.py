"""Reader for the layout of statements with commas: `s, C, exponents`, then `c, 1.3, ...`."""

import re
from collections.abc import Iterator

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of, leading, shorten
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, letter_of
from overlapse.grammar.pieces.contractions import contractions, has_fields
from overlapse.grammar.pieces.soundstatements import Column, Cut, cuts
from overlapse.grammar.pieces.statedcores import read_stated, stated_lines
from overlapse.grammar.pieces.statements import (
    FIELD,
    Statements,
    as_numbers,
    fault_field,
    fields_of,
    run_of,
)
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, split_shared, title_of

PICTURE = """\
basis={
s, C , 4.0, 0.5
c, 1.2, 0.6, 0.5
}"""

_SHELL = re.compile(
    r"(?:^|[;{])[ \t]*([spdfghik][ \t]*,[ \t]*[A-Z]{1,3}[ \t]*,[ \t]*[-+]?\.?\d)",
    re.MULTILINE | re.IGNORECASE,
)
_COLUMN = re.compile(r"(?:^|;)[ \t]*(c[ \t]*,[ \t]*\d+\.\d+[ \t]*,)", re.MULTILINE | re.IGNORECASE)
_BASIS = re.compile(r"(?:^|[ \t,])basis[ \t]*=[ \t]*\{", re.MULTILINE | re.IGNORECASE)
_ECP = re.compile(
    r"(?:^|[;{])[ \t]*(ecp[ \t]*,[ \t]*[A-Z]{1,3}[ \t]*,[ \t]*\d+[ \t]*,[ \t]*\d+)",
    re.MULTILINE | re.IGNORECASE,
)


def recognise(source: Source) -> Evidence | None:
    text = source.flat
    shell = _SHELL.search(text)
    if shell and (column := _COLUMN.search(text)):
        return Evidence(85, f"statements such as `{shell[1]}...` and `{column[1]} ...`")
    if shell and _BASIS.search(text):
        return Evidence(85, f"`basis={{` and statements such as `{shell[1]}...`")
    if potential := _ECP.search(text):
        return Evidence(80, f"the statement `{potential[1]}`")
    if shell and _SHELL.search(text, shell.end()):
        return Evidence(65, f"statements such as `{shell[1]}...`")
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "commas", "!", FIELD)
        self.build.split, self.build.separators = as_numbers, ",;"
        self.statements = Statements(self.build)
        self.cuts: dict[tuple[int, tuple[Column, ...]], list[Cut]] = {}
        self.section = ""
        self.sections = 0
        self.known: dict[tuple[str, str], BlockDraft] = {}  # the last of a section and symbol
        self.last: BlockDraft | None = None

    def document(self) -> Document:
        tokens = list(self.statements.tokens())
        self.build.note_letters(
            (fields_of(token)[0], index_of(token)) for token in tokens if token.type == "SHELL"
        )
        for piece in self.build.parse(tokens).children:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
            else:
                self.single(piece)
        return self.build.document()

    def basis(self, node: Node) -> None:
        self.sections += 1
        self.section = f"basis {self.sections}"
        for piece in node.children:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
            else:
                self.single(piece)
        self.section = ""
        opening, last = node.children[0], node.children[-1]
        assert isinstance(opening, Token)
        if not (isinstance(last, Token) and last.type == "CLOSE"):
            self.build.fault_line(
                "form.syntax",
                index_of(opening),
                f"the section `{opening}` is not closed by a brace",
                severity="warning",
                expected="}",
                remedy="put a line `}` after the last statement of the basis",
            )

    def single(self, token: Token) -> None:
        """A statement that has no children."""
        if token.type == "SET":
            self.section = f"basis {self.sections} {' '.join(fields_of(token)[1:]).lower()}"
        elif token.type == "REFER":
            fault_field(
                self.build,
                token,
                0,
                "form.syntax",
                f"{shorten(str(token))!r} names a set that stands in a library, not in this text: "
                "it is not judged",
                severity="note",
                remedy="write the numbers out to have them judged",
            )

    def stray(self, node: Node) -> None:
        first = leading(node)
        what = "contraction" if first.type == "COLUMN" else "numbers"
        wanted = "s, C, 4.0, 0.5"
        if self.last is not None:
            self.last.complete = False
        fault_field(
            self.build,
            first,
            0,
            "form.syntax",
            f"{what} without exponents above; a statement such as `{wanted}` is missing",
            expected=wanted,
            remedy="write the statement with letter, symbol and exponents",
        )

    def remark(self, node: Node) -> None:
        line = leading(node)
        if self.last is not None:
            self.last.complete = False
        fault_field(
            self.build,
            line,
            0,
            "form.syntax",
            f"{shorten(str(line))!r} is no statement of a basis",
            expected="`s, C, 4.0, 0.5` or `c, 1.2, 0.6, 0.5`",
            remedy="mend the statement, or make it a comment with `!`",
        )

    # ---- shells

    def shells(self, node: Node) -> None:
        token, build = node.children[0], self.build
        assert isinstance(token, Token)
        block: BlockDraft | None = None
        symbol = ""
        run, counts = self.statements.runs[index_of(token)], self.statements.plain.counts
        base = build.take(run.texts, run.total)
        for first, last, opening, columns, start in run.shells:
            angular = build.angular_of(opening.letter, first)
            assert angular is not None
            if block is None or opening.symbol != symbol:
                symbol = opening.symbol
                block = self.block(first, 1, symbol, angular)
            key = counts[first] - 2, tuple(columns)
            if (found := self.cuts.get(key)) is None:
                found = self.cuts[key] = list(cuts(*key))
            place = base + start
            for shape, grid, unit in found:
                build.even_shell(block, angular, first, first, last, place, shape, grid, unit=unit)

    def shell(self, node: Node) -> None:
        heading, *rest = node.children
        assert isinstance(heading, Token)
        fields = fields_of(heading)
        angular = self.build.angular_of(fields[0], index_of(heading), heading.column or 0)
        symbol, place = fields[1] if len(fields) > 1 else "", (heading.column or 0) + 1
        block = self.block(index_of(heading), place, symbol, angular)
        for piece in rest:
            if isinstance(piece, Tree):
                self.remark(piece)
        columns = [piece for piece in rest if isinstance(piece, Token)]
        count = len(fields) - 2
        whole = all([has_fields(self.build, block, token) for token in (heading, *columns)])
        run, places = run_of([heading, *columns], self.build.bodies)
        if count < 1:
            fault_field(
                self.build,
                heading,
                0,
                "form.count",
                "no exponents follow the letter and the symbol",
                element=block.symbol,
                measured=0,
                remedy="restore the exponents, or take the statement out",
            )
        found = (
            contractions(self.build, block, heading, columns, places[1:])
            if count > 0 and whole
            else []
        )
        kept = angular is not None and whole and count > 0 and (found or not columns)
        block.complete = block.complete and bool(kept) and len(found) == len(columns)
        block.end = max(block.end, *run.lines)
        if angular is None or not kept:
            self.build.check_words(block, None, run)
        else:
            ranges = [(column.first, column.last, column.at) for column in found]
            for shape, grid, unit in cuts(count, ranges):
                self.build.matrix(block, angular[0], index_of(heading), run, shape, grid, unit=unit)

    def block(
        self, index: int, word: int, symbol: str, angular: tuple[int, ...] | None
    ) -> BlockDraft:
        """The block of a symbol; a new one where the list of shells begins anew.

        The symbol is a word of line ``index`` (both 0-based).
        Elements may take turns, as long as each goes on where it stopped.
        """
        key = (self.section, symbol.lower())
        known = self.known.get(key)
        shells = known.shells if known is not None and known is not self.last else []
        if known is None or (angular and shells and angular[0] <= shells[-1].angular[0]):
            known = self.known[key] = self.build.open_block(
                symbol, index, section=self.section, word=word
            )
        self.last = known
        return known

    # ---- core potentials

    def potential(self, node: Node) -> None:
        heading, *rest = node.children
        assert isinstance(heading, Token)
        for piece in rest:
            if isinstance(piece, Tree):
                self.remark(piece)
        numbers = [piece for piece in rest if isinstance(piece, Token)]
        fields = fields_of(heading)
        block = self.owner(heading, fields[1] if len(fields) > 1 else "")
        if len(fields) == 3 and not numbers and not fields[2].isdigit():
            block.complete = False
            self.single(Token.new_borrow_pos("REFER", str(heading), heading))
            return
        read_stated(self.build, block, heading, numbers)

    def owner(self, heading: Token, symbol: str) -> BlockDraft:
        """The block that a potential belongs to: the element's in this section, if there is one."""
        self.last = self.known.get((self.section, symbol.lower()))
        return self.last or self.block(index_of(heading), (heading.column or 0) + 1, symbol, None)


def write(document: Document) -> Written:
    """A section for each set; a `c` statement for each contraction."""
    losses = Losses()
    lines: list[str] = []
    if any(block.functions for block in document.blocks):
        losses.say("the layout has no flag for spherical or Cartesian functions")
    for members in document.sets:
        lines.append("basis={")
        for block in members.blocks:
            if block.label or members.label:
                losses.say("a set's name is only a comment here")
            lines.append(f"! {block.symbol} {title_of(document, block)}")
            lines += _shell_lines(block, losses)
            lines += stated_lines(block, losses)
        lines.append("}")
    return Written("\n".join(lines) + "\n", losses.lines())


def _shell_lines(block: Block, losses: Losses) -> Iterator[str]:
    for shell in block.shells:
        if len(shell.angular) > 1:
            losses.say("shared s and p exponents are written as an s and a p shell", block.symbol)
        used = iter(shell.coefficients.T != 0.0)
        for l, exponents, table in split_shared(shell):
            yield f"{letter_of(l)}, {block.symbol} , {', '.join(exponents)}"
            for column, in_use in zip(zip(*table, strict=True), used, strict=False):
                places = in_use.nonzero()[0].tolist() or [0, len(column) - 1]
                first, last = places[0], places[-1]
                yield f"c, {first + 1}.{last + 1}, {', '.join(column[first : last + 1])}"


LAYOUT = Layout(
    name="commas",
    summary="statements `s, C, exponents`, then `c, 1.3, coefficients` for each contraction",
    picture=PICTURE,
    comment="!",
    recognise=recognise,
    read=read,
    write=write,
)
