"""Reader for the layout that is numbers alone: `6 4` heads an element, `0 0 3 2.0 1.0` a shell."""

import re
from collections.abc import Iterator

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of, integer, leading
from overlapse.grammar.elements import replaced_by, subshells, symbol_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, letter_of
from overlapse.grammar.pieces.charged import charged_lines, check_potential, read_potential
from overlapse.grammar.pieces.fives import FIVE, TYPES, Fives
from overlapse.grammar.pieces.plainlines import WITH_POTENTIAL, Lines
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, is_general, segments

_Shell = tuple[int, int, int]  # lines of its heading, of its first row, and past the last

PICTURE = """\
6 1
0 0 2 2.0 1.0
  4.0  0.6
  0.5  0.5"""

# Neighbours in a pattern never match the same signs, else a long line would take for ever.
_PLAIN = r"(?:\d+(?:\.\d*)?|\.\d+)"
_SHELL = rf"[012][ \t]+[0-5][ \t]+\d{{1,3}}[ \t]+{_PLAIN}[ \t]+{_PLAIN}(?!\S)[^\n]*"
_NEXT = r"[ \t]*\n(?:[ \t]*\n)*[ \t]*"
_BLOCK_THEN_SHELL = re.compile(
    rf"^[ \t]*([1-9]\d{{0,2}}[ \t]+\d{{1,2}}){_NEXT}(?:[A-Za-z]{{3,12}}{_NEXT})?({_SHELL})$",
    re.MULTILINE,
)
_BLOCK_THEN_POTENTIAL = re.compile(
    rf"^[ \t]*([2-9]\d\d[ \t]+\d{{1,2}}){_NEXT}INPUT{_NEXT}{_PLAIN}(?:[ \t]+\d+){{6}}\b",
    re.MULTILINE | re.IGNORECASE,
)
_SHELLS_THEN_ROWS = re.compile(
    rf"^[ \t]*(?=0){_SHELL}{_NEXT}[-+]?\d*\.\S*[ \t]+[-+]?\.?\d", re.MULTILINE
)


