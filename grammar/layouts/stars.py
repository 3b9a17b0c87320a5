"""Reader for the layout in which a line of four stars closes each element."""

import re
from collections.abc import Iterator

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, FunctionType, Node, index_of, integer, leading
from overlapse.grammar.elements import number_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Channel, Document, Potential, Shell, letter_of
from overlapse.grammar.pieces.slips import say_remark, say_unheaded
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, is_general, segments, terms

PICTURE = """\
C     0
S   2   1.00
      4.0      0.6
****"""

_SHELL_THEN_ROW = re.compile(
    r"^[ \t]*(?:[A-Za-z]{1,2}|[Ll]=\d+)[ \t]+[1-9]\d*(?:[ \t]+\d*\.\d*)?[ \t]*(?:!.*)?\n"
    r"(?:[ \t]*(?:!.*)?\n)*[ \t]*[-+.\d]",
    re.MULTILINE,
)
_FENCE = re.compile(r"^[ \t]*\*{4}[ \t]*$", re.MULTILINE)
_ELEMENT = re.compile(r"^[ \t]*-?[A-Za-z]{1,3}[ \t]+0[ \t]*(?:!.*)?$", re.MULTILINE)
_POTENTIAL = re.compile(r"^[ \t]*[A-Za-z]{1,3}-ECP[ \t]+\d+[ \t]+\d+", re.MULTILINE | re.IGNORECASE)


