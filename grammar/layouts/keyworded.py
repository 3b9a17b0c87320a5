"""Reader for the layout that stands between `basis` and `end`, each shell headed by its symbol."""

import re
from collections.abc import Iterator
from typing import Literal

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import (
    BlockDraft,
    FunctionType,
    Node,
    Role,
    Run,
    index_of,
    integer,
    leading,
)
from overlapse.grammar.elements import number_of
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import Block, Channel, Document, Potential, Shell, letter_of
from overlapse.grammar.pieces.slips import say_remark, say_unheaded
from overlapse.grammar.source import Source
from overlapse.grammar.writing import Losses, columns, split_shared, terms

PICTURE = """\
basis "C_invented" SPHERICAL
C    S
      4.0      0.6
end"""

_SHELL_THEN_ROW = re.compile(
    r"^[ \t]*[A-Za-z]{1,3}[ \t]+(?:[SPDFGHIKLspdfghikl]|[Ss][Pp])[ \t]*(?:#.*)?\n"
    r"(?:[ \t]*(?:#.*)?\n)*[ \t]*[-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:[EeDd][-+]?\d+)?[ \t]+[-+.\d]",
    re.MULTILINE,
)
_BASIS = re.compile(
    r'^[ \t]*basis(?:[ \t]+"[^"\n]*")?(?:[ \t]+(?:spherical|cartesian|print|noprint|rel))*[ \t]*'
    r"(?:#.*)?$",
    re.MULTILINE | re.IGNORECASE,
)
_NELEC = re.compile(r"^[ \t]*[A-Za-z]{1,3}[ \t]+nelec[ \t]+\d+", re.MULTILINE | re.IGNORECASE)
_WORDS = re.compile(r'"[^"]*"|\S+')


def recognise(source: Source) -> Evidence | None:
    text = source.flat
    shell = _SHELL_THEN_ROW.search(text)
    basis = _BASIS.search(text)
    electrons = _NELEC.search(text)
    if shell and basis:
        heading = shell[0].strip().split("\n", 1)[0].strip()
        return Evidence(70, f"`{basis[0].strip()}` and `{heading}` headings")
    if electrons:
        return Evidence(70, f"`{electrons[0].strip()}` headings of core potentials")
    if shell:
        heading = shell[0].strip().split("\n", 1)[0].strip()
        return Evidence(55, f"`{heading}` headings above rows of numbers")
    if basis and '"' in basis[0]:
        return Evidence(50, f"`{basis[0].strip()}`")
    return None


def read(source: Source) -> Document:
    return _Reader(source).document()


class _PotentialDraft:
    """A potential whose channels are still coming in."""

    def __init__(self, block: BlockDraft, index: int) -> None:
        self.block = block
        self.index = index
        self.electrons: int | None = None
        self.channels: list[Channel] = []

    def close(self, build: Build) -> None:
        if self.electrons is None:
            build.fault_line(
                "form.syntax",
                self.index,
                f"the potential of {self.block.symbol} does not say how many electrons it replaces",
                element=self.block.symbol,
                expected=f"{self.block.symbol} nelec 10",
                remedy="write the `nelec` line",
            )
            self.block.complete = False
            return
        highest = max((c.l for c in self.channels), default=-1)
        # The local part stands for the angular momentum above the highest projector.
        settled = tuple(
            Channel(
                highest + 1 if channel.local else channel.l,
                channel.local,
                channel.powers,
                channel.exponents,
                channel.coefficients,
                channel.line,
                channel.title,
                channel.kind,
            )
            for channel in self.channels
        )
        self.block.potential = Potential(self.electrons, settled, self.index + 1)


