"""Reader for the layout whose elements are headed `a 6`, with one table for each l below it."""

import re
from collections.abc import Iterator
from itertools import zip_longest

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of, integer
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, Potential, letter_of
from overlapse.grammar.pieces.channels import channels_of, joined_channels, ladder, rows_of
from overlapse.grammar.pieces.gathering import composition, gathered
from overlapse.grammar.pieces.headings import count_of, heading_of, whole
from overlapse.grammar.pieces.tabled import TabledReader, take_out_comments
from overlapse.grammar.pieces.tables import ABUTTING, Tables
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, title_of

PICTURE = """\
a 6
    2    1    0
      4.0   0.6
      0.5   0.5"""

# Signs that make a whole line a comment; `$` and `!` do so from anywhere on.
_LINE_SIGNS = "*#/"
_ELEMENT = re.compile(r"^[ \t]*[aA][ \t]*[0-9]{1,3}\b(?!\.)[^\n]*", re.MULTILINE)
_HEADING = re.compile(r"([A-Za-z]{1,2})[ \t]*([0-9]{1,4})\b(?!\.)(.*)")


def recognise(source: Source) -> Evidence | None:
    text = source.flat
    potential = None
    # A heading may be damaged, so a few of them are looked at.
    for _, element in zip(range(50), _ELEMENT.finditer(text), strict=False):
        below = _numbers_below(text[element.end() : element.end() + 8000].split("\n")[1:80])
        kinds = [whole(line) for line in below]
        if kinds[:2] == ["HEAD", "COUNT"] and len(below[0].split()) == 2:
            potential = potential or element
        elif kinds[:1] == ["HEAD"]:
            return Evidence(78, f"`{element[0].strip()}` and `{below[0]}` headings")
    if potential:
        return Evidence(78, f"`{potential[0].strip()}` headings above counted core potentials")
    return None


def _numbers_below(lines: list[str]) -> list[str]:
    """The first two numeric lines below a heading, if not too much else stands between."""
    found: list[str] = []
    prose = 0
    for line in lines:
        body = line.split("$")[0].split("!")[0].strip()
        if body and body[0] in "0123456789+-.":
            found.append(body)
        elif body and body[0] not in _LINE_SIGNS:
            prose += 1
        if len(found) == 2 or prose > 3:
            break
    return found


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader(TabledReader):
    """Walks the tree of one text."""

    heading_example = "`4 2 0`"

    def __init__(self, source: Source) -> None:
        build = Build(source, "atomblocks", "$!", ABUTTING)
        # Lines led by other signs, pasted from elsewhere, are comments as well.
        take_out_comments(build, _LINE_SIGNS)
        super().__init__(build, Tables(build, None))
        self.prose: list[Token] = []

    def document(self) -> Document:
        tokens = list(self.build.tokens(self.classify, whole))
        tree = self.build.parse(self.without_foreign(self.settled(tokens)))
        for piece in tree.children:
            if isinstance(piece, Tree):
                self.element(piece)
        self.tables.close()
        self.say_prose()
        return self.build.document()

    # ---- which token a line is

    def classify(self, body: str, index: int) -> str:
        words = body.split()
        match = _HEADING.fullmatch(body)
        if match and match[1].lower() == "a":
            return "ELEMENT"
        if match and not match[3].strip():
            return "ELEMENT"  # another letter for the `a`
        if words[0] in ("a", "A") and (
            len(words) == 1 or (len(words) == 2 and number_of(words[1]) and words[1][0].isupper())
        ):
            return "ELEMENT"
        if whole(body) == "HEAD" and not words[0].isalpha():
            return "HEAD"  # l or O for its first digit
        if len(words) == 3 and words[2] == "0" and len(list(filter(str.isdigit, words))) == 2:
            return "SPOILT"
        return "TEXT"

    def settled(self, tokens: list[Token]) -> list[Token]:
        """The tokens with potentials told from tables, and headings from rows."""
        done: list[Token] = []
        at = start = 0
        while at < len(tokens):
            if not self.opens_potential(tokens, at):
                at += 1
                continue
            done += self.tables.joined(tokens[start:at])
            first = tokens[at]
            done.append(Token("POTENTIAL", str(first), line=first.line, end_line=first.end_line))
            channels, at = joined_channels(self.tables, tokens, at + 1)
            done += channels
            start = at
        return done + self.tables.joined(tokens[start:])

    def opens_potential(self, tokens: list[Token], at: int) -> bool:
        """Two numbers, a count, then a row of three whose first is a whole number."""
        kinds = [token.type for token in tokens[at : at + 3]]
        if kinds[:2] != ["HEAD", "COUNT"] or heading_of(tokens[at]).flagged:
            return False
        if count_of(tokens[at + 1]) == 0:
            return True
        if kinds[2:] not in (["ROWS"], ["HEAD"]):
            return False
        row = self.tables.run(tokens[at + 2]).rows[0]
        return len(row) == 3 and integer(row[0]) is not None

    def without_foreign(self, tokens: list[Token]) -> Iterator[Token]:
        """Text that is followed by numbers and looks like no heading ends the basis."""
        foreign = False
        for token, following in zip_longest(tokens, tokens[1:]):
            if token.type == "ELEMENT":
                foreign = False
            elif (
                token.type in ("TEXT", "SPOILT")
                and following is not None
                and following.type == "ROWS"
            ):
                foreign = foreign or not _is_damaged_heading(token)
            if not foreign:
                yield token

    # ---- the tree

    def element(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        block = self.opened(heading, pieces)
        self.begin(pieces)
        for piece in pieces:
            if not isinstance(piece, Tree):
                self.prose.append(piece)
                continue
            if piece.data in ("table", "interrupted"):
                block = self.in_order(block, piece)
            getattr(self, str(piece.data))(block, piece)

    def opened(self, heading: Token, pieces: list[Token | Node]) -> BlockDraft:
        """The block of an element; a lone potential joins the element's orbital block."""
        index, words = index_of(heading), heading.split()
        match = _HEADING.fullmatch(heading)
        number = integer(match[2]) if match else number_of(words[-1])
        if match is None or match[1].lower() != "a":
            self.misspelt(heading, number)
        number = number if number is not None and 1 <= number <= 118 else None
        kinds = {piece.data for piece in pieces if isinstance(piece, Tree)}
        if kinds == {"potential"} and number is not None:
            for block in reversed(self.build.blocks):
                if block.number == number:
                    return block
        if number is not None:
            return self.build.open_block(symbol_of(number), index)
        block = BlockDraft(words[-1], None, index, "", end=index)
        self.build.blocks.append(block)
        if match is not None:
            self.unknown_element(heading, match[2])
        return block

    def misspelt(self, heading: Token, number: int | None) -> None:
        """A heading without its `a`, or without its number."""
        words = heading.split()
        lacks = len(words) == 1 and number is None
        self.build.fault_line(
            "form.element" if lacks or words[0] in ("a", "A") else "form.syntax",
            index_of(heading),
            f"{str(heading)!r} lacks the atomic number"
            if lacks
            else f"{str(heading)!r} is read as the heading of an element, `a {number}`",
            measured=str(heading),
            expected=None if number is None else f"a {number}",
            remedy="write `a` and the atomic number of the element",
        )

    def unknown_element(self, heading: Token, number: str) -> None:
        self.build.fault_line(
            "form.element",
            index_of(heading),
            f"no element has the atomic number {number}",
            measured=number,
            remedy="write the atomic number of the element that this block describes",
        )

    def table(self, block: BlockDraft, node: Node) -> None:
        heading = node.children[0]
        rows = node.children[1] if len(node.children) > 1 else None
        assert isinstance(heading, Token) and (rows is None or isinstance(rows, Token))
        self.tables.add(block, self.l, heading, rows)
        self.next_table()

    def potential(self, block: BlockDraft, node: Node) -> None:
        heading, *channels = node.children
        assert isinstance(heading, Token)
        highest, electrons, _ = heading_of(heading)
        nodes = [channel for channel in channels if isinstance(channel, Tree)]
        made = channels_of(self.tables, block, nodes, highest, index_of(heading), 0)
        block.potential = Potential(electrons, made, index_of(heading) + 1)

    def say_prose(self) -> None:
        """Lines without a comment sign between the tables harm nobody, but are said once."""
        if not self.prose:
            return
        first, more = self.prose[0], len(self.prose) - 1
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            f"{str(first)!r} is passed over: it is no heading and no row of numbers"
            + (f"; so are {more} more lines in this text" if more else ""),
            severity="note",
            remedy="make it a comment with `$`",
        )


