"""Reader for the layout of counted sets, each with one list of exponents for several l."""

import re
from collections.abc import Iterator

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, Run, index_of, integer, leading, shorten
from overlapse.grammar.elements import number_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, Fault, letter_of
from overlapse.grammar.pieces.pseudopotentials import GAP, IDLE, potentials_in
from overlapse.grammar.pieces.setheadings import Heading, heading_of, made_of, slip_in
from overlapse.grammar.pieces.setlines import SYMBOL, SetLines
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, say_shared_names, split_shared, title_of

PICTURE = """\
C invented
  1
  1 0 1 2 1 1
      4.0      0.6      0.3
      0.5      0.5      0.8"""

_SET = re.compile(
    r"^[ \t]*([A-Za-z]{1,3})_?\d*(?:[ \t][^\n]*)?\n" + IDLE
    + r"(?:[ \t]*\d+" + GAP + r")?[ \t]*(\d+(?:[ \t]+\d+){4,})" + GAP
    + r"[ \t]*[-+.\d][^\n.#]*\.",
    re.MULTILINE,
)  # fmt: skip
_ELECTRONS = re.compile(r"-q\d+$")


def recognise(source: Source) -> Evidence | None:
    for match in _SET.finditer(source.flat):
        if number_of(match[1]) and heading_of(match[2]) is not None:
            heading = match[0].strip().split("\n", 1)[0].split("#")[0].strip()
            return Evidence(75, f"`{heading}` above a set's heading `{match[2]}`")
    if found := potentials_in(source):
        return Evidence(80, f"{found[0]}, and no basis functions")
    return None


def read(source: Source) -> Document:
    document = _Reader(source).document()
    if not any(block.shells for block in document.blocks) and (found := potentials_in(source)):
        what, line = found
        fault = Fault(
            "form.syntax",
            f"a file of pseudopotentials, not a basis set ({what}): nothing here was judged",
            source.span_of_line(line),
            severity="warning",
            remedy="name the file of the basis set that belongs to these pseudopotentials",
        )
        return Document(source, "sets", faults=(fault,))
    return document