_Potentials = dict[str, _PotentialDraft]


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "keyworded", "#")
        self.open: BlockDraft | None = None  # the block that the next shell may belong to
        self.label: str | None = None
        self.section = ""
        self.functions: FunctionType | None = None
        self.role: Role = "unstated"

    def document(self) -> Document:
        tokens = list(self.build.tokens(self.classify, joined=True))
        self.build.note_letters(self.build.shell_letters(tokens, 1))
        for piece in self.build.parse(tokens).children:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
            elif piece.type == "REFER":
                self.refer(piece)
        return self.build.document()

    def classify(self, body: str, index: int) -> str:
        words = body.split()
        first = words[0].lower()
        if first == "basis":
            return "BASIS"
        if first in ("ecp", "so") and (len(words) == 1 or words[1].startswith('"')):
            return "ECP"
        if first == "end":
            return "END"
        if first == "associated_ecp":
            return "REFER"
        if len(words) == 3 and words[1].lower() == "nelec":
            return "NELEC"
        if len(words) > 2 and words[1].lower() == "library":
            return "REFER"
        if len(words) == 2 and _is_symbol_like(words[0]):
            if words[1].lower() == "ul":
                return "LOCAL"
            if _is_letters(words[1]):
                return "SHELL"
        return "TEXT"

    # ---- basis sections

    def basis(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        name, flags = _opening(heading)
        self.label = _label(name)
        self.section = f"basis {self.label or ''}"
        self.role = _role(name)
        self.functions = _functions(flags)
        self.open = None
        for piece in pieces:
            if isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
            elif piece.type == "REFER":
                self.refer(piece)
        if not (isinstance(node.children[-1], Token) and node.children[-1].type == "END"):
            self.unclosed(heading, pieces)
        self.label, self.section, self.functions, self.role = None, "", None, "unstated"
        self.open = None

    def unclosed(self, heading: Token, pieces: list[Token | Node]) -> None:
        if pieces:
            self.build.fault_line(
                "form.syntax",
                index_of(heading),
                "this section is not closed by `end`",
                severity="warning",
                expected="end",
                remedy="put a line `end` after the last row of the section",
            )

    def block(self, symbol: str, index: int) -> BlockDraft:
        """The block a shell heading belongs to: the open one, or a new one at a new symbol."""
        if self.open is None or self.open.symbol.lower() != symbol.lower():
            self.open = self.build.open_block(
                symbol,
                index,
                section=self.section,
                label=self.label,
                functions=self.functions,
                role=self.role,
            )
        return self.open

    def shells(self, node: Node) -> None:
        token = leading(node)
        build = self.build
        for heading, first, last in build.shells_in(token):
            symbol, letters = build.bodies[heading].split()
            block = self.block(symbol, heading)
            if not build.sound_shell(block, letters, heading, first, last, None, general=True):
                run = build.rows_between(first, last)
                build.shell(block, letters, heading, run, letters_word=1, general=True)

    def bare(self, node: Node) -> None:
        heading = leading(node)
        self.build.shell(
            self.block(heading.split()[0], index_of(heading)),
            heading.split()[1],
            index_of(heading),
            self.build.rows(None),
            letters_word=1,
        )

    def unheaded(self, node: Node) -> None:
        first = leading(node)
        self.spoil()
        say_unheaded(
            self.build,
            first,
            self.open.symbol if self.open else None,
            "C    S",
            "an element and a letter",
        )

    def remark(self, node: Node) -> None:
        first = leading(node)
        self.spoil()
        say_remark(self.build, first, self.open.symbol if self.open else None, "C    S", "end", "#")

    def misplaced(self, node: Node) -> None:
        line = leading(node)
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            f"{str(line)!r} belongs to a core potential, but this is a `basis` section",
            element=line.split()[0],
            expected="ecp",
            remedy="close the section with `end` and open one with `ecp`",
        )

    def spoil(self) -> None:
        if self.open is not None:
            self.open.complete = False

    def refer(self, line: Token) -> None:
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            f"{str(line)!r} refers to data outside this file, which is not judged",
            severity="note",
            remedy="audit the file that holds the data as well",
        )

    # ---- core potentials

    def ecp(self, node: Node) -> None:
        heading, *pieces = node.children
        assert isinstance(heading, Token)
        self.open = None
        potentials: _Potentials = {}
        for piece in pieces:
            if isinstance(piece, Tree) and piece.data == "electrons":
                self.electrons(piece, potentials)
            elif isinstance(piece, Tree) and piece.data in ("local", "channels", "empty"):
                self.channels(piece, potentials)
            elif isinstance(piece, Tree):
                getattr(self, str(piece.data))(piece)
            elif piece.type == "REFER":
                self.refer(piece)
        if not (isinstance(node.children[-1], Token) and node.children[-1].type == "END"):
            self.unclosed(heading, pieces)
        for draft in potentials.values():
            draft.close(self.build)

    def draft(self, symbol: str, index: int, potentials: _Potentials) -> _PotentialDraft:
        """The potential of an element in the open section."""
        key = symbol.lower()
        if key not in potentials:
            potentials[key] = _PotentialDraft(self.owner(symbol, index), index)
        return potentials[key]

    def electrons(self, node: Node, potentials: _Potentials) -> None:
        line = leading(node)
        symbol, _, count = line.split()
        draft = self.draft(symbol, index_of(line), potentials)
        draft.electrons = integer(count)
        if draft.electrons is None:
            self.build.fault_word(
                "form.number",
                index_of(line),
                2,
                f"{count!r} is not a number of electrons",
                element=symbol,
                measured=count,
                remedy="write the number of electrons that the potential replaces",
            )
            draft.electrons = 0

    def channels(self, node: Node, potentials: _Potentials) -> None:
        """Headings with their terms: `Hg ul` for the local part, `Hg S` for a projected one."""
        line = leading(node)
        if node.data == "channels":
            for heading, first, last in self.build.shells_in(line):
                self.channel(heading, self.build.rows_between(first, last), potentials)
            return
        rows = node.children[1] if len(node.children) > 1 else None
        assert rows is None or isinstance(rows, Token)
        self.channel(index_of(line), self.build.rows(rows), potentials)

    def channel(self, heading: int, run: Run, potentials: _Potentials) -> None:
        title = self.build.bodies[heading]
        symbol, letters = title.split()
        draft = self.draft(symbol, heading, potentials)
        local = letters.lower() == "ul"
        if local:
            l = -1  # settled when the other channels are known
        elif (angular := self.build.angular_of(letters, heading, 1)) is not None:
            l = angular[0]
        else:
            return
        made = [self.build.channel(draft.block, l, local, heading, run, title=title)]
        if any(len(row) == 4 for row in run.rows):
            made.append(
                self.build.channel(
                    draft.block,
                    l,
                    local,
                    heading,
                    run,
                    order="power exponent - coefficient",
                    title=title,
                    spin_orbit=True,
                )
            )
        draft.channels += [channel for channel in made if channel is not None]

    def owner(self, symbol: str, index: int) -> BlockDraft:
        """The element's orbital block earlier in the file, or a new block."""
        number = number_of(symbol)
        for block in reversed(self.build.blocks):
            if number is not None and block.number == number:
                return block
        return self.build.open_block(symbol, index, section="ecp")

    def potential_line(self, node: Node) -> None:
        line = leading(node)
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            f"{str(line)!r} belongs to a core potential, but no `ecp` section is open",
            element=line.split()[0],
            expected="ecp",
            remedy="put a line `ecp` above it",
        )


