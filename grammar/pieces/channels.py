"""Counted channels: core potentials given as a count of rows for each channel, then the rows.

The local part, of the highest l, comes first, then s, p, d ... up to it.  Rows are power, exponent,
coefficient.  A channel that has nothing is a count of 0.
"""

from collections.abc import Sequence

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, Run, index_of, leading
from overlapse.grammar.model import Channel, Potential, letter_of
from overlapse.grammar.pieces.headings import count_of, spanning
from overlapse.grammar.pieces.tables import Tables
from overlapse.grammar.writing import Losses, terms

# No potential reaches so high: what announces more is a slip.
_HIGHEST = 30


def joined_channels(tables: Tables, tokens: Sequence[Token], at: int) -> tuple[list[Token], int]:
    """The channels from ``tokens[at]`` on as COUNT and ROWS tokens, and the index past them.

    A COUNT is followed by that many rows, which may look like anything.
    """
    done: list[Token] = []
    while at < len(tokens) and tokens[at].type in ("COUNT", "ROWS"):
        rows = at
        if tokens[at].type == "COUNT":
            done.append(tokens[at])
            rows = at = at + 1
            at = _rows_end(tables, tokens, at, count_of(done[-1]))
        else:
            at += 1
        if at > rows:
            done.append(spanning(tokens[rows], tokens[at - 1]))
    return done, at


def _rows_end(tables: Tables, tokens: Sequence[Token], at: int, count: int) -> int:
    lines = 0
    while at < len(tokens) and (
        tokens[at].type == "ROWS" or (tokens[at].type == "HEAD" and lines < count)
    ):
        lines += len(tables.run(tokens[at]).rows)
        at += 1
    return at


def channels_of(
    tables: Tables, block: BlockDraft, nodes: Sequence[Node], highest: int, index: int, word: int
) -> tuple[Channel, ...]:
    """The channels below a heading on line ``index``, whose word ``word`` gives the highest l."""
    build = tables.build
    runs = [_channel_rows(tables, node) for node in nodes]
    swallowed = [run for count, run in runs if count is not None and len(run.rows) > count]
    # A lost count makes its channel part of the one before: one fault, not two.
    if len(nodes) != highest + 1 and not (len(nodes) == highest and len(swallowed) == 1):
        build.fault_word(
            "form.count",
            index,
            word,
            f"highest angular momentum {highest} ({letter_of(highest)}) makes {highest + 1} "
            f"channels; {len(nodes)} follow",
            element=block.symbol,
            measured=len(nodes),
            expected=highest + 1,
            remedy="a channel was lost or added, or the heading is wrong",
        )
    if highest > _HIGHEST:
        highest = max(len(nodes) - 1, 0)
    made = []
    for at, (node, (count, run)) in enumerate(zip(nodes, runs, strict=True)):
        heading = index_of(_first(node))
        _check_count(build, block, heading, count, run)
        if run.rows:
            l = highest if at == 0 else at - 1
            made.append(build.channel(block, l, at == 0, heading, run))
    return tuple(channel for channel in made if channel is not None)


def _first(node: Node) -> Token:
    first = leading(node)
    return first


def _channel_rows(tables: Tables, node: Node) -> tuple[int | None, Run]:
    """Announced count and rows of a channel."""
    count, rows = None, None
    for token in node.children:
        assert not isinstance(token, Tree)
        if token.type == "COUNT":
            count = count_of(token)
        else:
            rows = token
    return count, tables.run(rows)


def _check_count(
    build: Build, block: BlockDraft, heading: int, count: int | None, run: Run
) -> None:
    if count == len(run.rows):
        return
    missing = count is None
    build.fault_line(
        "form.count",
        heading,
        "the number of rows of this channel is missing"
        if missing
        else f"this channel announces {count} rows; {len(run.rows)} follow",
        element=block.symbol,
        measured=None if missing else len(run.rows),
        expected=len(run.rows) if missing else count,
        remedy="write the number of rows on a line of its own above them"
        if missing
        else "a row was lost or added, or a count is lost or wrong",
    )


def ladder(potential: Potential, element: str, losses: Losses) -> list[Channel | None] | None:
    """The channels in the order of the layout, None for an l without one; or None and a loss."""
    scalar = [channel for channel in potential.channels if channel.kind == "scalar"]
    if not potential.channels:
        losses.say("core potentials whose terms are not known are left out", element)
        return None
    if len(scalar) < len(potential.channels):
        losses.say("spin-orbit terms of core potentials are left out", element)
    local = [channel for channel in scalar if channel.local]
    others = {channel.l: channel for channel in scalar if not channel.local}
    highest = local[0].l if local else max(others, default=-1) + 1
    fits = len(local) <= 1 and len(local) + len(others) == len(scalar)
    fits = fits and highest <= _HIGHEST
    if not fits or max(others, default=-1) >= highest + (not local):
        losses.say("core potentials that are no plain ladder of channels are left out", element)
        return None
    return [local[0] if local else None, *(others.get(l) for l in range(highest))]


def rows_of(channel: Channel | None) -> list[tuple[str, str, str]]:
    """The terms of a channel as words: power, exponent, coefficient."""
    return terms(channel) if channel is not None else []
