"""Reader for the layout of `SYMBOL:NAME` headings, lists of counts and one matrix for each l."""

import re
from collections.abc import Iterator
from itertools import pairwise

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, Run, index_of, integer, leading, shorten
from overlapse.grammar.elements import number_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Document, Remark
from overlapse.grammar.numbers import looks_numeric
from overlapse.grammar.pieces.cores import CHANNEL, core_lines, read_core
from overlapse.grammar.pieces.matrices import WHOLE, Cutting, Lists, cut_by_lines, sizes_of
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, say_shared_names, split_shared, title_of

PICTURE = """\
C:INVENTED
title

  1
    0"""

_HEAD = re.compile(r"[ \t]*(([A-Za-z]{1,3})_?\d*)[ \t]*:(\S.*)")
_OPENING = r"^[ \t]*([A-Za-z]{1,3})_?\d*[ \t]*:\S[^\n]*\n(?:[^\n]*\n){0,6}?"
_INTS = r"[ \t]*\d+(?:[ \t]+\d+)*[ \t]*\n(?:[ \t]*\n)*"
_LISTS = re.compile(rf"{_OPENING}[ \t]*\d+[ \t]*\n(?:[ \t]*\n)*{_INTS}{_INTS}{_INTS}", re.MULTILINE)
_CORE = re.compile(rf"{_OPENING}[ \t]*NCORE[ \t]*=", re.MULTILINE | re.IGNORECASE)