def _opening(line: str) -> tuple[str | None, list[str]]:
    """Name and flags of a `basis` line."""
    words = _WORDS.findall(line)[1:]
    name = next((word.strip('"') for word in words if word.startswith('"')), None)
    flags = [word.lower() for word in words if not word.startswith('"')]
    known = ("spherical", "cartesian", "print", "noprint", "rel", "file", "segment", "nosegment")
    if name is None and flags and flags[0] not in known:
        name = words[0]
    return name, flags


def _functions(flags: list[str]) -> Literal["spherical", "cartesian"] | None:
    if "spherical" in flags:
        return "spherical"
    return "cartesian" if "cartesian" in flags else None


_SECTION_NAMES = {
    "ao basis": "orbital",
    "cd basis": "fitting",
    "xc basis": "fitting",
    "ri-mp2 basis": "fitting",
}


def _role(name: str | None) -> Role:
    role = _SECTION_NAMES.get((name or "").lower(), "unstated")
    return role  # type: ignore[return-value]


def _label(name: str | None) -> str | None:
    """The set's name in a section name: "C_6-31G*" is "6-31G*", "ao basis" is none."""
    if not name or name.lower() in _SECTION_NAMES:
        return None
    symbol, bar, rest = name.partition("_")
    return rest if bar and number_of(symbol) is not None else name


def _is_symbol_like(word: str) -> bool:
    return word.isascii() and word.isalpha() and len(word) <= 3


def _is_letters(word: str) -> bool:
    return word.isascii() and word.isalpha() and len(word) <= 2


def write(document: Document) -> Written:
    """One section for each set and function type; columns of a shell stay together."""
    losses = Losses()
    lines: list[str] = []
    for members in document.sets:
        kinds: dict[str, list[Block]] = {}
        for block in members.blocks:
            if block.shells:
                kinds.setdefault((block.functions or "").upper(), []).append(block)
        for kind, blocks in kinds.items():
            name = members.label or "ao basis"
            lines.append(f'basis "{name}" {kind}'.rstrip())
            for block in blocks:
                for shell in block.shells:
                    lines += _shell_lines(block.symbol, shell)
            lines.append("end")
    owners = [block for block in document.blocks if block.potential is not None]
    if owners:
        lines.append("ecp")
        for block in owners:
            lines += _potential_lines(block, losses)
        lines.append("end")
    return Written("\n".join(lines) + "\n", losses.lines())


def _shell_lines(symbol: str, shell: Shell) -> Iterator[str]:
    if len(shell.angular) > 1 and shell.columns_per_l == 1:
        tables = [("SP", *shell.spellings())]
    else:
        tables = [(letter_of(l).upper(), e, c) for l, e, c in split_shared(shell)]
    for letters, exponents, coefficients in tables:
        yield f"{symbol:<2}    {letters}"
        yield from columns([[e, *row] for e, row in zip(exponents, coefficients, strict=True)], 6)


def _potential_lines(block: Block, losses: Losses) -> Iterator[str]:
    assert block.potential is not None
    yield f"{block.symbol} nelec {block.potential.electrons}"
    coupling = {_key(c): c for c in block.potential.channels if c.kind == "spin-orbit"}
    for channel in block.potential.channels:
        if channel.kind == "spin-orbit":
            continue
        yield f"{block.symbol} {'ul' if channel.local else letter_of(channel.l).upper()}"
        rows: list[list[str]] = [list(term) for term in terms(channel)]
        if (coupled := coupling.pop(_key(channel), None)) is not None:
            rows = [[*row, other[2]] for row, other in zip(rows, terms(coupled), strict=True)]
        yield from columns(rows, 2)
    if coupling:
        losses.say("spin-orbit terms with exponents of their own are left out", block.symbol)


def _key(channel: Channel) -> tuple[object, ...]:
    """Equal for a channel and its spin-orbit terms, which are one more column of its rows."""
    return (channel.l, channel.local, channel.powers, channel.exponents.tobytes())


LAYOUT = Layout(
    name="keyworded",
    summary="shells headed `C S` between `basis` and `end`; columns are general contractions",
    picture=PICTURE,
    comment="#",
    recognise=recognise,
    read=read,
    write=write,
)