def recognise(source: Source) -> Evidence | None:
    text = source.flat
    shell = _SHELL_THEN_ROW.search(text)
    element = _ELEMENT.search(text)
    if shell and element:
        stars = "`****` lines and " if _FENCE.search(text) else f"`{element[0].strip()}` and "
        heading = shell[0].strip().split("\n", 1)[0].split("!")[0].strip()
        return Evidence(75, f"{stars}`{heading}` headings")
    if element and (_POTENTIAL.search(text)):
        return Evidence(75, f"`{element[0].strip()}` and core-potential headings")
    if shell and _FENCE.search(text):
        return Evidence(60, "`****` lines and counted shell headings, but no element heading")
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "stars", "!")
        self.functions: FunctionType | None = None

    def document(self) -> Document:
        tokens = list(self.build.tokens(self.classify, joined=True))
        self.build.note_letters(self.build.shell_letters(tokens))
        tree = self.build.parse(tokens)
        for piece in tree.children:
            if isinstance(piece, Tree):
                if piece.data == "element":
                    self.element(piece)
                else:
                    self.stray(piece)
            elif piece.type == "FLAG":
                self.functions = _flag(piece)
        self.check_fences(tree)
        return self.build.document()

    # ---- which token a line is

    def classify(self, body: str, index: int) -> str:
        words = body.split()
        if len(body) >= 3 and set(body) == {"*"}:
            return "FENCE"
        if len(words) == 1:
            if words[0].lower() in ("spherical", "cartesian"):
                return "FLAG"
            return "ELEMENT" if self.is_bare_symbol(words[0], index) else "TEXT"
        if words[-1] in ("0", "O", "o") and all(_is_symbol_like(word) for word in words[:-1]):
            return "ELEMENT"
        if words[0].upper().endswith("-ECP"):
            return "POTENTIAL"
        if _is_shell_heading(words):
            return "SHELL"
        return "TEXT"

    def is_bare_symbol(self, word: str, index: int) -> bool:
        """A lone symbol opens an element where a shell heading is the next thing that follows."""
        if number_of(word) is None:
            return False
        following = next((body for body in self.build.bodies[index + 1 :] if body), "")
        return _is_shell_heading(following.split())

    # ---- the tree

    def element(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        blocks = self.headed(heading, pieces)
        for piece in pieces:
            if isinstance(piece, Token):
                if piece.type == "FLAG":
                    self.functions = _flag(piece)
                continue
            for block in blocks:
                getattr(self, str(piece.data))(block, piece)

    def headed(self, heading: Token, pieces: list[Token | Node]) -> list[BlockDraft]:
        """The blocks that a heading opens: one for each symbol on the line."""
        index = index_of(heading)
        words = heading.split()
        if words[-1] in ("O", "o"):
            self.build.fault_word(
                "form.number",
                index,
                len(words) - 1,
                f"{words[-1]!r} is the letter O where the heading has the digit 0",
                element=words[0],
                measured=words[-1],
                expected=0,
                remedy="write 0",
            )
        elif words[-1] != "0":
            self.build.fault_line(
                "form.syntax",
                index,
                f"the heading of {words[0]} lacks its 0",
                severity="warning",
                element=words[0],
                expected=f"{words[0]} 0",
                remedy=f"write `{words[0]}     0`",
            )
        symbols = words[:-1] if words[-1] in ("0", "O", "o") else words
        has_potential = any(isinstance(p, Tree) and p.data == "potential" for p in pieces)
        has_shells = any(isinstance(p, Tree) and p.data in ("shells", "bare") for p in pieces)
        blocks = []
        for ordinal, symbol in enumerate(symbols):
            bare = symbol.lstrip("-")
            if has_potential and not has_shells and (known := self.earlier(bare)) is not None:
                blocks.append(known)  # a potential joins the element's orbital block
            else:
                blocks.append(
                    self.build.open_block(bare, index, functions=self.functions, word=ordinal)
                )
        return blocks

    def earlier(self, symbol: str) -> BlockDraft | None:
        number = number_of(symbol)
        return next(
            (block for block in reversed(self.build.blocks) if number and block.number == number),
            None,
        )

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
        block.complete = False
        say_unheaded(
            self.build,
            first,
            block.symbol,
            "S   3   1.00",
            "a letter, the number of rows and a scale factor, such as `S   3   1.00`",
        )

    def remark(self, block: BlockDraft, node: Node) -> None:
        first = leading(node)
        block.complete = False
        say_remark(self.build, first, block.symbol, "S   3   1.00", "****", "!")

    def potential(self, block: BlockDraft, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        channels = [piece for piece in pieces if _is(piece, "channel")]
        for piece in pieces:
            if isinstance(piece, Tree) and piece.data == "untold":
                self.untold(block, piece)
        words = heading.split()
        highest = integer(words[1]) if len(words) > 1 else None
        electrons = integer(words[2]) if len(words) > 2 else None
        if highest is None or electrons is None:
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                f"{str(heading)!r} should give the highest angular momentum of the potential and "
                "the number of electrons it replaces",
                element=block.symbol,
                expected=f"{words[0]}   2   10",
                remedy="write both whole numbers",
            )
            block.complete = False
            return
        if len(channels) != highest + 1:
            self.build.fault_word(
                "form.count",
                index_of(heading),
                1,
                f"highest angular momentum {highest} ({letter_of(highest)}) makes {highest + 1} "
                f"channels, {len(channels)} follow",
                element=block.symbol,
                measured=len(channels),
                expected=highest + 1,
                remedy="a channel was lost or added, or the heading is wrong",
            )
        # The local part, of the highest l, comes first; then s, p, d ...
        made = [
            self.channel(block, channel, highest if at == 0 else at - 1, at == 0)
            for at, channel in enumerate(channels)
        ]
        block.potential = Potential(
            electrons, tuple(channel for channel in made if channel), index_of(heading) + 1
        )

    def untold(self, block: BlockDraft, node: Node) -> None:
        title = leading(node)
        self.build.fault_line(
            "form.count",
            index_of(title),
            f"no count and no rows follow {str(title)!r}",
            element=block.symbol,
            measured=0,
            remedy="restore the rows of this channel, or take its title out",
        )

    def channel(self, block: BlockDraft, node: Token | Node, l: int, local: bool) -> Channel | None:
        assert isinstance(node, Tree)
        title, token = node.children
        assert isinstance(title, Token) and isinstance(token, Token)
        run = self.build.rows(token)
        announced = integer(run.rows[0][0]) if len(run.rows[0]) == 1 else None
        if announced is None:
            self.build.fault_line(
                "form.count",
                run.lines[0],
                "the number of rows of this channel is missing",
                element=block.symbol,
                expected=len(run.rows),
                remedy="write the number of rows on a line of its own below the title",
            )
        else:
            run = run._replace(rows=run.rows[1:], lines=run.lines[1:])
            if announced != len(run.rows):
                self.build.fault_line(
                    "form.count",
                    index_of(token),
                    f"this channel announces {announced} rows, {len(run.rows)} follow",
                    element=block.symbol,
                    measured=len(run.rows),
                    expected=announced,
                    remedy="a row was lost or added, or the count is wrong",
                )
        return self.build.channel(block, l, local, index_of(title), run, title=str(title))

    def stray(self, node: Node) -> None:
        first = leading(node)
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            "this stands outside any element; a line with the element's symbol and 0 is missing "
            "above it",
            expected="an element heading such as `C     0`",
            remedy="write the heading of the element that this belongs to",
        )

    def check_fences(self, tree: Node) -> None:
        """A lost `****` between two elements, where the file closes its other elements."""
        elements = [piece for piece in tree.children if isinstance(piece, Tree)]
        elements = [piece for piece in elements if piece.data == "element"]
        orbital = [p for p in elements if not any(_is(c, "potential") for c in p.children)]
        open_ended = [p for p in orbital if not _is(p.children[-1], "FENCE")]
        if not open_ended or len(open_ended) > max(1, len(orbital) // 3):
            return
        for piece in open_ended:
            heading = leading(piece)
            last = piece is elements[-1]
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                f"the block of {heading.split()[0]} is not closed by `****`"
                + (" at the end of the file" if last else ""),
                severity="note" if last else "warning",
                element=heading.split()[0],
                expected="****",
                remedy="put a line `****` after the last row of the block",
            )