_EXPECTED = "a set's heading such as `1 0 1 3 2 1`"


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "sets", "#")
        self.overfull = False  # whether a set of the element at hand has too many rows
        self.owners: dict[tuple[str, str], str] = {}

    def document(self) -> Document:
        lines = SetLines(self.build.bodies)
        tokens = self.build.tokens(lines.classify, lines.numeric_heading, joined=True)
        for piece in self.build.parse(tokens).children:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
        return self.build.document()

    # ---- the tree

    def element(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        block = self.headed(heading)
        count = pieces.pop(0) if pieces and _is(pieces[0], "COUNT") else None
        assert count is None or isinstance(count, Token)
        spoilt = (
            pieces.pop(0) if not count and len(pieces) > 1 and _is(pieces[0], "remark") else None
        )
        # What trails behind the last numbers is somebody else's input and is left alone.
        while pieces and _is(pieces[-1], "remark", "END"):
            pieces.pop()
        found, self.overfull = 0, False
        for piece in pieces:
            if count and found >= int(count) and _is(piece, "remark", "damaged", "END"):
                break
            if isinstance(piece, Tree) and piece.data == "shells":
                found += self.shells(block, piece)
            elif isinstance(piece, Tree) and not _is_empty(piece):
                found += piece.data != "remark"
                getattr(self, str(piece.data))(block, piece)
        if isinstance(spoilt, Tree) and found:
            self.amiss(block, spoilt, "stands where the number of sets belongs", str(found))
        else:
            self.check_sets(block, heading, count, found)

    def headed(self, heading: Token) -> BlockDraft:
        words = heading.split()
        match = SYMBOL.fullmatch(words[0])
        symbol = match[1] if match else words[0]
        # Some files put the composition in parentheses before the names.
        names = [word for word in words[1:] if word[0] != "("] or words[1:]
        if not names and number_of(symbol):
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                f"no name of a basis set follows {words[0]}",
                severity="warning",
                element=symbol,
                expected=f"{words[0]} and a name",
                remedy="write the name of the basis set after the symbol",
            )
        label = names[0] if names else None
        section = self.section(symbol.lower(), (label or "").lower())
        return self.build.open_block(symbol, index_of(heading), section=section, label=label)

    def section(self, symbol: str, name: str) -> str:
        """Blocks of one name make a set; names that differ in the electrons kept (`-q4`) too.

        An element that has several such blocks is in the set with the first one only.
        """
        stem = _ELECTRONS.sub("", name)
        return stem if self.owners.setdefault((symbol, stem), name) == name else name

    def check_sets(
        self, block: BlockDraft, heading: Token, count: Token | None, found: int
    ) -> None:
        """Whether as many sets follow as the element announces."""
        symbol, announced = block.symbol, None if count is None else int(count)
        rule, at = "form.count", index_of(heading if count is None else count)
        severity = "error"
        if found == announced == 0:
            message, severity = f"no functions are given for {symbol}", "note"
            remedy = "leave the element out if it needs none"
        elif not found:
            message = f"no set of numbers follows the heading of {symbol}"
            remedy = "restore the sets of this element or take its heading out"
        elif announced is None:
            rule = "form.syntax"
            message = f"the number of sets is missing below the heading of {symbol}"
            remedy = f"put a line with the number of sets, {found}, below this one"
        elif found == announced or (self.overfull and found < announced):
            # Where a heading between two sets is lost, the surplus of rows says so.
            block.complete = block.complete and found == announced
            return
        else:
            message = f"{announced} sets are announced for {symbol}, {found} follow"
            remedy = "a set was lost or added, or the number is wrong: compare with the source"
        block.complete = block.complete and found > (announced or 0)
        self.build.fault_line(
            rule,
            at,
            message,
            severity=severity,
            element=symbol,
            measured=found,
            expected=found if announced is None else announced,
            remedy=remedy,
        )

    def shells(self, block: BlockDraft, node: Node) -> int:
        """Add a run of sets, and say how many."""
        token, build = node.children[0], self.build
        assert isinstance(token, Token)
        sets = build.shells_in(token)
        for index, first, last in sets:
            said = heading_of(build.bodies[index])
            sound = said is not None and said.length == last - first and not said.surplus
            start = build.take_rows(first, last, said.width) if said and sound else None
            if said is None or start is None:
                self.set(block, index, build.rows_between(first, last))
                continue
            for l, count, grid in said.parts:
                shape = (said.length, count)
                build.even_shell(block, (l,), index, first, last, start, shape, grid)
        return len(sets)

    def bare(self, block: BlockDraft, node: Node) -> None:
        heading = leading(node)
        self.set(block, index_of(heading), self.build.rows(None))

    def set(self, block: BlockDraft, index: int, run: Run) -> None:
        said = self.announced(block, index)
        names = [block.next_name(letter_of(part.l)) for part in said.parts] if said else ["set"]
        length = self.length(block, names[0], index, run, said) if said else None
        if said is None or length is None:
            block.complete = False
            block.end = max(block.end, index, *run.lines[-1:])
            self.build.check_words(block, names[0], run)
            return
        for (l, count, grid), name in zip(said.parts, names, strict=True):
            self.build.matrix(block, l, index, run, (length, count), grid, name=name)

    def announced(self, block: BlockDraft, index: int) -> Heading | None:
        """What a set's heading announces, or None, with faults, where it makes no sense."""
        heading = self.build.bodies[index]
        said = heading_of(heading)
        if said is not None and not said.surplus:
            return said
        words = heading.split()
        whole = self.build.whole_numbers(words, index, block.symbol)
        slip = slip_in(whole) if whole else None
        if slip is not None:
            self.build.fault_word(
                "form.count",
                index,
                slip.ordinal,
                slip.message,
                # Numbers behind the last one that counts do no harm to most readers.
                severity="warning" if said else "error",
                element=block.symbol,
                measured=words[slip.ordinal],
                expected=slip.expected,
                remedy="a set's heading is: a label, the lowest and the highest l, the number of "
                "exponents, then the number of contractions for each l",
            )
        return made_of(whole) if whole else None

    def length(
        self, block: BlockDraft, name: str, index: int, run: Run, said: Heading
    ) -> int | None:
        """The number of exponents, or None, with faults, where rows have not the right width."""
        widths = set(map(len, run.rows))
        if widths == {said.width} and len(run.rows) == said.length:
            return said.length
        total = sum(map(len, run.rows))
        if total == said.width * said.length and len(run.rows) > said.length:
            return said.length  # rows too long for a line, wrapped
        self.overfull = self.overfull or len(run.rows) > said.length
        self.build.check_count(block, name, str(said.length), 3, index, run)
        if widths == {said.width}:
            return len(run.rows)
        if len(widths) == 1 < len(run.rows):
            found = max(widths) - 1
            self.build.fault_word(
                "form.count",
                index,
                4,
                f"the heading announces {said.width - 1} contractions in all, the rows have "
                f"{found} coefficients",
                element=block.symbol,
                shell=name,
                measured=found,
                expected=said.width - 1,
                remedy="compare the contractions of each l with the columns of the rows",
            )
            return None
        plural = "s" * (said.width != 2)
        holds = f"the set has {said.width} (an exponent and {said.width - 1} coefficient{plural})"
        self.build.check_rows(block, name, run, said.width, holds)
        return None

    def damaged(self, block: BlockDraft, node: Node) -> None:
        self.amiss(block, node, "stands where the heading of a set belongs", _EXPECTED)

    def unheaded(self, block: BlockDraft, node: Node) -> None:
        self.amiss(block, node, "rows of numbers without the heading of a set above", _EXPECTED)

    def remark(self, block: BlockDraft, node: Node) -> None:
        self.amiss(block, node, "is no heading of a set and no row of numbers", _EXPECTED)

    def amiss(self, block: BlockDraft, node: Node, what: str, expected: str) -> None:
        block.complete = False
        first = leading(node)
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            f"{shorten(first, 60)!r} {what}" if first else what,
            element=block.symbol,
            expected=expected,
            remedy="write what belongs here, or make the line a comment with `#`",
        )

    def unnamed(self, node: Node) -> None:
        first = leading(node)
        self.nameless(index_of(first))

    def nameless(self, index: int) -> None:
        self.build.fault_line(
            "form.syntax",
            index,
            "the heading of an element is missing above this line",
            expected="the element's symbol and the name of the set, such as `C invented`",
            remedy="write the heading of the element that this belongs to",
        )

    def stray(self, node: Node) -> None:
        """Sets before any element; mere rows may belong to somebody else's input."""
        token = leading(node)
        if token.type == "SHELL":
            self.nameless(index_of(token))
        elif token.type == "SHELLS":
            for index, _, _ in self.build.shells_in(token):
                self.nameless(index)


