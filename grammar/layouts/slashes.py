"""Reader for the layout of `/C.name.author.9s4p.3s2p.` headings, with a list and matrix each l."""

import re
from collections.abc import Iterator
from itertools import pairwise

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of, integer
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, Potential, Remark, letter_of
from overlapse.grammar.numbers import NUMBER
from overlapse.grammar.pieces.channels import channels_of, ladder, rows_of
from overlapse.grammar.pieces.gathering import composition, gathered
from overlapse.grammar.pieces.headings import heading_of, whole
from overlapse.grammar.pieces.slashed import Element, Sorter
from overlapse.grammar.pieces.tabled import TabledReader, take_out_comments
from overlapse.grammar.pieces.tables import Tables
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, title_of

PICTURE = """\
/C.Invented.Author.2s.1s.
(two lines of title)
     6.0   0
    2    1
..."""

_HEADING = re.compile(r"^[ \t]*/[ \t]*[A-Za-z]{1,3}\.[^.\n]*\.[^.\n]*\.[^\n]*", re.MULTILINE)
_UNSLASHED = re.compile(r"[A-Za-z]{1,2}\.[^.]+\.[^.]+\.(?:[0-9]+[a-z])+\.(?:[0-9]+[a-z])+\..*")
_COUNTS = re.compile(r"(?:[0-9]+[a-zA-Z])+")
_TAILS = ("M1", "M2", "COREREP", "PROJOP", "SPECTRAL")
# Symbols of functions that belong to no atom.
_PLACEHOLDERS = ("x", "xx", "bq", "gh")
# Words of potential rows end at commas and semicolons too; see `tables.ABUTTING` for the rest.
_WORD = r"[^\s,;](?:[^\s,;+\-]|[+\-](?![0-9]*\.)|(?<=[EeDd])[+\-])*"
_SEPARATORS = str.maketrans(",;", "  ")


def recognise(source: Source) -> Evidence | None:
    text = source.flat
    heading = None
    for _, found in zip(range(50), _HEADING.finditer(text), strict=False):
        heading = heading or found
        if charge := _charge_below(text[found.end() : found.end() + 20_000].split("\n")[1:]):
            return Evidence(88, f"`{found[0].strip()}` headings above `{charge}`")
    if heading is None:
        return None
    return Evidence(40, f"`{heading[0].strip()}`, but no charge and highest l below it")


