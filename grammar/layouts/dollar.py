"""Reader for the layout of `$basis` sections whose elements are fenced by lone `*` lines."""

import re
from collections.abc import Iterator

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, Role, Run, index_of, leading
from overlapse.grammar.elements import number_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Document, Fault, Shell, letter_of
from overlapse.grammar.pieces.cores import CHANNEL, core_lines, read_core
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, is_general, segments, title_of

PICTURE = """\
$basis
*
c invented
*
   2  s"""

_SECTIONS: dict[str, Role] = {
    "$basis": "orbital",
    "$jbas": "fitting",
    "$cbas": "fitting",
    "$jkbas": "fitting",
    "$cabs": "fitting",
    "$ecp": "unstated",
}
_OPENING = re.compile(
    r"^[ \t]*(\$(?:basis|jbas|cbas|jkbas|cabs|ecp))[ \t]*(?:#.*)?$", re.MULTILINE | re.IGNORECASE
)
_STAR = re.compile(r"^[ \t]*\*[ \t]*$", re.MULTILINE)
# Sets whose contractions depend on the charge have the same fences and shells, but no section; Z
# and the parameters of the charge head each element, and a row has two coefficients.
_CHARGED = re.compile(
    r"^[ \t]*\*[ \t]*\n[ \t]*(\d{1,3}(?:[ \t]+[-+]?\d*\.\d+)+)[ \t]*\n"
    r"[ \t]*\d+[ \t]+[A-Za-z][ \t]*\n[ \t]*[-+.\d]\S*[ \t]+\S+[ \t]+[-+.\d]",
    re.MULTILINE,
)


def recognise(source: Source) -> Evidence | None:
    opening = _OPENING.search(source.flat)
    if opening is None:
        charged = _CHARGED.search(source.flat)
        return Evidence(85, f"`*` lines and headings such as `{charged[1]}`") if charged else None
    if _STAR.search(source.flat, opening.end()):
        return Evidence(90, f"a `{opening[1]}` section and `*` lines")
    return Evidence(60, f"a `{opening[1]}` line, but no `*` lines")