def _is(piece: Token | Node, *names: str) -> bool:
    return (piece.data if isinstance(piece, Tree) else piece.type) in names


def _is_empty(piece: Node) -> bool:
    """Whether a set is said to have no exponents and no contractions."""
    words = str(piece.children[0]).split()[3:]
    return piece.data == "bare" and all(integer(word) == 0 for word in words)


def write(document: Document) -> Written:
    """One list of exponents for neighbouring shells that share it; general contraction stays."""
    losses = Losses()
    lines: list[str] = []
    say_shared_names(document, losses)
    for block in document.blocks:
        if block.functions:
            losses.say("the layout has no flag for spherical or Cartesian functions")
        if block.potential is not None:
            losses.say("core potentials stand in files of their own and are left out", block.symbol)
        if block.shells:
            title = title_of(document, block)
            name = "-".join(title.replace("#", " ").split()) or "unnamed"
            if name != title:
                losses.say(f"a name is one word here: {title!r} became {name!r}")
            tables = list(_tables(block))
            lines += [f"{block.symbol:<2} {name}", f"  {len(tables)}"]
            for lowest, counts, rows in tables:
                highest = lowest + len(counts) - 1
                heading = (1, lowest, highest, len(rows), *counts)
                lines += ["  " + " ".join(map(str, heading)), *columns(rows, 6)]
    return Written("\n".join(lines) + "\n", losses.lines())


def _tables(block: Block) -> Iterator[tuple[int, list[int], list[list[str]]]]:
    """The sets of a block: lowest l, contractions of each l, rows of all their numbers."""
    lowest, counts, rows = 0, [], []  # type: int, list[int], list[list[str]]
    for shell in block.shells:
        for l, exponents, table in split_shared(shell):
            if counts and l == lowest + len(counts) and exponents == [row[0] for row in rows]:
                rows = [row + more for row, more in zip(rows, table, strict=True)]
                counts.append(len(table[0]))
                continue
            if counts:
                yield lowest, counts, rows
            lowest, counts = l, [len(table[0])]
            rows = [[exponent, *row] for exponent, row in zip(exponents, table, strict=True)]
    if counts:
        yield lowest, counts, rows


LAYOUT = Layout(
    name="sets",
    summary="`C name`, the number of sets, then sets of several l that share their exponents",
    picture=PICTURE,
    comment="#",
    recognise=recognise,
    read=read,
    write=write,
)