def recognise(source: Source) -> Evidence | None:
    text = source.flat
    if match := _BLOCK_THEN_SHELL.search(text):
        return Evidence(75, f"`{match[1]}` followed by the shell heading `{match[2].strip()}`")
    if match := _BLOCK_THEN_POTENTIAL.search(text):
        return Evidence(75, f"`{match[1]}`, `INPUT` and seven numbers of a core potential")
    if len(found := _SHELLS_THEN_ROWS.findall(text)) > 1:
        return Evidence(55, f"{len(found)} shell headings of five numbers, but no element heading")
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "deck")
        self.fives = Fives(self.build)
        self.lists = 0  # that have ended
        self.numbers: dict[tuple[int, int], str] = {}  # of headings, by list and atomic number

    def document(self) -> Document:
        tokens = self.build.joined(Lines(self.build).lines())
        pieces = self.build.parse(tokens).children
        last_end = max((at for at, piece in enumerate(pieces) if _is_token(piece)), default=-1)
        still_open: list[Node] = []
        for at, piece in enumerate(pieces):
            if isinstance(piece, Token):
                self.end(piece)
                still_open = []
            elif piece.data == "block":
                goes_on = at + 1 < last_end and not _is_token(pieces[at + 1])
                self.block(piece, goes_on)
                still_open.append(piece)
            else:
                self.stray(piece)
        self.check_end(still_open)
        return self.build.document()

    def end(self, line: Token) -> None:
        self.lists += 1
        if line.split() != ["99", "0"]:
            self.build.fault_line(
                "form.count",
                index_of(line),
                "the line that ends the list has lost its 0",
                measured=1,
                expected="99 0",
                remedy="write `99 0`",
            )

    def check_end(self, blocks: list[Node]) -> None:
        """A list that runs on into the next section, or is several elements long without an end."""
        if not blocks:
            return
        last = blocks[-1].children[-1]
        text = last.children[0] if isinstance(last, Tree) and last.data == "remark" else None
        within = isinstance(text, Token) and text.split()[0].upper() == "END"
        if within or len(blocks) > 1:
            line = text if within else blocks[-1].children[0]
            assert isinstance(line, Token)
            self.build.fault_line(
                "form.syntax",
                index_of(line),
                "the list of elements is not closed by `99 0`"
                + (" before this line" if within else ", of which this is the last"),
                severity="warning" if within else "note",
                expected="99 0",
                remedy="put a line `99 0` after the last shell of the last element",
            )

    def stray(self, node: Node) -> None:
        first = leading(node)
        shells = self.build.shells_in(first) if first.type == "SHELLS" else []
        for index in [heading for heading, _, _ in shells] or [index_of(first)]:
            self.build.fault_line(
                "form.syntax",
                index,
                "this stands below no element; a line with the atomic number and the number of "
                "shells is missing above it",
                expected="a heading such as `6 4`",
                remedy="write the heading of the element that this belongs to",
            )

    # ---- one element

    def block(self, node: Node, goes_on: bool) -> None:
        """``goes_on``: another element of the same list follows."""
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        block = self.headed(heading)
        announced = self.announced(heading, block)
        parts = [part for piece in pieces for part in self.parts(piece)]
        if not any(isinstance(part, Tree) and part.data == "potential" for part in parts):
            check_potential(self.build, block, heading)
        shells = [part for part in parts if isinstance(part, tuple)]
        first_of_next = self.lost_heading(block, announced, shells)
        sound, found = announced is not None and first_of_next is None, 0
        for at, part in enumerate(parts):
            if part is first_of_next:
                break
            if isinstance(part, tuple):
                # Below a line that nobody understands the next element may have begun.
                if sound or found != announced:
                    self.fives.shell(block, *part)
                    found += 1
            elif part.data == "potential":
                read_potential(self.build, block, heading, part)
            elif (
                len(part.children) > 1 or at + 1 < len(parts) or goes_on or part.data == "unheaded"
            ):
                self.misfit(block, part)
                sound = False
        if sound and found != announced:
            self.build.fault_word(
                "form.count",
                index_of(heading),
                1,
                f"{heading.split()[1]} shells are announced for {block.symbol}, {found} follow",
                element=block.symbol,
                measured=found,
                expected=announced,
                remedy="a shell was lost or added, or the count is wrong",
            )
            block.complete = block.complete and found > (announced or 0)

    def parts(self, piece: Token | Node) -> list[Node | _Shell]:
        """A piece of an element, or each of its shells."""
        assert isinstance(piece, Tree)
        first = piece.children[0]
        if isinstance(first, Token) and first.type == "SHELLS":
            return [*self.build.shells_in(first)]
        if isinstance(first, Token) and first.type == "SHELL":
            return [(index_of(first), index_of(first) + 1, index_of(first) + 1)]
        return [piece]

    def headed(self, heading: Token) -> BlockDraft:
        """The block that a heading opens; other numbers for one element make other sets."""
        word, index = heading.split()[0], index_of(heading)
        z = int(word) % 100
        first = self.numbers.setdefault((self.lists, z), word)
        section = f"{self.lists}" if first == word else f"{self.lists} {word}"
        if z > 0:
            return self.build.open_block(symbol_of(z), index, section=section)
        self.build.fault_word(
            "form.element",
            index,
            0,
            f"{word} stands for no element: its last two digits are the atomic number",
            measured=word,
            remedy="write the atomic number; add 200 where a core potential follows",
        )
        block = BlockDraft(word, None, index, section, end=index)
        self.build.blocks.append(block)
        return block

    def announced(self, heading: Token, block: BlockDraft) -> int | None:
        words = heading.split()
        if len(words) > 1:
            return integer(words[1])
        self.build.fault_line(
            "form.count",
            index_of(heading),
            f"the number of shells of {block.symbol} is missing",
            element=block.symbol,
            expected=f"{words[0]} 4",
            remedy="write the number of shells after the atomic number",
        )
        return None

    def lost_heading(
        self, block: BlockDraft, announced: int | None, shells: list[_Shell]
    ) -> _Shell | None:
        """The shell that begins another element whose heading is lost.

        When all shells have come, and after a d shell an s shell follows, that is likelier than a
        wrong count.
        """
        if not announced or len(shells) <= announced:
            return None
        bodies = self.build.bodies
        before, first = (bodies[index].split()[1] for index, _, _ in shells[announced - 1 :][:2])
        if first > "1" or before <= first:
            return None
        self.build.fault_line(
            "form.syntax",
            shells[announced][0],
            f"the {announced} shells announced for {block.symbol} are complete; "
            "the heading of the next element is missing above this line",
            expected="a heading such as `6 4`",
            remedy="write the atomic number and the number of shells of the next element",
        )
        return shells[announced]

    def misfit(self, block: BlockDraft, node: Node) -> None:
        """Rows or text where a shell heading belongs."""
        line = leading(node)
        block.complete = False
        what = f"{str(line)!r} is" if node.data == "remark" else "rows without a heading:"
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            f"{what} no shell heading, which has five numbers: {FIVE}",
            element=block.symbol,
            expected="a shell heading such as `0 0 3 2.0 1.0`",
            remedy="write the heading of the shell, or take the line out: there are no comments",
        )