def read(source: Source) -> Document:
    charged = None if _OPENING.search(source.flat) else _CHARGED.search(source.flat)
    if charged is None:
        return _Reader(source).document()
    fault = Fault(
        "form.syntax",
        "elements headed by Z and numbers, rows with two coefficients: the contractions of this "
        "set depend on the charge of the atom, and it is no basis set of fixed functions",
        source.span_of_line(source.flat.count("\n", 0, charged.start(1))),
        expected="a section such as `$basis`, elements headed by symbol and name",
        remedy="take a basis set with fixed contractions; nothing here was judged",
    )
    return Document(source, "dollar", faults=(fault,))


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "dollar", "#")
        self.title = ""

    def document(self) -> Document:
        tokens = list(self.build.tokens(self.classify, self.numeric_heading, joined=True))
        self.build.note_letters(self.build.shell_letters(tokens, 1))
        # What stands outside the sections belongs to somebody else's input and is left alone.
        sections = [
            piece
            for piece in self.build.parse(tokens).children
            if isinstance(piece, Tree) and piece.data == "section"
        ]
        for section in sections:
            self.section(section)
        if sections:
            self.check_end(sections[-1])
        return self.build.document()

    def classify(self, body: str, index: int) -> str:
        low = body.lower()
        if low.split()[0] in _SECTIONS:
            return "SECTION"
        if body[0] == "$":
            return "END"  # `$end`, or another data group, which closes ours as well
        if body == "*":
            return "STAR"
        if low.startswith("ncore"):
            return "CORE"
        if CHANNEL.fullmatch(body):
            return "CHANNEL" if self.is_in_potential(index) else "TEXT"
        return "TEXT"

    def is_in_potential(self, index: int) -> bool:
        """A lone letter heads a channel if a core line stands above it within its `*` fence."""
        for body in reversed(self.build.bodies[:index]):
            if body.lower().startswith("ncore"):
                return True
            if body[:1] in ("*", "$"):
                return False
        return False

    @staticmethod
    def numeric_heading(body: str) -> str | None:
        words = body.split()
        if len(words) == 2 and words[0].isdigit() and words[1].isalpha() and len(words[1]) <= 2:
            return "SHELL"
        return None

    # ---- the tree

    def section(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        self.title = heading.split()[0].lower()
        for piece in pieces:
            if not isinstance(piece, Tree):
                continue
            if piece.data == "element":
                self.element(piece)
            else:
                self.loose(piece)

    def check_end(self, node: Node) -> None:
        """The last section must be closed; an earlier one may end where the next begins."""
        heading, last = node.children[0], node.children[-1]
        assert isinstance(heading, Token)
        if len(node.children) > 1 and not (isinstance(last, Token) and last.type == "END"):
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                f"this `{self.title}` section is not closed by `$end`",
                severity="warning",
                expected="$end",
                remedy="put a line `$end` after the last `*`",
            )

    def element(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        words = heading.split(None, 1)
        label = words[1].strip() if len(words) > 1 else None
        block = self.owner(words[0]) or self.build.open_block(
            words[0],
            index_of(heading),
            section=f"{self.title} {(label or '').lower()}",
            label=label,
            role=_SECTIONS[self.title],
        )
        if not any(isinstance(piece, Token) for piece in pieces):
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                f"no `*` line follows the heading of {words[0]}",
                severity="warning",
                element=words[0],
                expected="*",
                remedy="put a line `*` between the heading and the first shell",
            )
        for piece in pieces:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(block, piece)

    def owner(self, symbol: str) -> BlockDraft | None:
        """In `$ecp` the potential joins the element's orbital block, where there is one."""
        number = number_of(symbol)
        if self.title != "$ecp" or number is None:
            return None
        return next((block for block in self.build.blocks if block.number == number), None)

    def shells(self, block: BlockDraft, node: Node) -> None:
        token = leading(node)
        build = self.build
        for heading, first, last in build.shells_in(token):
            count, letters = build.bodies[heading].split()
            if not build.sound_shell(block, letters, heading, first, last, count):
                self.shell(block, heading, build.rows_between(first, last))

    def bare(self, block: BlockDraft, node: Node) -> None:
        heading = leading(node)
        self.shell(block, index_of(heading), self.build.rows(None))

    def shell(self, block: BlockDraft, heading: int, run: Run) -> None:
        count, letters = self.build.bodies[heading].split()
        self.build.shell(
            block, letters, heading, run, announced=count, announced_word=0, letters_word=1
        )

    def unheaded(self, block: BlockDraft, node: Node) -> None:
        block.complete = False
        self.loose(node, block.symbol)

    def loose(self, node: Node, element: str | None = None) -> None:
        first = leading(node)
        wanted = (
            "a shell heading such as `3  s`" if element else "an element's heading between two `*`"
        )
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            f"{wanted} is missing above this line",
            element=element,
            expected=wanted,
            remedy="write the heading that this line belongs to",
        )

    def potential(self, block: BlockDraft, node: Node) -> None:
        read_core(self.build, block, node)


def write(document: Document) -> Written:
    """A section for each role; every shell by itself, s+p shells as an s and a p shell."""
    losses = Losses()
    lines: list[str] = []
    if any(block.functions for block in document.blocks):
        losses.say("the layout has no flag for spherical or Cartesian functions")
    for members in document.sets:
        blocks = [block for block in members.blocks if block.shells]
        if not blocks:
            continue
        lines += ["$jbas" if members.role == "fitting" else "$basis", "*"]
        for block in blocks:
            lines += [f"{block.symbol.lower()} {title_of(document, block)}", "*"]
            for shell in block.shells:
                lines += _shell_lines(shell, block.symbol, losses)
            lines.append("*")
        lines.append("$end")
    owners = [block for block in document.blocks if block.potential is not None]
    if owners:
        lines += ["$ecp", "*"]
        for block in owners:
            lines += [f"{block.symbol.lower()} {title_of(document, block)}", "*"]
            assert block.potential is not None
            lines += [*core_lines(block.potential, block.symbol, losses), "*"]
        lines.append("$end")
    return Written("\n".join(lines) + "\n", losses.lines())


def _shell_lines(shell: Shell, element: str, losses: Losses) -> Iterator[str]:
    if is_general(shell):
        losses.say("general contractions are written as separate shells", element)
    if len(shell.angular) > 1:
        losses.say("shared s and p exponents are written as an s and a p shell", element)
    for angular, rows in segments(shell):
        for place, l in enumerate(angular):
            yield f"{len(rows):4}  {letter_of(l)}"
            yield from columns([[row[0], row[1 + place]] for row in rows], 4)


LAYOUT = Layout(
    name="dollar",
    summary="`$basis` sections; a lone `*` before and after each element's heading; `3 s` shells",
    picture=PICTURE,
    comment="#",
    recognise=recognise,
    read=read,
    write=write,
)