def _is(piece: Token | Node, name: str) -> bool:
    return (piece.data if isinstance(piece, Tree) else piece.type) == name


def _flag(token: Token) -> FunctionType:
    return "spherical" if token.lower() == "spherical" else "cartesian"


def _is_symbol_like(word: str) -> bool:
    bare = word.lstrip("-")
    return len(bare) <= 3 and bare.isalpha() and bare.isascii()


def _is_shell_heading(words: list[str]) -> bool:
    return (
        len(words) > 1
        and ((len(words[0]) <= 2 and words[0].isalpha()) or words[0].lower().startswith("l="))
        and words[1].isascii()
        and words[1].isdigit()
    )


def write(document: Document) -> Written:
    """Every shell by itself: general contractions become shells that repeat their exponents."""
    losses = Losses()
    lines: list[str] = []
    kinds = {block.functions for block in document.blocks}
    if len(kinds) == 1 and (kind := kinds.pop()):
        lines.append(kind)
    elif len(kinds) > 1:
        losses.say(
            "the file has one flag for spherical or Cartesian functions, the set has several"
        )
    if len(document.sets) > 1:
        losses.say("names that keep several sets of one file apart are not written")
    lines.append("****")
    for block in document.blocks:
        if block.shells:
            lines.append(f"{block.symbol:<2}    0")
            for shell in block.shells:
                lines += _shell_lines(shell, block.symbol, losses)
            lines.append("****")
    for block in document.blocks:
        if block.potential is not None:
            lines += _potential_lines(block, block.potential, losses)
    return Written("\n".join(lines) + "\n", losses.lines())


def _shell_lines(shell: Shell, element: str, losses: Losses) -> Iterator[str]:
    if is_general(shell):
        losses.say("general contractions are written as separate shells", element)
    for angular, rows in segments(shell):
        letters = "SP" if len(angular) > 1 else _letter(angular[0])
        yield f"{letters:<3} {len(rows):3}   1.00"
        yield from columns(rows, 6)


def _letter(l: int) -> str:
    # Above i the letters are ambiguous, the number is not.
    return letter_of(l).upper() if l <= 6 else f"L={l}"


def _potential_lines(block: Block, potential: Potential, losses: Losses) -> Iterator[str]:
    scalar = [channel for channel in potential.channels if channel.kind == "scalar"]
    if len(scalar) < len(potential.channels):
        losses.say("spin-orbit terms of core potentials are left out", block.symbol)
    scalar.sort(key=lambda channel: (not channel.local, channel.l))
    highest = max((channel.l for channel in scalar), default=0)
    yield f"{block.symbol.upper():<2}    0"
    yield f"{block.symbol.upper()}-ECP   {highest:3}   {potential.electrons:3}"
    for channel in scalar:
        local = letter_of(highest)
        yield (
            f"{local}-ul potential"
            if channel.local
            else f"{letter_of(channel.l)}-{local} potential"
        )
        rows = terms(channel)
        yield f"  {len(rows)}"
        yield from columns(rows, 0)


LAYOUT = Layout(
    name="stars",
    summary="shells headed `S 3 1.00` below `C 0`; a line of four stars closes each element",
    picture=PICTURE,
    comment="!",
    recognise=recognise,
    read=read,
    write=write,
)
