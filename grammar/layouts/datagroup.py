"""Reader for the layout of a `$DATA` group: atoms, their shells, and rows that are numbered."""

import re
from collections.abc import Iterator

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of, leading
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, Shell, letter_of
from overlapse.grammar.numbers import looks_numeric
from overlapse.grammar.pieces.atoms import is_atom, open_atom
from overlapse.grammar.pieces.centres import gather
from overlapse.grammar.pieces.groups import keep_groups, say_built_in, say_missing
from overlapse.grammar.pieces.numbered import Numbered
from overlapse.grammar.pieces.titled import Cores, titled_lines
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, is_general, segments, title_of

PICTURE = """\
 C   6.0   0.0   0.0   0.0
   S   2
     1     4.0      0.6
     2     0.5      0.5"""

_DATA = re.compile(r"^ ?(\$DATA)[ \t]*$", re.MULTILINE | re.IGNORECASE)
_ECP = re.compile(r"^ ?(\$ECP)[ \t]*\n[ \t]*\S+-ECP\b", re.MULTILINE | re.IGNORECASE)
_CARD = re.compile(r"[A-Za-z]\w+(?:\s+\d+)?")


def recognise(source: Source) -> Evidence | None:
    if match := _DATA.search(source.flat) or _ECP.search(source.flat):
        return Evidence(90, f"a `{match[1]}` group")
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "datagroup", "!")
        self.numbered = Numbered(self.build)
        self.group = ""
        self.atoms: list[BlockDraft] = []  # of all groups, in the order of the text
        self.empty: list[tuple[BlockDraft, Token]] = []  # atoms with neither shells nor card
        self.named: set[tuple[str, str]] = set()  # elements and their built-in sets
        self.cores = Cores(self.build, self.atoms)

    def document(self) -> Document:
        keep_groups(self.build)
        tokens = list(self.build.tokens(self.classify, self.count_line, joined=True))
        self.build.note_letters(self.build.shell_letters(tokens))
        for piece in self.build.parse(tokens).children:
            assert isinstance(piece, Tree)
            getattr(self, str(piece.data))(piece)
        self.check_empty()
        self.cores.give()
        return gather(self.build.document(), "warning")

    # ---- which token a line is

    def classify(self, body: str, index: int) -> str:
        if body in self.numbered.known and self.group == "$data":
            return "SHELL"
        words = body.split()
        if body[0] == "$":
            self.group = words[0].lower()
            return {"$data": "DATA", "$ecp": "ECP"}.get(self.group, "END")
        if self.group == "$ecp":
            is_named = words[0].upper().endswith("-ECP") or words[1:2] in (["GEN"], ["gen"])
            return "POTENTIAL" if is_named else "TEXT"
        if is_atom(body):
            return "ATOM"
        if (
            len(words) < 4
            and words[0].isalpha()
            and (len(words[0]) == 1 or words[0].upper() == "SP")
        ):
            self.numbered.note(body)
            return "SHELL"
        if _CARD.fullmatch(body) and (body.isupper() or any(c.isdigit() for c in body)):
            return "CARD"
        return "TEXT"

    def count_line(self, body: str) -> str | None:
        """In `$ECP` a line with the number of rows, most often followed by a title."""
        if self.group != "$ecp":
            return None
        words = body.split()
        if words[0].upper().endswith("-ECP"):
            return "POTENTIAL"
        return "COUNT" if len(words) == 1 or not looks_numeric(words[1]) else None

    # ---- atoms

    def data(self, node: Node) -> None:
        before = ""
        for piece in node.children:
            if not isinstance(piece, Tree):
                continue
            if piece.data == "atom":
                self.atom(piece, not before)
            elif before != "loose":
                say_missing(self.build, piece, "C   6.0   0.0   0.0   0.0")
            before = str(piece.data)
        self.check_end(node)

    def check_end(self, node: Node) -> None:
        heading, last = node.children[0], node.children[-1]
        assert isinstance(heading, Token)
        if not (isinstance(last, Token) and last.type == "END"):
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                f"this `{heading.split()[0]}` group is not closed by `$END`",
                severity="warning",
                expected="$END",
                remedy="put a line ` $END` after the last line of the group",
            )

    def atom(self, node: Node, first: bool) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        index = index_of(heading)
        if not first and self.build.source.lines[index - 1].strip():
            self.build.fault_line(
                "form.syntax",
                index,
                "no blank line ends the atom above this one",
                severity="warning",
                element=self.atoms[-1].symbol if self.atoms else None,
                remedy="put a blank line above this one",
            )
        block = open_atom(self.build, heading)
        self.atoms.append(block)
        if not pieces:
            self.empty.append((block, heading))
        for piece in pieces:
            assert isinstance(piece, Tree)
            getattr(self, str(piece.data))(block, piece)

    def check_empty(self) -> None:
        """Atoms without shells: a note if all are so, for then the basis stands elsewhere."""
        everywhere = len(self.empty) == len(self.atoms)
        for block, heading in self.empty[: 1 if everywhere else None]:
            block.complete = False
            self.build.fault_line(
                "form.count",
                index_of(heading),
                "no atom of this group has shells: the basis is not in this text"
                if everywhere
                else f"neither shells nor a card follow this atom {block.symbol}",
                severity="note" if everywhere else "warning",
                element=block.symbol,
                measured=0,
                remedy="restore the atom's shells, or name a built-in set on a card",
            )

    # ---- what stands below an atom

    def shells(self, block: BlockDraft, node: Node) -> None:
        token = leading(node)
        for index, first, last in self.build.shells_in(token):
            self.numbered.shell(block, index, first, last)

    def bare(self, block: BlockDraft, node: Node) -> None:
        heading = leading(node)
        index = index_of(heading)
        self.numbered.shell(block, index, index + 1, index + 1)

    def card(self, block: BlockDraft, node: Node) -> None:
        """A set that is built into the program: said once for each element."""
        card = leading(node)
        block.complete = False
        block.end = max(block.end, index_of(card))
        if (block.symbol, str(card)) not in self.named:
            self.named.add((block.symbol, str(card)))
            say_built_in(
                self.build, card, block.symbol, f"{str(card)!r} names a set for {block.symbol}"
            )

    def misnamed(self, block: BlockDraft, node: Node) -> None:
        card = leading(node)
        block.complete = False
        self.build.fault_word(
            "form.letter",
            index_of(card),
            0,
            f"{card.split()[0]!r} is no letter of a shell, and a card for a built-in set has no "
            "rows below it",
            element=block.symbol,
            measured=card.split()[0],
            expected="one of S P D F G H I, or L for s and p together",
            remedy="write the letter of the shell",
        )

    def unheaded(self, block: BlockDraft, node: Node) -> None:
        self.misfit(block, node, "rows without a shell heading above them")

    def remark(self, block: BlockDraft, node: Node) -> None:
        self.misfit(block, node, f"{str(node.children[0])!r} is no shell heading, card or row")

    def misfit(self, block: BlockDraft, node: Node, message: str) -> None:
        line = leading(node)
        block.complete = False
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            message,
            element=block.symbol,
            expected="a shell heading such as `S   3`",
            remedy="write the heading of the shell, or make the line a comment with `!`",
        )

    # ---- core potentials

    def ecp(self, node: Node) -> None:
        entry, before = 0, ""
        for piece in node.children:
            if not isinstance(piece, Tree):
                continue
            if piece.data == "potential":
                self.cores.read(piece, entry)
                entry += 1
            elif before != "loose":
                say_missing(self.build, piece, "HG-ECP GEN   60   3")
            before = str(piece.data)
        self.check_end(node)


