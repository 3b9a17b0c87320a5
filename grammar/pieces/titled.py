"""Core potentials as the `$ECP` group has them: `HG-ECP GEN 60 3`, then channels below titles.

A title begins with the count of its rows; rows are coefficient, power, exponent.  The channels are
the local part, of the highest l, then s, p, d ... up to it.
"""

import re
from collections.abc import Iterator
from itertools import zip_longest

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of, integer, leading
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.model import Channel, Potential, letter_of
from overlapse.grammar.pieces.channels import ladder, rows_of
from overlapse.grammar.pieces.groups import say_built_in, say_missing
from overlapse.grammar.writing import Losses, columns

# Far above any angular momentum of a core potential.
HIGHEST = 20
_LETTERS = re.compile(r"[A-Za-z]+")


class Cores:
    """The potentials of a text: one for each element, which other atoms repeat by name alone."""

    def __init__(self, build: Build, atoms: list[BlockDraft]) -> None:
        """``atoms`` is the list of the text's atoms, in their order."""
        self.build = build
        self.atoms = atoms
        self.potentials: dict[int, Potential] = {}
        self.owners: dict[int | None, BlockDraft] = {}  # blocks for those that have no atom
        self.spoiled: set[int | None] = set()  # elements whose potential is not known

    def give(self) -> None:
        """Hand the potentials to the blocks; one without an atom becomes a block of its own."""
        known = {block.number for block in self.build.blocks}
        self.build.blocks += [b for number, b in self.owners.items() if number not in known]
        for block in self.build.blocks:
            block.potential = self.potentials.get(block.number or 0)
            block.complete = block.complete and block.number not in self.spoiled

    def read(self, node: Node, entry: int) -> None:
        """One potential of the group; ``entry`` is its place, which is that of its atom."""
        heading = leading(node)
        words = heading.split()
        letters = _LETTERS.match(words[0])
        z = number_of(letters[0]) if letters else None
        if z is None and entry < len(self.atoms):
            z = self.atoms[entry].number
        kind = words[1].upper() if len(words) > 1 else ""
        bare = len(node.children) == 1
        if kind == "NONE":
            return
        if bare and (first := self.potentials.get(z or 0)) is not None:
            self.check_repeat(heading, first, integer("".join(words[2:3])), first)
            return
        owner = BlockDraft(words[0] if z is None else symbol_of(z), z, index_of(heading), "")
        if z is None:
            self.nameless(heading, words[0])
        if kind != "GEN" and bare:
            self.owned(owner, complete=False)
            say_built_in(
                self.build, heading, owner.symbol, f"{str(heading)!r} names a core potential"
            )
            return
        pieces = [piece for piece in node.children if isinstance(piece, Tree)]
        for piece, following in zip_longest(pieces, pieces[1:]):
            # Rows below a title without its count have a fault of their own.
            untitled = following is not None and _rows(following) is following.children[0]
            if piece.data == "remark" and not untitled:
                say_missing(self.build, piece, "1   ----- p potential -----")
        potential = _read_titled(self.build, owner, node)
        self.owned(owner, complete=owner.complete and potential is not None)
        if z is not None and potential is not None:
            first = self.potentials.setdefault(z, potential)
            self.check_repeat(heading, first, potential.electrons, potential)

    def nameless(self, heading: Token, name: str) -> None:
        self.build.fault_word(
            "form.element",
            index_of(heading),
            0,
            f"{name!r} begins with no element's symbol, and no atom has its place",
            measured=name,
            remedy="begin the name with the symbol, as in HG-ECP",
        )

    def owned(self, owner: BlockDraft, complete: bool) -> None:
        """Note an element with a potential."""
        if not complete:
            self.spoiled.add(owner.number)
        self.owners.setdefault(owner.number, owner)

    def check_repeat(
        self, heading: Token, first: Potential, electrons: int | None, potential: Potential
    ) -> None:
        if electrons != first.electrons or _terms(first) != _terms(potential):
            name = heading.split()[0]
            self.build.fault_line(
                "form.repeat",
                index_of(heading),
                f"{name} was given on line {first.line} with other numbers",
                severity="warning",
                element=name,
                remedy="give all atoms of an element one potential; the name and GEN repeat it",
            )