def _charge_below(lines: list[str]) -> str | None:
    """The line of charge and highest l, if the first numbers below a heading are that."""
    for line in lines:
        words = line.split()
        if not words or words[0][0] in "*#":
            continue
        if words[0][0] == "/" or (words[0][0] in "aA" and words[-1].lstrip("aA").isdigit()):
            return None
        if NUMBER.fullmatch(words[0]):
            return line.strip() if len(words) == 2 and words[1].isdigit() else None
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader(TabledReader):
    """Walks the tree of one text."""

    heading_example = "`4 2`"

    def __init__(self, source: Source) -> None:
        build = Build(source, "slashes", "", _WORD)
        take_out_comments(build, "*#")
        build.comment = "*"  # a title may hold one, so that it counts only now
        super().__init__(build, Tables(build, "list", alone=True))
        self.variants: dict[tuple[str, str], dict[tuple[str, ...], int]] = {}
        self.sorter = Sorter(self.build, self.tables)
        self.placeholders: list[Token] = []
        for index, body in enumerate(build.bodies):
            if body and not ("+" <= body[0] <= "9" and body[0] != "/"):
                if _is_heading(body):
                    self.take_out_titles(index)
            elif body[-1:] == ";":
                build.bodies[index] = body.translate(_SEPARATORS).strip()

    def take_out_titles(self, heading: int) -> None:
        """Keep the two lines below a heading as remarks: they may look like anything."""
        lines, bodies = self.build.source.lines, self.build.bodies
        for index in range(heading + 1, min(heading + 3, len(bodies))):
            words = bodies[index].split()
            numeric = bool(words) and all(map(NUMBER.fullmatch, words))
            if numeric or _is_heading(bodies[index]) or words[:1] == ["Options"]:
                break
            if words:
                self.build.remarks.append(Remark(lines[index].strip(), index + 1))
                bodies[index] = ""

    def document(self) -> Document:
        tokens = list(self.build.tokens(self.classify, whole))
        for piece in self.build.parse(self.sorter.settled(tokens)).children:
            if isinstance(piece, Tree):
                self.element(piece)
        self.tables.close()
        self.say_passed_over()
        self.build.remarks.sort(key=lambda remark: remark.line)
        return self.build.document()

    # ---- which token a line is

    def classify(self, body: str, index: int) -> str:
        first = body.split()[0].upper()
        if _is_heading(body):
            return "HEADING"
        if first in ("OPTIONS", "ENDOPTIONS"):
            return first
        if first.rstrip(",") == "PP" and "," in body:
            return "PP"
        return "TAIL" if first in _TAILS else "TEXT"

    # ---- the tree

    def element(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        element = self.opened(heading)
        block = element.block
        self.begin(pieces)
        for piece in pieces:
            if not isinstance(piece, Tree):
                self.line(element, piece)
            elif piece.data in ("options", "potential"):
                getattr(self, str(piece.data))(element, piece)
            else:
                if piece.data in ("table", "interrupted"):
                    block = self.in_order(block, piece)
                if piece.data == "table":
                    piece = self.without_energies(element, block, piece)
                getattr(self, str(piece.data))(block, piece)
        # A table known to be lost or added has been said already.
        element.check_tables(self.build, heading, None if self.in_doubt else self.found)
        element.check_charge(self.build)
        element.settle_core()
        element.settle_functions(self.build)

    def opened(self, heading: Token) -> Element:
        index = index_of(heading)
        fields = [part.strip() for part in heading.lstrip("/ \t").split(".")]
        if heading[0] != "/":
            self.build.fault_line(
                "form.syntax",
                index,
                f"the heading of {fields[0]} lacks its slash",
                element=fields[0],
                expected="/",
                remedy=f"write `/{heading}`",
            )
        for primitives, contracted in pairwise(fields):
            if _COUNTS.fullmatch(primitives) and _COUNTS.fullmatch(contracted):
                # As titles and comments state it, so that it is checked alike.
                self.build.remarks.append(Remark(f"({primitives}) -> [{contracted}]", index + 1))
        symbol, name = fields[0], fields[1] if len(fields) > 1 else ""
        if symbol.lower() in _PLACEHOLDERS:
            self.placeholders.append(heading)
            block = BlockDraft(symbol, None, index, "", end=index)
            self.build.blocks.append(block)
            return Element(block, fields[2:])
        section = self.section(name, symbol, fields[2:])
        block = self.build.open_block(symbol, index, section=section, label=name or None)
        return Element(block, fields[2:])

    def section(self, name: str, symbol: str, fields: list[str]) -> str:
        """Elements that come again under one name with other fields belong to a further set."""
        variants = self.variants.setdefault((name.lower(), symbol.lower()), {})
        at = variants.setdefault(tuple(fields), len(variants))
        return f"{at} {name.lower()}"

    def line(self, element: Element, line: Token) -> None:
        if line.type == "CHARGE":
            element.read_charge(self.build, line)
        elif line.type == "TAIL":
            element.tail = line
        elif element.charge_line is None:
            self.build.fault_line(
                "form.syntax",
                index_of(line),
                f"{str(line)!r} is a third line of title, where charge and highest angular "
                "momentum belong",
                severity="warning",
                element=element.block.symbol,
                expected="two numbers such as `6.0   2`",
                remedy="make it a comment with `*`",
            )
        else:
            element.block.complete = False
            self.build.fault_line(
                "form.syntax",
                index_of(line),
                f"{str(line)!r} is no heading of a table, no row of numbers and no part of a "
                "potential",
                element=element.block.symbol,
                remedy="make it a comment with `*`, or mend it",
            )

    def options(self, element: Element, node: Node) -> None:
        opening, *lines = node.children
        assert isinstance(opening, Token)
        for line in lines:
            words = line.lower().split() if isinstance(line, Token) else [""]
            element.options.add(words[0])
            if words[0] == "cartesian":
                element.cartesian.update(words[1:])
        if "endoptions" not in element.options:
            self.build.fault_line(
                "form.syntax",
                index_of(opening),
                "these options are not closed by `EndOptions`",
                severity="warning",
                element=element.block.symbol,
                expected="EndOptions",
                remedy="put a line `EndOptions` below the last option",
            )

    def without_energies(self, element: Element, block: BlockDraft, node: Node) -> Node:
        """A table without the orbital energies that the options announce behind each."""
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        announced = bool(element.options & {"orbitalenergies", "fockoperator"})
        rows = [piece for piece in pieces if not isinstance(piece, Tree)]
        if announced and rows:
            rows = [self.tables.cut_after(rows[0], heading_of(heading).numbers)]
        for energies in () if announced else (p for p in pieces if isinstance(p, Tree)):
            self.unheaded(block, energies)
        return Tree("table", [heading, *rows])

    def table(self, block: BlockDraft, node: Node) -> None:
        heading, *rows = node.children
        assert isinstance(heading, Token)
        first = rows[0] if rows else None
        assert first is None or isinstance(first, Token)
        self.tables.add(block, self.l, heading, first)
        self.next_table()

    def potential(self, element: Element, node: Node) -> None:
        line, *channels = node.children
        assert isinstance(line, Token)
        element.tail = line
        block, index = element.block, index_of(line)
        words = line.translate(_SEPARATORS).split()
        electrons, highest = ([integer(word) for word in words[2:4]] + [None, None])[:2]
        if electrons is None or highest is None:
            block.complete = False
            self.build.fault_line(
                "form.syntax",
                index,
                f"{str(line)!r} should give the symbol, the electrons that the potential replaces "
                "and its highest angular momentum",
                element=block.symbol,
                expected=f"PP, {block.symbol}, 2, 1 ;",
                remedy="write all three, with commas between them",
            )
            return
        element.check_owner(self.build, index, words[1], electrons)
        nodes = [channel for channel in channels if isinstance(channel, Tree)]
        made = channels_of(self.tables, block, nodes, highest, index, 3)
        block.potential = Potential(electrons, made, index + 1)

    def say_passed_over(self) -> None:
        """Parts that are not modelled are said once for the text."""
        if tails := self.sorter.tails:
            first = min((tokens[0] for tokens in tails.values()), key=index_of)
            most = max(len(tokens) for tokens in tails.values())
            self.build.fault_line(
                "form.syntax",
                index_of(first),
                f"parts {', '.join(tails)} of {most} core potential{'s' * (most != 1)} are passed "
                "over: of these only the number of electrons is known, by the charge",
                severity="note",
                remedy="judge the potential by other means",
            )
        if self.placeholders:
            first, more = self.placeholders[0], len(self.placeholders) - 1
            self.build.fault_line(
                "form.syntax",
                index_of(first),
                f"{first.split('.')[0][1:].strip()} stands for functions without an atom: passed "
                "over" + (f", as are {more} more such blocks" if more else ""),
                severity="note",
                remedy="none is needed where this is meant",
            )


def _is_heading(body: str) -> bool:
    if body[:1] == "/":
        return _HEADING.fullmatch(body) is not None
    return body.count(".") > 4 and _UNSLASHED.fullmatch(body) is not None


def write(document: Document) -> Written:
    """One table for each l, a potential below its element."""
    losses = Losses()
    lines: list[str] = []
    for block in document.blocks:
        lines += _block_lines(document, block, losses)
    return Written("\n".join(lines) + "\n", losses.lines())


def _block_lines(document: Document, block: Block, losses: Losses) -> Iterator[str]:
    tables = gathered(block, losses)
    potential = block.potential
    charge = block.atomic_number - (potential.electrons if potential else 0)
    name = title_of(document, block)
    if "." in name:
        losses.say("points in the name of the set become underscores")
    fields = [block.symbol, name.replace(".", "_"), "unknown", *composition(tables, "")]
    fields += ["ECP", f"{charge}el"] if potential else []
    yield f"/{'.'.join(fields)}."
    yield "written from another layout"
    yield "{} ({}) -> [{}]".format(block.symbol, *composition(tables, ","))
    if block.functions == "cartesian":
        yield from ("Options", "Cartesian all", "EndOptions")
    elif block.functions:
        losses.say("the layout has no flag for spherical functions")
    yield f"{charge:8}.0 {max(len(tables) - 1, 0):3}"
    for l, (exponents, rows) in enumerate(tables or [([], [])]):
        yield f"* {letter_of(l)}-type functions"
        yield f"{len(exponents):5}{len(rows[0]) if rows else 0:5}"
        yield from columns([[exponent] for exponent in exponents], 8)
        yield from columns(rows, 2)
    if potential:
        yield from _potential_lines(block, potential, losses)
    yield ""


def _potential_lines(block: Block, potential: Potential, losses: Losses) -> Iterator[str]:
    channels = ladder(potential, block.symbol, losses)
    if channels is None:
        return
    yield f"PP, {block.symbol}, {potential.electrons}, {len(channels) - 1} ;"
    for channel in channels:
        rows = rows_of(channel)
        yield f" {len(rows)} ;"
        yield from (f"{', '.join(row)} ;" for row in rows)


LAYOUT = Layout(
    name="slashes",
    summary="elements headed `/C.name.author.9s4p.3s2p.`; for each l a list and a matrix",
    picture=PICTURE,
    comment="*",
    recognise=recognise,
    read=read,
    write=write,
)