def recognise(source: Source) -> Evidence | None:
    for pattern, what in (_LISTS, "lists of whole numbers"), (_CORE, "core potentials"):
        for match in pattern.finditer(source.flat):
            if number_of(match[1]):
                heading = match[0].split("\n", 1)[0].strip()
                return Evidence(80, f"{what} below headings such as `{heading}`")
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "matrix", "!#")
        self.heads: dict[int, tuple[str, str, str]] = {}  # line: word, symbol, name
        self.known: dict[tuple[str, str], BlockDraft] = {}
        # How many numbers the lists still lack: None before the first, 0 when they are closed.
        self.left: int | None = 0
        self.in_potential = False
        self.take_out_stars()
        self.find_heads()

    def document(self) -> Document:
        for piece in self.build.parse(self.tokens()).children:
            if isinstance(piece, Tree) and piece.data == "element":
                self.element(piece)
        blocks = self.build.blocks
        if any(block.potential for block in blocks) and not any(block.shells for block in blocks):
            self.build.fault_line(
                "form.syntax",
                blocks[0].line,
                "core potentials alone: there are no basis functions here to judge",
                severity="note",
                remedy="judge them together with the basis set that they belong to",
            )
        return self.build.document()

    # ---- which token a line is

    def take_out_stars(self) -> None:
        """A `*` begins a comment at the start of a line only: names such as 6-31G* hold it too."""
        bodies = self.build.bodies
        self.build.leading = "*"
        if "*" not in self.build.source.text:
            return
        for index, body in enumerate(bodies):
            if body[:1] == "*" and not _is_overflow(body.split()):
                self.build.remarks.append(Remark(body.strip("* "), index + 1))
                bodies[index] = ""

    def find_heads(self) -> None:
        """Note the headings; titles become remarks, since they may look like anything."""
        bodies = self.build.bodies
        for index, body in enumerate(bodies):
            if ":" not in body:
                continue
            match = _HEAD.fullmatch(body)
            if match is None or not (number_of(match[2]) or self.announces(index)):
                continue
            self.heads[index] = (match[1], match[2], match[3])
            if self.has_title(index + 1):
                title = self.build.source.lines[index + 1].strip()
                self.build.remarks.append(Remark(title, index + 2))
                bodies[index + 1] = ""
        self.build.remarks.sort(key=lambda remark: remark.line)

    def announces(self, index: int) -> bool:
        """Whether lists, or a core, stand shortly below a line."""
        near = [body for body in self.build.bodies[index + 1 : index + 8] if body]
        return any(body.lower().startswith("ncore") for body in near) or any(
            integer(body) is not None and WHOLE.fullmatch(below) for body, below in pairwise(near)
        )

    def has_title(self, index: int) -> bool:
        """Whether the line below a heading is a title, and not yet the lists or something else."""
        body, below = [*self.build.bodies[index : index + 2], "", ""][:2]
        match = _HEAD.fullmatch(body)
        if not body or body.lower().startswith("ncore") or (match and number_of(match[2])):
            return False
        return not below or not WHOLE.fullmatch(body)

    def tokens(self) -> Iterator[Token]:
        """Those of the build; lines of lists that follow one another are one."""
        lists: Token | None = None
        for token in self.build.tokens(self.classify, self.numeric_heading):
            if lists is not None:
                if token.type == "INTS":
                    lists.end_line = token.end_line
                    continue
                yield lists
            lists = token if token.type == "INTS" else None
            if lists is None:
                yield token
        if lists is not None:
            yield lists

    def classify(self, body: str, index: int) -> str:
        if index in self.heads:
            self.left, self.in_potential = None, False
            return "HEAD"
        if body.lower().startswith("ncore"):
            self.left, self.in_potential = 0, True
            return "CORE"
        if self.in_potential and CHANNEL.fullmatch(body):
            return "CHANNEL"
        # A list whose first number is misspelt does not begin like a number.
        words = body.split()
        if self.left and any(integer(word) is not None for word in words):
            self.left = max(0, self.left - len(words))
            return "INTS"
        return "TEXT"

    def numeric_heading(self, body: str) -> str | None:
        """INTS for a line of the lists: as many whole numbers as they announce themselves."""
        if self.left == 0:
            return None
        if "." in body:
            self.left = 0
            return None
        words = body.split()
        if self.left is None:
            first = integer(words[0]) or 0
            # Without a number of matrices the first line is the list of angular momenta.
            alone = len(words) in (1, 1 + 3 * first)
            self.left = 1 + 3 * first if alone else 3 * len(words)
        self.left = max(0, self.left - len(words))
        return "INTS"

    # ---- the tree

    def element(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        trees = [piece for piece in pieces if isinstance(piece, Tree)]
        block = self.headed(heading, trees)
        has_potential = any(piece.data == "potential" for piece in trees)
        if not has_potential or any(piece.data == "lists" for piece in trees):
            self.orbitals(block, heading, trees)
        for piece in trees:
            if piece.data == "potential":
                read_core(self.build, block, piece)
            elif piece.data == "unheaded":
                self.amiss(block, piece, "the line with NCORE and LMAX is missing above this one")

    def headed(self, heading: Token, pieces: list[Node]) -> BlockDraft:
        word, symbol, name = self.heads[index_of(heading)]
        key = symbol.lower(), name.lower()
        known = self.known.get(key)
        if known and not known.potential and all(piece.data == "potential" for piece in pieces):
            return known  # a potential joins the element's orbital block
        block = self.build.open_block(
            symbol if number_of(symbol) else word,
            index_of(heading),
            section=name.lower(),
            label=name,
        )
        self.known[key] = block
        return block

    def amiss(self, block: BlockDraft, node: Node, message: str) -> None:
        block.complete = False
        first = leading(node)
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            message,
            element=block.symbol,
            remedy="restore what is missing, or make the line a comment with `!`",
        )

    def orbitals(self, block: BlockDraft, heading: Token, pieces: list[Node]) -> None:
        """The lists of an element and the matrices that they announce."""
        said = [
            self.build.rows(token)
            for piece in pieces
            if piece.data == "lists"
            for token in piece.children
            if isinstance(token, Token)
        ]
        lists = Lists(self.build, block, _joined(said))
        if not said:
            self.build.fault_line(
                "form.count",
                index_of(heading),
                f"no lists of l, contractions and primitives follow the heading of {block.symbol}",
                element=block.symbol,
                expected="the number of matrices, then three lists",
                remedy="restore the lists, or take the heading out",
            )
        entries = lists.entries() if said else None
        if entries and [piece.data for piece in pieces] == ["lists", "numbers"]:
            token = pieces[1].children[0]
            assert isinstance(token, Token)
            if cut_by_lines(
                self.build, block, entries, range(index_of(token), token.end_line or 0)
            ):
                return
        run = self.numbers(block, pieces, sum(sizes_of(entries or [])))
        if entries:
            Cutting(lists, entries, run).cut()
        else:
            block.complete = False
            self.build.check_words(block, "", run)

    def numbers(self, block: BlockDraft, pieces: list[Node], wanted: int) -> Run:
        """The rows of an element as one run, up to the number of numbers wanted (0: unknown)."""
        runs: list[Run] = []
        found = 0
        last = max((at for at, piece in enumerate(pieces) if piece.data == "numbers"), default=0)
        for at, piece in enumerate(pieces):
            if 0 < wanted <= found:
                break  # what follows belongs to somebody else's input
            token = leading(piece)
            if piece.data == "lists":
                continue
            if piece.data == "numbers":
                runs.append(self.build.rows(token))
                found += sum(map(len, runs[-1].rows))
            elif not wanted:
                break  # where nothing is known of the numbers, they end with the first other line
            elif piece.data == "remark" and at < last:
                message = f"{shorten(token, 60)!r} stands among the numbers of {block.symbol}"
                self.amiss(block, piece, message)
        return _joined(runs)