def _terms(potential: Potential) -> list[object]:
    """Equal for potentials whose channels say the same."""
    return [
        (c.l, c.local, c.powers, c.exponents.tolist(), c.coefficients.tolist())
        for c in potential.channels
    ]


def _read_titled(build: Build, block: BlockDraft, node: Node) -> Potential | None:
    """The potential of a tree that begins with POTENTIAL and has its channels below."""
    heading, *pieces = node.children
    assert isinstance(heading, Token)
    channels = [piece for piece in pieces if isinstance(piece, Tree) and piece.data == "channel"]
    words, index = heading.split(), index_of(heading)
    electrons = integer(words[2]) if len(words) > 2 else None
    highest = integer(words[3]) if len(words) > 3 else None
    if electrons is None or highest is None or highest > HIGHEST:
        build.fault_line(
            "form.syntax",
            index,
            f"{str(heading)!r} should give the electrons that the potential replaces and the "
            "highest angular momentum",
            element=block.symbol,
            expected=f"{words[0]} GEN   10   2",
            remedy="write both whole numbers after GEN",
        )
        return None
    swallowed = [channel for channel in channels if _announced(channel) < _found(build, channel)]
    # A lost title makes its channel part of the one before: one fault, not two.
    if len(channels) != highest + 1 and not (len(channels) == highest and len(swallowed) == 1):
        build.fault_word(
            "form.count",
            index,
            3,
            f"highest angular momentum {highest} ({letter_of(highest)}) makes {highest + 1} "
            f"channels, {len(channels)} follow",
            element=block.symbol,
            measured=len(channels),
            expected=highest + 1,
            remedy="a channel was lost or added, or the heading is wrong",
        )
    made = [
        _channel(build, block, channel, highest if at == 0 else at - 1, at == 0)
        for at, channel in enumerate(channels)
    ]
    block.complete = None not in made and len(channels) == highest + 1 and not swallowed
    return Potential(electrons, tuple(channel for channel in made if channel), index + 1)


def _channel(build: Build, block: BlockDraft, node: Node, l: int, local: bool) -> Channel | None:
    first, untitled = node.children[0], _announced(node) < 0
    assert isinstance(first, Token)
    run = build.rows(_rows(node))
    announced = None if untitled else _announced(node)
    if announced != len(run.rows):
        build.fault_word(
            "form.count",
            index_of(first),
            0,
            "the count and the title of this channel are missing above its first row"
            if untitled
            else f"this channel announces {first.split()[0]} rows, {len(run.rows)} follow",
            element=block.symbol,
            measured=len(run.rows),
            expected=announced,
            remedy="a row was lost or added, or the count is wrong",
        )
    title = "" if untitled else " ".join(first.split()[1:]).strip("- ")
    return build.channel(
        block, l, local, index_of(first), run, order="coefficient power exponent", title=title
    )


def _rows(node: Node) -> Token | None:
    last = node.children[-1]
    return last if isinstance(last, Token) and last.type == "ROWS" else None


def _announced(node: Node) -> int:
    """The count before a channel's title; -1 where the title is lost."""
    first = leading(node)
    return -1 if first.type == "ROWS" else integer(first.split()[0]) or 0


def _found(build: Build, node: Node) -> int:
    return len(build.rows(_rows(node)).rows) if _announced(node) >= 0 else -1


def titled_lines(potential: Potential, symbol: str, losses: Losses) -> Iterator[str]:
    """A potential as text; nothing, and a loss, for one that is no ladder of channels."""
    found = ladder(potential, symbol, losses)
    if found is None:
        return
    highest = len(found) - 1
    yield f" {symbol.upper()}-ECP GEN  {potential.electrons:3}  {highest:3}"
    for at, channel in enumerate(found):
        rows = rows_of(channel)
        names = letter_of(highest) if at == 0 else f"{letter_of(at - 1)}-{letter_of(highest)}"
        yield f"  {len(rows)}   ----- {names} potential -----"
        yield from columns([[c, n, e] for n, e, c in rows], 4)
