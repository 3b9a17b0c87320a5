"""Reader for the `[GTO]` section of a file of bracket sections, one basis for each atom."""

import re
from dataclasses import replace

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.convention import Count, count_normalised
from overlapse.grammar.drafts import BlockDraft, Node, index_of, integer, leading
from overlapse.grammar.layout import Evidence, Layout
from overlapse.grammar.model import Document, Fault, letter_of
from overlapse.grammar.pieces.atomlists import AtomList
from overlapse.grammar.pieces.brackets import (
    Repeat,
    Section,
    functions_of,
    kinds_of,
    repeats_in,
    sections,
)
from overlapse.grammar.pieces.bracketwriting import write
from overlapse.grammar.pieces.centres import gather
from overlapse.grammar.source import Source

PICTURE = """\
[GTO]
  1 0
 s   2 1.00
      4.0   0.6"""

_BRACKET = re.compile(r"\[([^\[\]\n]*)\]")
_LETTERS = re.compile(r"[A-Za-z]{1,2}|[Ll]=\d+")


def recognise(source: Source) -> Evidence | None:
    names = {section.name for section in sections(source)} if "[" in source.text else set()
    if "gto" not in names:
        return None
    if "atoms" in names:
        return Evidence(95, "an `[Atoms]` and a `[GTO]` section")
    return Evidence(85, "a `[GTO]` section")