def _joined(runs: list[Run]) -> Run:
    if len(runs) == 1:
        return runs[0]
    return Run([row for run in runs for row in run.rows], [at for run in runs for at in run.lines])


def _is_overflow(words: list[str]) -> bool:
    """Whether stars are a field that overflowed in a row of numbers, and no comment."""
    return len(words) > 1 and len(words[0]) > 2 and all(map(looks_numeric, words))


def write(document: Document) -> Written:
    """One matrix for each shell; an s+p shell becomes two."""
    losses = Losses()
    say_shared_names(document, losses)
    lines: list[str] = []
    for block in document.blocks:
        if block.functions:
            losses.say("the layout has no flag for spherical or Cartesian functions")
        if block.shells:
            lines += _block_lines(document, block, losses)
    for block in document.blocks:
        if block.potential is not None:
            losses.say(
                "core potentials stand in a file of their own here: cut them off", block.symbol
            )
            lines += ["*", _heading(document, block), "*"]
            lines += [*core_lines(block.potential, block.symbol, losses), "*"]
    return Written("\n".join(lines) + "\n", losses.lines())


def _heading(document: Document, block: Block) -> str:
    name = re.sub(r"[!#]", "", title_of(document, block)).strip() or "unnamed"
    return f"{block.symbol.upper()}:{name}"


def _block_lines(document: Document, block: Block, losses: Losses) -> Iterator[str]:
    if any(len(shell.angular) > 1 for shell in block.shells):
        losses.say("shared s and p exponents are written as an s and a p matrix", block.symbol)
    tables = [table for shell in block.shells for table in split_shared(shell)]
    yield from (_heading(document, block), title_of(document, block), "", f"  {len(tables)}")
    lists = zip(*((l, len(rows[0]), len(rows)) for l, _, rows in tables), strict=True)
    yield from columns([str(number) for number in numbers] for numbers in lists)
    for _, exponents, rows in tables:
        yield ""
        yield from columns(exponents[at : at + 5] for at in range(0, len(exponents), 5))
        yield ""
        yield from columns(rows, 2)
    yield ""


LAYOUT = Layout(
    name="matrix",
    summary="`C:NAME`, lists of l, contractions and primitives, then exponents and matrix for each",
    picture=PICTURE,
    comment="!#*",
    recognise=recognise,
    read=read,
    write=write,
)
