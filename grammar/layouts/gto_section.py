"""Reader for the `[GTO]` section of a file of bracket sections, one basis for each atom."""

import re
from collections.abc import Iterator
from dataclasses import replace

from lark import Token, Tree

from overlapse.grammar.building import BlockDraft, Build, FunctionType, Node, index_of, integer
from overlapse.grammar.convention import Count, count_normalised
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, Fault, Shell, letter_of
from overlapse.grammar.pieces.brackets import Repeat, Section, repeats_in, sections
from overlapse.grammar.pieces.centres import gather
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, is_general, segments

PICTURE = """\
[GTO]
  1 0
 s   2 1.00
      4.0   0.6"""

_BRACKET = re.compile(r"\[([^\[\]\n]*)\]")
_FLAG = re.compile(r"(\d+)([dfgh])")
_FLAGS = re.compile(r"(?:\d+[dfgh])+")
_ROUND = str.maketrans("[]", "()")
_NAME = re.compile(r"([A-Za-z]+)\d*")
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
        self.flags = {name for name, _ in found}
        # Orbitals and what else the file holds are somebody else's, and may be very long.
        windows = [lines for name, lines in found if name in ("atoms", "gto")]
        self.build = Build(source, "gto-section", windows=windows)
        for repeat in repeats.values():
            self.build.bodies[repeat.lines.start : repeat.lines.stop] = [""] * len(repeat.lines)
        self.repeats = repeats
        self.differs = False  # whether the same text stands for two elements
        self.inside = ""
        self.elements: dict[int, tuple[str, int]] = {}  # by the atom's number; symbol and line
        self.described: dict[int, int] = {}  # atoms of [GTO] and their lines
        self.symbols: dict[int, str] = {}  # by the line of the heading in [GTO]

    def document(self) -> Document:
        tokens = list(self.build.tokens(self.classify, self.numeric_heading, joined=True))
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

    def classify(self, body: str, index: int) -> str:
        if body[0] == "[" and (match := _BRACKET.match(body)):
            self.inside = match[1].strip().lower()
            return "ATOMS" if self.inside == "atoms" else "GTO"
        if self.inside == "atoms":
            return "CENTRE"
        words = body.split(None, 2)
        if len(words) > 1 and _LETTERS.fullmatch(words[0]) and integer(words[1]) is not None:
            return "SHELL"
        return "TEXT"

    def numeric_heading(self, body: str) -> str | None:
        if self.inside == "atoms":
            return "CENTRE"
        if "." in body:
            return None
        words = body.split()
        if words[0].isdigit() and (len(words) == 1 or words[1:] in (["0"], ["O"], ["o"])):
            return "ATOM"
        return None

    # ---- the atoms

    def atoms(self, node: Node) -> None:
        for line in node.children[1:]:
            assert isinstance(line, Token)
            self.centre(line.split(), index_of(line))

    def centre(self, words: list[str], index: int) -> None:
        atom = integer(words[1]) if len(words) > 2 else None
        charge = integer(words[2]) if len(words) > 2 else None
        if atom is None or charge is None:
            self.build.fault_line(
                "form.syntax",
                index,
                "an atom is given by its name, its number and its atomic number, "
                "before its position",
                expected="C   1   6   0.0   0.0   0.0",
                remedy="write the line in this order",
            )
        elif atom in self.elements:
            self.build.fault_word(
                "form.repeat",
                index,
                1,
                f"an atom {atom} was already given on line {self.elements[atom][1] + 1}",
                measured=atom,
                remedy="number the atoms 1, 2, 3 ...",
            )
        else:
            self.elements[atom] = (self.symbol(words[0], charge, index), index)

    def symbol(self, name: str, charge: int, index: int) -> str:
        """The element of an atom: by its atomic number, unless that and a plain name disagree.

        "" for an atom that is none: no fault as long as it has no functions.
        """
        match = _NAME.fullmatch(name)
        named = number_of(match[1]) if match else None
        by_number = symbol_of(charge) if 1 <= charge <= 118 else None
        # Names such as CA and HB are labels of a C and an H atom; ghosts have the charge 0.
        labelled = by_number is not None and name[: len(by_number)].lower() == by_number.lower()
        if named is None or labelled or named == charge:
            return by_number or ""
        if charge:
            self.build.fault_word(
                "form.element",
                index,
                2,
                f"{name} has the atomic number {named}, not {charge}: read as {symbol_of(named)}",
                severity="warning",
                element=symbol_of(named),
                measured=charge,
                expected=named,
                remedy="mend the name or the number",
            )
        return symbol_of(named)

    # ---- the basis of each atom

    def gto(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        if not self.elements:
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
        self.check_atoms(index_of(heading))

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
        symbol = self.elements.get(atom, ("", 0))[0]
        before = self.symbols.get(self.repeats[index].first)
        self.differs |= before != symbol or atom in self.described
        self.described[atom] = index

    def block(self, atom: int, index: int) -> BlockDraft:
        if not self.elements.get(atom, ("", 0))[0]:
            return self.unknown(atom, index)
        if atom in self.described:
            self.build.fault_word(
                "form.repeat",
                index,
                0,
                f"atom {atom} was already described on line {self.described[atom] + 1}",
                element=self.elements[atom][0],
                measured=atom,
                remedy="keep one of the two, or mend the number",
            )
        self.described[atom] = index
        self.symbols[index] = symbol = self.elements[atom][0]
        return self.build.open_block(symbol, index, section=str(index))

    def unknown(self, atom: int, index: int) -> BlockDraft:
        """A block of no known element, judged for its form alone."""
        symbol, at = self.elements.get(atom, (None, index))
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
        token = node.children[0]
        assert isinstance(token, Token)
        self.build.scaled_shells(block, token)

    def bare(self, block: BlockDraft, node: Node) -> None:
        heading = node.children[0]
        assert isinstance(heading, Token)
        words = heading.split()
        self.build.shell(
            block, words[0], index_of(heading), self.build.rows(None), announced=words[1]
        )

    def unheaded(self, block: BlockDraft, node: Node) -> None:
        first = node.children[0]
        assert isinstance(first, Token)
        what = f"{str(first)!r} stands" if first.type == "TEXT" else "rows of numbers stand"
        self.misplaced(first, f"{what} where a shell heading belongs", block)

    def remark(self, block: BlockDraft, node: Node) -> None:
        line = node.children[0]
        assert isinstance(line, Token)
        self.misplaced(line, f"{str(line)!r} is no shell heading and no row of numbers", block)

    def loose(self, node: Node) -> None:
        first = node.children[0]
        assert isinstance(first, Token)
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

    def check_atoms(self, heading: int) -> None:
        """Both sections list the same atoms."""
        known = {atom for atom, (symbol, _) in self.elements.items() if symbol}
        missing = sorted(known - self.described.keys())
        if not missing:
            return
        listed = ", ".join(f"{atom} ({self.elements[atom][0]})" for atom in missing[:5])
        more = f" and {len(missing) - 5} more" if len(missing) > 5 else ""
        self.build.fault_line(
            "form.count",
            heading,
            f"`[Atoms]` lists {len(known)} atoms; no functions are given here for {listed}{more}",
            severity="warning",
            measured=len(known) - len(missing),
            expected=len(known),
            remedy="an atom's basis was lost, unless it is meant to have none",
        )

    # ---- what only the whole file tells

    def judged(self, document: Document) -> Document:
        """With the flags of the file and its convention for coefficients."""
        faults = list(document.faults)
        kinds = _kinds(self.flags)
        sets = tuple(
            replace(
                members,
                blocks=tuple(replace(b, functions=_functions(b, kinds)) for b in members.blocks),
            )
            for members in document.sets
        )
        if any(block.functions is None for members in sets for block in members.blocks):
            spherical = ", ".join(letter_of(l) for l, kind in kinds.items() if kind == "spherical")
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


def _kinds(flags: set[str]) -> dict[int, FunctionType]:
    """Spherical or Cartesian for d, f, g and h, by flags such as `[5D]`, `[5D10F]`, `[9G]`."""
    kinds: dict[int, FunctionType] = dict.fromkeys(range(2, 6), "cartesian")
    given = {
        letter: int(n)
        for flag in flags
        if _FLAGS.fullmatch(flag)
        for n, letter in _FLAG.findall(flag)
    }
    if given.get("d") == 5 and "f" not in given:
        given["f"] = 7  # `[5D]` speaks for both
    if given.get("g") == 9 and "h" not in given:
        given["h"] = 11
    for l, letter in enumerate("dfgh", 2):
        if given.get(letter) == 2 * l + 1:
            kinds[l] = "spherical"
    return kinds


def _functions(block: Block, kinds: dict[int, FunctionType]) -> FunctionType | None:
    """What the flags make of a block; None if they treat its shells in two ways."""
    used = {kinds[min(l, 5)] for l in block.counts if l >= 2} or {kinds[2]}
    return used.pop() if len(used) == 1 else None


def write(document: Document) -> Written:
    """Each block as an atom; the atoms stand in a row, ten bohr apart."""
    losses = Losses()
    blocks = [block for block in document.blocks if block.shells]
    title = next((members.label for members in document.sets if members.label), "unnamed")
    title = " ".join(title.split()).translate(_ROUND)  # a bracket would open a section
    lines = ["[Title]", f" {title}", "[Atoms] AU"]
    losses.say("the layout lists the atoms of a molecule: their positions are made up")
    losses.say("the name of the set stands in the title only")
    if len(document.sets) > 1:
        losses.say("names that keep several sets of one file apart are not written")
    for atom, block in enumerate(blocks, 1):
        lines.append(
            f"{block.symbol:<2} {atom:4} {block.atomic_number:4}    0.0   0.0   {10.0 * atom}"
        )
    lines += [*_flag_lines(blocks, losses), "[GTO]"]
    for atom, block in enumerate(blocks, 1):
        lines.append(f"{atom:4} 0")
        for shell in block.shells:
            lines += _shell_lines(shell, block.symbol, losses)
        lines.append("")
    for block in document.blocks:
        if block.potential is not None:
            losses.say("core potentials are left out", block.symbol)
    _say_convention(document, losses)
    return Written("\n".join(lines) + "\n", losses.lines())


def _flag_lines(blocks: list[Block], losses: Losses) -> list[str]:
    kinds = {block.functions for block in blocks}
    if kinds - {"spherical", "cartesian"}:
        losses.say("spherical or Cartesian functions were not stated: the layout says Cartesian")
    if "spherical" not in kinds:
        return []
    if len(kinds) > 1:
        losses.say("flags for spherical functions hold for the whole file: all become spherical")
    return ["[5D]", "[9G]"]


def _shell_lines(shell: Shell, element: str, losses: Losses) -> Iterator[str]:
    if is_general(shell):
        losses.say("general contractions are written as separate shells", element)
    for angular, rows in segments(shell):
        letters = "".join(map(letter_of, angular))
        yield f" {letters:<2} {len(rows):4} 1.00"
        yield from columns(rows, 6)


def _say_convention(document: Document, losses: Losses) -> None:
    """Readers tell the convention of the coefficients by what is normalised."""
    count = count_normalised(shell for block in document.blocks for shell in block.shells)
    if (count.raw > count.normalised) != document.raw_primitives:
        meant = "raw" if document.raw_primitives else "normalised"
        losses.say(f"coefficients over {meant} primitives will be taken for the other kind")


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