def read(source: Source) -> Document:
    """Atoms that repeat another one's lines are passed over, unless there is something to say."""
    found = sections(source)
    repeats = repeats_in(source, found)
    reader = _Reader(source, found, repeats)
    document = reader.document()
    if repeats and (reader.differs or any(f.severity != "note" for f in document.faults)):
        document = _Reader(source, found, {}).document()
    return document


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source, found: list[Section], repeats: dict[int, Repeat]) -> None:
        self.kinds = kinds_of({name for name, _ in found})
        # Spherical or Cartesian, None if that differs from l to l.
        self.kind = next(iter(self.kinds.values())) if len({*self.kinds.values()}) == 1 else None
        # Orbitals and what else the file holds are somebody else's, and may be very long.
        windows = [lines for name, lines in found if name in ("atoms", "gto")]
        self.build = Build(source, "gto-section", windows=windows)
        for repeat in repeats.values():
            self.build.bodies[repeat.lines.start : repeat.lines.stop] = [""] * len(repeat.lines)
        self.repeats = repeats
        self.differs = False  # whether the same text stands for two elements
        self.inside = ""
        self.headings: dict[str, str] = {}  # tokens of lines, most of which come again and again
        self.atom_list = AtomList(self.build)
        self.described: dict[int, int] = {}  # atoms of [GTO] and their lines
        self.symbols: dict[int, str] = {}  # by the line of the heading in [GTO]

    def document(self) -> Document:
        tokens = self.tokens()
        self.build.note_letters(self.build.shell_letters(tokens))
        pieces = [piece for piece in self.build.parse(tokens).children if isinstance(piece, Tree)]
        for piece in pieces:
            if piece.data == "atoms":
                self.atoms(piece)
        for piece in pieces:
            if piece.data == "gto":
                self.gto(piece)
        return self.judged(gather(self.build.document()))

    # ---- which token a line is

    def tokens(self) -> list[Token]:
        """Those of the build; the lines of `[Atoms]` are one."""
        found: list[Token] = []
        for token in self.build.tokens(self.classify, self.numeric_heading, joined=True):
            if token.type == "CENTRES" and found[-1].type == "CENTRES":
                found[-1].end_line = token.end_line
            else:
                found.append(token)
        return found

    def classify(self, body: str, index: int) -> str:
        if body[0] == "[" and (match := _BRACKET.match(body)):
            self.inside = match[1].strip().lower()
            return "ATOMS" if self.inside == "atoms" else "GTO"
        if self.inside == "atoms":
            return "CENTRES"
        kind = self.headings.get(body)
        if kind is None:
            words = body.split(None, 2)
            is_shell = (
                len(words) > 1 and _LETTERS.fullmatch(words[0]) and integer(words[1]) is not None
            )
            kind = self.headings[body] = "SHELL" if is_shell else "TEXT"
        return kind

    def numeric_heading(self, body: str) -> str | None:
        if self.inside == "atoms":
            return "CENTRES"
        if "." in body:
            return None
        words = body.split()
        if words[0].isdigit() and (len(words) == 1 or words[1:] in (["0"], ["O"], ["o"])):
            return "ATOM"
        return None

    # ---- the atoms

    def atoms(self, node: Node) -> None:
        for lines in node.children[1:]:
            assert isinstance(lines, Token)
            for index in range(index_of(lines), lines.end_line or 0):
                if body := self.build.bodies[index]:
                    self.atom_list.add(body, index)

    # ---- the basis of each atom

    def gto(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        if not self.atom_list.elements:
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                "no `[Atoms]` section says which elements these atoms are",
                expected="[Atoms]",
                remedy="keep the whole file: the section `[GTO]` alone names no element",
            )
            return
        for piece in pieces:
            assert isinstance(piece, Tree)
            if piece.data == "atom":
                self.atom(piece)
            else:
                self.loose(piece)
        self.atom_list.check(self.described.keys(), index_of(heading))

    def atom(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        words = heading.split()
        index = index_of(heading)
        if words[1:] != ["0"]:
            self.build.fault_line(
                "form.number" if len(words) > 1 else "form.syntax",
                index,
                f"the heading of atom {words[0]} should end in the digit 0",
                severity="warning",
                measured=str(heading),
                expected=f"{words[0]} 0",
                remedy=f"write `{words[0]} 0`",
            )
        atom = integer(words[0]) or 0
        if index in self.repeats:
            self.repeat(atom, index)
            return
        block = self.block(atom, index)
        for piece in pieces:
            assert isinstance(piece, Tree)
            getattr(self, str(piece.data))(block, piece)

    def repeat(self, atom: int, index: int) -> None:
        """Note an atom with the text of an earlier one: all is said if their element is one."""
        symbol = self.atom_list.symbol_of(atom)
        before = self.symbols.get(self.repeats[index].first)
        self.differs |= before != symbol or atom in self.described
        self.described[atom] = index

    def block(self, atom: int, index: int) -> BlockDraft:
        symbol = self.atom_list.symbol_of(atom)
        if not symbol:
            return self.unknown(atom, index)
        if atom in self.described:
            self.build.fault_word(
                "form.repeat",
                index,
                0,
                f"atom {atom} was already described on line {self.described[atom] + 1}",
                element=symbol,
                measured=atom,
                remedy="keep one of the two, or mend the number",
            )
        self.described[atom] = index
        self.symbols[index] = symbol
        return self.build.open_block(symbol, index, section=str(index), functions=self.kind)

    def unknown(self, atom: int, index: int) -> BlockDraft:
        """A block of no known element, judged for its form alone."""
        symbol, at = self.atom_list.elements.get(atom, (None, index))
        self.build.fault_word(
            "form.element",
            at,
            0,
            f"the section `[Atoms]` has no atom {atom}"
            if symbol is None
            else f"atom {atom} has functions, but neither this name nor the number is an element's",
            measured=atom,
            remedy="give the atom its name and atomic number in `[Atoms]`, or mend the number",
        )
        block = BlockDraft("", None, index, "", end=index)
        self.build.blocks.append(block)
        return block

    def shells(self, block: BlockDraft, node: Node) -> None:
        token = leading(node)
        self.build.scaled_shells(block, token)

    def bare(self, block: BlockDraft, node: Node) -> None:
        heading = leading(node)
        words = heading.split()
        self.build.shell(
            block, words[0], index_of(heading), self.build.rows(None), announced=words[1]
        )

    def unheaded(self, block: BlockDraft, node: Node) -> None:
        first = leading(node)
        what = f"{str(first)!r} stands" if first.type == "TEXT" else "rows of numbers stand"
        self.misplaced(first, f"{what} where a shell heading belongs", block)

    def remark(self, block: BlockDraft, node: Node) -> None:
        line = leading(node)
        self.misplaced(line, f"{str(line)!r} is no shell heading and no row of numbers", block)

    def loose(self, node: Node) -> None:
        first = leading(node)
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            "no atom's number stands above this line",
            expected="1 0",
            remedy="write the number of the atom, as `[Atoms]` counts them, and 0",
        )

    def misplaced(self, line: Token, message: str, block: BlockDraft) -> None:
        block.complete = False
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            f"{message}: a letter, the number of rows and a scale factor",
            element=block.symbol or None,
            expected="s   3   1.00",
            remedy="write the heading of the shell, or take the line out",
        )

    # ---- what only the whole file tells

    def judged(self, document: Document) -> Document:
        """With the flags of the file and its convention for coefficients."""
        faults, sets = list(document.faults), document.sets
        if self.kind is None:
            sets = tuple(
                replace(
                    members,
                    blocks=tuple(
                        replace(block, functions=functions_of(block, self.kinds))
                        for block in members.blocks
                    ),
                )
                for members in sets
            )
        if any(block.functions is None for members in sets for block in members.blocks):
            spherical = ", ".join(letter_of(l) for l, k in self.kinds.items() if k == "spherical")
            faults.append(self.note(f"spherical functions for {spherical}, Cartesian for others"))
        count = count_normalised(shell for b in document.blocks for shell in b.shells)
        raw = count.raw > count.normalised
        if raw:
            faults.append(self.note(_raw_because(count)))
        faults.sort(key=lambda fault: fault.span)
        return replace(document, sets=sets, faults=tuple(faults), raw_primitives=raw)

    def note(self, message: str) -> Fault:
        source = self.build.source
        line = next(lines.start for name, lines in sections(source) if name == "gto")
        remedy = "nothing, if this is meant: it is said because other readers may differ"
        return Fault(
            "form.syntax", message, source.span_of_line(line), severity="note", remedy=remedy
        )


def _raw_because(count: Count) -> str:
    return (
        f"{count.raw} of {count.of} contractions are normalised if the coefficients already "
        f"contain the primitives' norms, {count.normalised} if they do not: read as containing them"
    )


LAYOUT = Layout(
    name="gto-section",
    summary="a `[GTO]` section of bracket sections; shells `s 3 1.00` below each atom's number",
    picture=PICTURE,
    comment="",
    recognise=recognise,
    read=read,
    write=write,
    raw_primitives=True,
)
