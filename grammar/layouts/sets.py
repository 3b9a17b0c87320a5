"""Reader for the layout of counted sets, each with one list of exponents for several l."""

import re
from collections.abc import Iterator
from functools import lru_cache
from typing import NamedTuple

from lark import Token, Tree

from overlapse.grammar.building import BlockDraft, Build, Node, Run, index_of, integer
from overlapse.grammar.elements import number_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import LETTERS, Block, Document, Fault, Grid, letter_of
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, say_shared_names, split_shared, title_of

PICTURE = """\
C invented
  1
  1 0 1 2 1 1
      4.0      0.6      0.3
      0.5      0.5      0.8"""

_GAP = r"[ \t]*(?:#[^\n]*)?\n(?:[ \t]*(?:#[^\n]*)?\n)*"  # the rest of a line, then idle lines
_SET = re.compile(
    r"^[ \t]*([A-Za-z]{1,3})_?\d*(?:[ \t]+[^\n#]*)?" + _GAP
    + r"(?:[ \t]*\d+" + _GAP + r")?[ \t]*(\d+(?:[ \t]+\d+){4,})" + _GAP
    + r"[ \t]*[-+.\d][^\n.#]*\.",
    re.MULTILINE,
)  # fmt: skip
# The same family keeps pseudopotentials in files of their own, in one of these forms.
_POTENTIALS = {
    "electrons by l and a local part below each element": re.compile(
        r"^[ \t]*[A-Z][A-Za-z]?[ \t]+[A-Za-z][^\n#]*" + _GAP + r"[ \t]*\d+(?:[ \t]+\d+)*" + _GAP
        + r"[ \t]*\d*\.\d+[ \t]+\d+(?:[ \t]+[-+]?\d*\.\d+)*" + _GAP + r"[ \t]*(?:\d|[A-Z])",
        re.MULTILINE,
    ),
    "core potentials below a name": re.compile(
        r"^[ \t]*(?!(?:ecp|end|so)[ \t]*$)[^\s\"#&]+" + _GAP
        + r"[ \t]*[A-Za-z]{1,3}[ \t]+nelec[ \t]+\d+",
        re.MULTILINE | re.IGNORECASE,
    ),
    "sections of a fitted potential": re.compile(
        r"^[ \t]*&\w*_POT[ \t]*\n[^\n]*\n(?:[ \t]*\d+[ \t]*\n)?[ \t]*\d*\.\d+[ \t]",
        re.MULTILINE | re.IGNORECASE,
    ),
}  # fmt: skip
_SECTION = re.compile(r"^[ \t]*(?:basis|ecp)\b", re.MULTILINE | re.IGNORECASE)
_WHOLE = re.compile(r"\d{1,15}(?:[ \t]+\d{1,15}){4,}")
_SYMBOL = re.compile(r"([A-Za-z]{1,3})_?\d*")
_LIKE_SYMBOL = re.compile(r"[A-Z][A-Za-z]?\d*")
_ELECTRONS = re.compile(r"-q\d+$")


def recognise(source: Source) -> Evidence | None:
    for match in _SET.finditer(source.flat):
        if number_of(match[1]) and _is_heading(match[2]):
            heading = match[0].strip().split("\n", 1)[0].split("#")[0].strip()
            return Evidence(75, f"`{heading}` above a set's heading `{match[2]}`")
    if found := _potentials(source):
        return Evidence(80, f"{found[0]}, and no basis functions")
    return None


def _potentials(source: Source) -> tuple[str, int] | None:
    """What marks a file of pseudopotentials alone, and the line (0-based) where it begins."""
    text = source.flat
    if not _SECTION.search(text):
        for what, pattern in _POTENTIALS.items():
            if match := pattern.search(text):
                return what, text.count("\n", 0, match.start())
    return None


def read(source: Source) -> Document:
    document = _Reader(source).document()
    if not any(block.shells for block in document.blocks) and (found := _potentials(source)):
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


