"""Core potentials as two layouts spell them: `ncore = 60   lmax = 3`, then channels by letter.

A channel is headed by its letter, a projected one by two (`s-f`); its rows are coefficient, power,
exponent.  Both grammars have ``potential: CORE channel*`` and ``channel: CHANNEL ROWS?``.
"""

import re
from collections.abc import Iterator

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of
from overlapse.grammar.model import Channel, Potential, letter_of
from overlapse.grammar.writing import Losses, columns, terms

CORE = re.compile(r"ncore\s*=\s*(\d{1,6})(?:\s+lmax\s*=\s*(\d{1,6}))?", re.IGNORECASE)
CHANNEL = re.compile(r"([a-z])(?:-([a-z]))?", re.IGNORECASE)


def read_core(build: Build, block: BlockDraft, node: Node) -> None:
    """Give a block the potential that a tree describes."""
    heading, *channels = node.children
    assert isinstance(heading, Token)
    match = CORE.match(heading)
    if match is None:
        build.fault_line(
            "form.syntax",
            index_of(heading),
            f"{str(heading)!r} should give the electrons and the highest angular momentum",
            element=block.symbol,
            expected="ncore = 60   lmax = 3",
            remedy="write both whole numbers",
        )
        block.complete = False
        return
    made = [_channel(build, block, channel) for channel in channels if isinstance(channel, Tree)]
    if match[2] is not None and len(channels) != int(match[2]) + 1:
        highest = int(match[2])
        build.fault_line(
            "form.count",
            index_of(heading),
            f"lmax = {highest} ({letter_of(highest)}) makes {highest + 1} channels, "
            f"{len(channels)} follow",
            element=block.symbol,
            measured=len(channels),
            expected=highest + 1,
            remedy="a channel was lost or added, or lmax is wrong",
        )
    block.potential = Potential(
        int(match[1]), tuple(channel for channel in made if channel), index_of(heading) + 1
    )


def _channel(build: Build, block: BlockDraft, node: Node) -> Channel | None:
    title = node.children[0]
    rows = node.children[1] if len(node.children) > 1 else None
    assert isinstance(title, Token) and (rows is None or isinstance(rows, Token))
    angular = build.angular_of(title[0], index_of(title))
    if angular is None:
        return None
    return build.channel(
        block,
        angular[0],
        "-" not in title,
        index_of(title),
        build.rows(rows),
        order="coefficient power exponent",
        title=str(title),
    )


def core_lines(potential: Potential, element: str, losses: Losses) -> Iterator[str]:
    """A potential as text, without the lines that fence it."""
    scalar = [channel for channel in potential.channels if channel.kind == "scalar"]
    if len(scalar) < len(potential.channels):
        losses.say("spin-orbit terms of core potentials are left out", element)
    highest = max((channel.l for channel in scalar), default=0)
    yield f"  ncore = {potential.electrons}   lmax = {highest}"
    for channel in scalar:
        letter = letter_of(channel.l)
        yield letter if channel.local else f"{letter}-{letter_of(highest)}"
        yield from columns([[c, n, e] for n, e, c in terms(channel)], 2)