def write(document: Document) -> Written:
    """An atom for each block, one behind the other; every shell by itself."""
    losses = Losses()
    losses.say("the atoms stand at made-up places")
    if any(block.functions for block in document.blocks):
        losses.say("the layout has no flag for spherical or Cartesian functions")
    if len(document.sets) > 1:
        losses.say("names that keep several sets of one file apart are not written")
    title = title_of(document, document.blocks[0]) if document.blocks else "unnamed"
    lines = [" $DATA", title, "C1"]
    for at, block in enumerate(document.blocks):
        shells = [line for shell in block.shells for line in _shell_lines(shell, block, losses)]
        if shells:
            place = f"0.0   0.0   {10 * at}.0"
            lines += [
                f" {block.symbol.upper():<2}   {block.atomic_number}.0   {place}",
                *shells,
                "",
            ]
    lines.append(" $END")
    if any(block.potential for block in document.blocks):
        lines.append(" $ECP")
        for block in document.blocks:
            if block.potential is None:
                lines.append(f" {block.symbol.upper()}-ECP NONE")
            else:
                lines += titled_lines(block.potential, block.symbol, losses)
        lines.append(" $END")
    return Written("\n".join(lines) + "\n", losses.lines())


def _shell_lines(shell: Shell, block: Block, losses: Losses) -> Iterator[str]:
    if max(shell.angular) > 6:
        losses.say("functions above i have no letter of their own and are left out", block.symbol)
        return
    if is_general(shell):
        losses.say("general contractions are written as separate shells", block.symbol)
    for angular, rows in segments(shell):
        yield f"   {'L' if len(angular) > 1 else letter_of(angular[0]).upper()}   {len(rows)}"
        yield from columns([[str(at), *row] for at, row in enumerate(rows, 1)], 5)


LAYOUT = Layout(
    name="datagroup",
    summary="a `$DATA` group of atoms; shells headed `S 3`, their rows numbered",
    picture=PICTURE,
    comment="!",
    recognise=recognise,
    read=read,
    write=write,
)