class _Heading(NamedTuple):
    """A set's heading: each l with its contractions, the numbers of rows and of words in a row."""

    parts: list[tuple[int, int]]
    length: int
    width: int


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "sets", "#")
        self.width = 0  # of a row of the set whose heading was met last
        self.overfull = False  # whether a set of the element at hand has too many rows
        self.owners: dict[tuple[str, str], str] = {}

    def document(self) -> Document:
        tokens = self.build.tokens(self.classify, self.numeric_heading)
        for piece in self.build.parse(tokens).children:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
        return self.build.document()

    # ---- which token a line is

    def classify(self, body: str, index: int) -> str:
        words = body.split()
        if body.lower() == "end":
            return "END"
        if not any(map(str.isalnum, body)):
            return "RULED"
        if self.is_element(words, index):
            return "ELEMENT"
        # A heading whose first number is misspelt does not begin like a number.
        return "SET" if len(words) > 4 and _odd(words) < 2 else "TEXT"

    def is_element(self, words: list[str], index: int) -> bool:
        """Whether a line opens an element: its symbol says so, and what follows must fit."""
        below, after = self.following(index)
        counted = integer(below) is not None
        if counted and _is_heading(after):
            return True
        if not _is_symbol(words[0]):
            return _is_heading(below) and _LIKE_SYMBOL.fullmatch(words[0]) is not None
        if counted or _is_heading(below):
            return True
        named = len(words) > 1 and words[1][0].isalpha() and not words[1].islower()
        if below and _is_symbol(below.split()[0]):
            return named and integer(after) is not None  # nothing follows but the next element
        return _is_heading(after) or (named and below.lower() in ("", "end"))

    def following(self, index: int) -> tuple[str, str]:
        """The next two lines that are neither blank nor a comment, "" past the end."""
        bodies = self.build.bodies
        said = filter(None, map(bodies.__getitem__, range(index + 1, len(bodies))))
        return next(said, ""), next(said, "")

    def numeric_heading(self, body: str) -> str | None:
        """COUNT for a lone whole number, SET for the heading of a set, None for a row."""
        if "." in body:
            return None
        words = body.split()
        if len(words) == 1:
            ruled = not any(map(str.isdigit, body))
            return "COUNT" if integer(body) is not None else "RULED" if ruled else None
        if (heading := _heading_of(body)) is not None:
            self.width = heading.width
            return "SET"
        # A row may be written without any decimal point, and a heading may be misspelt.
        is_row = len(words) < 4 or len(words) == self.width or _odd(words) > 1
        return None if is_row else "SET"

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
            if isinstance(piece, Tree) and not _is_empty(piece):
                found += piece.data != "remark"
                getattr(self, str(piece.data))(block, piece)
        if isinstance(spoilt, Tree) and found:
            self.amiss(block, spoilt, "stands where the number of sets belongs", str(found))
        else:
            self.check_sets(block, heading, count, found)

    def headed(self, heading: Token) -> BlockDraft:
        words = heading.split()
        match = _SYMBOL.fullmatch(words[0])
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
            return  # where a heading between two sets is lost, the surplus of rows says so
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

    def set(self, block: BlockDraft, node: Node) -> None:
        heading, *rows = node.children
        token = rows[0] if rows else None
        assert isinstance(heading, Token) and not isinstance(token, Tree)
        run = self.build.rows(token)
        index = index_of(heading)
        said = self.announced(block, heading)
        names = [block.next_name(letter_of(l)) for l, _ in said.parts] if said else ["set"]
        length = self.length(block, names[0], index, run, said) if said else None
        if said is None or length is None:
            block.complete = False
            block.end = max(block.end, index, *run.lines[-1:])
            self.build.check_words(block, names[0], run)
            return
        offset = 1
        for (l, count), name in zip(said.parts, names, strict=True):
            grid = Grid(0, said.width, offset, said.width, 1)
            self.build.matrix(block, l, index, run, (length, count), grid, name=name)
            offset += count

    bare = set

    def announced(self, block: BlockDraft, heading: Token) -> _Heading | None:
        """What a set's heading announces, or None, with faults, where it makes no sense."""
        said = _heading_of(heading)
        if said is not None and len(heading.split()) == 5 + said.parts[-1][0] - said.parts[0][0]:
            return said
        index, whole = index_of(heading), []
        for at, word in enumerate(heading.split()):
            value: float | None = integer(word)
            if value is None:
                value = self.build.number(word, index, at, block.symbol, None)
            if value is None or value < 0 or value != int(value):
                return None
            whole.append(int(value))
        slip = _slip_in(whole)
        if slip is not None:
            ordinal, message, expected = slip
            self.build.fault_word(
                "form.count",
                index,
                ordinal,
                message,
                # Numbers behind the last one that counts do no harm to most readers.
                severity="warning" if _made_of(whole) else "error",
                element=block.symbol,
                measured=heading.split()[ordinal],
                expected=expected,
                remedy="a set's heading is: a label, the lowest and the highest l, the number of "
                "exponents, then the number of contractions for each l",
            )
        return _made_of(whole)

    def length(
        self, block: BlockDraft, name: str, index: int, run: Run, said: _Heading
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
        first = node.children[0]
        assert isinstance(first, Token)
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            f"{str(first)!r} {what}" if first else what,
            element=block.symbol,
            expected=expected,
            remedy="write what belongs here, or make the line a comment with `#`",
        )

    def unnamed(self, node: Node) -> None:
        first = node.children[0]
        assert isinstance(first, Token)
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            "the heading of an element is missing above this line",
            expected="the element's symbol and the name of the set, such as `C invented`",
            remedy="write the heading of the element that this belongs to",
        )

    def stray(self, node: Node) -> None:
        """A set before any element; mere rows may belong to somebody else's input."""
        if _is(node.children[0], "SET"):
            self.unnamed(node)