def _is_damaged_heading(token: Token) -> bool:
    """Few words with a digit among them; a SPOILT line is two numbers of a heading."""
    return token.type == "SPOILT" or (len(token.split()) <= 3 and any(map(str.isdigit, token)))


def write(document: Document) -> Written:
    """One table for each l; potentials below all orbital blocks."""
    losses = Losses()
    lines: list[str] = []
    if any(block.functions for block in document.blocks):
        losses.say("the layout has no flag for spherical or Cartesian functions")
    if len(document.sets) > 1:
        losses.say("the sets of the file are no longer kept apart")
    if any(block.label for block in document.blocks) or any(s.label for s in document.sets):
        losses.say("the name of the set stands in a comment only")
    for block in document.blocks:
        if block.shells:
            lines += _block_lines(document, block, losses)
    for block in document.blocks:
        lines += _potential_lines(block, losses)
    return Written("\n".join(lines) + "\n", losses.lines())


def _block_lines(document: Document, block: Block, losses: Losses) -> Iterator[str]:
    tables = gathered(block, losses)
    primitives, contracted = composition(tables, ",")
    yield f"a {block.atomic_number}"
    yield f"$ {block.symbol}  ({primitives}) -> [{contracted}]  {title_of(document, block)}"
    for l, (exponents, rows) in enumerate(tables):
        yield f"$ {letter_of(l)}-type functions"
        yield f"{len(exponents):5}{len(rows[0]) if rows else 0:5}    0"
        yield from columns([[e, *row] for e, row in zip(exponents, rows, strict=True)], 4)


def _potential_lines(block: Block, losses: Losses) -> Iterator[str]:
    potential = block.potential
    channels = ladder(potential, block.symbol, losses) if potential else None
    if potential is None or channels is None:
        return
    yield f"a {block.atomic_number}"
    yield f"{len(channels) - 1:5}{potential.electrons:5}"
    for channel in channels:
        rows = rows_of(channel)
        yield f"{len(rows):10}"
        yield from columns(rows, 1)


LAYOUT = Layout(
    name="atomblocks",
    summary="elements headed `a 6`, one table for each l headed `4 2 0`; core potentials alike",
    picture=PICTURE,
    comment="$!",
    recognise=recognise,
    read=read,
    write=write,
)