def _is_token(piece: Token | Node) -> bool:
    return isinstance(piece, Token)


def write(document: Document) -> Written:
    """Every shell by itself; formal charges are those of the neutral atom."""
    losses = Losses()
    lines: list[str] = []
    losses.say("formal charges are filled in as the neutral atom has them")
    losses.say("the layout has no comments: names and remarks are left out")
    if any(block.functions for block in document.blocks):
        losses.say("the layout has no flag for spherical or Cartesian functions")
    if len(document.sets) > 1:
        losses.say("names that keep several sets of one file apart are not written")
    for block in document.blocks:
        if block.atomic_number > 98:
            losses.say("elements beyond 98 have no number here and are left out", block.symbol)
            continue
        lines += _block_lines(block, losses)
    return Written("\n".join([*lines, "99 0"]) + "\n", losses.lines())


def _block_lines(block: Block, losses: Losses) -> Iterator[str]:
    tables: list[tuple[tuple[int, ...], list[list[str]]]] = []
    for shell in block.shells:
        if max(shell.angular) > 4:
            losses.say("functions above g have no shell type here and are left out", block.symbol)
            continue
        if is_general(shell):
            losses.say("general contractions are written as separate shells", block.symbol)
        tables += segments(shell)
    potential = list(charged_lines(block, losses))
    if not tables and not potential:
        return
    yield f"{block.atomic_number + WITH_POTENTIAL * bool(potential)} {len(tables)}"
    yield from potential
    charges = _charges(block)
    for angular, rows in tables:
        shape = "".join(map(letter_of, angular))
        number = next(at for at, (letters, _) in enumerate(TYPES) if letters == shape)
        charge = sum(charges[l].pop(0) for l in angular if charges.get(l))
        yield f"0 {number} {len(rows)} {charge}.0 1.0"
        yield from columns(rows, 2)


def _charges(block: Block) -> dict[int, list[int]]:
    """Electrons of the occupied subshells outside the core, by l, from the inside out."""
    core = block.potential.electrons if block.potential else 0
    left = block.atomic_number
    charges: dict[int, list[int]] = {}
    for _, l in subshells(block.atomic_number):
        charges.setdefault(l, []).append(min(left, 4 * l + 2))
        left -= charges[l][-1]
    for l, count in (replaced_by(core) or {}).items():
        del charges.get(l, [])[:count]
    return charges


LAYOUT = Layout(
    name="deck",
    summary="numbers alone: `6 4` heads an element, `0 0 3 2.0 1.0` a shell, `99 0` ends the list",
    picture=PICTURE,
    comment="",
    recognise=recognise,
    read=read,
    write=write,
    highest=4,
)