def _is(piece: Token | Node, *names: str) -> bool:
    return (piece.data if isinstance(piece, Tree) else piece.type) in names


def _is_empty(piece: Node) -> bool:
    """Whether a set is said to have no exponents and no contractions."""
    words = str(piece.children[0]).split()[3:]
    return piece.data == "bare" and all(integer(word) == 0 for word in words)


def _is_symbol(word: str) -> bool:
    match = _SYMBOL.fullmatch(word)
    return match is not None and number_of(match[1]) is not None


def _odd(words: list[str]) -> int:
    """How many of the words are no whole numbers."""
    return sum(integer(word) is None for word in words)


def _is_heading(body: str) -> bool:
    return _heading_of(body) is not None


@lru_cache(4096)  # the same few headings come again and again
def _heading_of(body: str) -> _Heading | None:
    return _made_of(list(map(int, body.split()))) if _WHOLE.fullmatch(body) else None


def _made_of(whole: list[int]) -> _Heading | None:
    """The heading of a set, if the numbers are enough and of sensible size."""
    if len(whole) < 5 or not whole[1] <= whole[2] < len(LETTERS) or not whole[3]:
        return None
    lowest, highest = whole[1:3]
    counts = whole[4 : 5 + highest - lowest]
    if len(counts) <= highest - lowest or not any(counts):
        return None
    parts = [(l, count) for l, count in enumerate(counts, lowest) if count]
    return _Heading(parts, whole[3], 1 + sum(counts))


def _slip_in(whole: list[int]) -> tuple[int, str, object] | None:
    """What is wrong with the heading of a set: the word's place, a message, what is expected."""
    if len(whole) < 4:
        return len(whole) - 1, f"{len(whole)} numbers make no heading of a set", "at least 5"
    lowest, highest, length = whole[1:4]
    wanted, found = highest - lowest + 1, len(whole) - 4
    if wanted < 1:
        return 1, f"the lowest l, {lowest}, lies above the highest, {highest}", None
    if highest >= len(LETTERS):
        return 2, f"l = {highest} is no angular momentum of a basis function", None
    if found != wanted:
        span = f"l = {lowest}" + f" to {highest}" * (wanted > 1)
        what = "number" + "s" * (wanted > 1)
        return 2, f"{span} wants {wanted} {what} of contractions, {found} follow", wanted
    if not length:
        return 3, "the heading announces no exponent", None
    return None if any(whole[4:]) else (4, "the heading announces no contraction", None)


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
