"""Core potentials as statements: `ecp, Hg, 60, 3, 0`, then counts and terms of all channels.

The local part, of the highest l, comes first, then s, p, d ... below it, then the spin-orbit parts
from p on.  Terms are power, exponent, coefficient.
"""

from collections.abc import Iterator

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, index_of, integer, shorten
from overlapse.grammar.model import Block, Channel, Potential
from overlapse.grammar.pieces.channels import ladder, rows_of
from overlapse.grammar.pieces.statements import fault_field, fields_of, terms_of
from overlapse.grammar.pieces.titled import HIGHEST
from overlapse.grammar.writing import Losses


def read_stated(build: Build, block: BlockDraft, heading: Token, numbers: list[Token]) -> None:
    """Give a block the potential whose statements these are."""
    fields = fields_of(heading)
    head = [integer(field) for field in [*fields[2:5], "0"][:3]]
    if len(head) < 3 or None in head or max(n or 0 for n in head[1:]) > HIGHEST:
        _heading_fault(build, heading, block)
        return
    electrons, highest, coupled = (number or 0 for number in head)
    channels = _channels(build, block, heading, numbers, highest, coupled)
    block.complete = block.complete and None not in channels
    block.potential = Potential(
        electrons, tuple(channel for channel in channels if channel), index_of(heading) + 1
    )


def _heading_fault(build: Build, heading: Token, block: BlockDraft) -> None:
    block.complete = False
    fault_field(
        build,
        heading,
        0,
        "form.syntax",
        f"{shorten(str(heading))!r} should give the electrons that the potential replaces, the "
        "highest angular momentum, and that of its spin-orbit part",
        element=block.symbol,
        expected=f"ecp, {block.symbol}, 10, 2, 0",
        remedy="write the whole numbers",
    )


def _channels(
    build: Build,
    block: BlockDraft,
    heading: Token,
    numbers: list[Token],
    highest: int,
    coupled: int,
) -> list[Channel | None]:
    """Local part of the highest l, then s, p ... below it, then spin-orbit parts from p on."""
    parts: list[tuple[Token | None, list[Token]]] = []
    for token in numbers:
        if len(fields_of(token)) == 1 or not parts:
            parts.append((token, []) if len(fields_of(token)) == 1 else (None, [token]))
        else:
            parts[-1][1].append(token)
    wanted = highest + 1 + coupled
    swallowed = [count for count, terms in parts if count and (integer(count) or 0) < len(terms)]
    # A lost count makes its channel part of the one before: one fault, not two.
    if len(parts) != wanted and not (len(parts) == wanted - 1 and len(swallowed) == 1):
        fault_field(
            build,
            heading,
            3,
            "form.count",
            f"angular momenta up to {highest}"
            + (f", and up to {coupled} with spin-orbit terms," if coupled else "")
            + f" make {wanted} channels, {len(parts)} follow",
            element=block.symbol,
            measured=len(parts),
            expected=wanted,
            remedy="a channel was lost or added, or the statement above is wrong",
        )
    made = []
    for at, (count, terms) in enumerate(parts):
        l = highest if at == 0 else at - 1 if at <= highest else at - highest
        _check_count(build, block, count, terms)
        made.append(_channel(build, block, l, at == 0, count, terms, at > highest))
    return made


def _channel(
    build: Build,
    block: BlockDraft,
    l: int,
    local: bool,
    count: Token | None,
    terms: list[Token],
    spin_orbit: bool,
) -> Channel | None:
    run = terms_of(terms)
    wrong = [token for token in terms if len(fields_of(token)) != 3]
    for token in wrong:
        found = len(fields_of(token))
        fault_field(
            build,
            token,
            3 if found > 3 else 0,
            "form.count",
            f"{found} numbers in a term of a core potential; it has three: power, exponent, "
            "coefficient",
            element=block.symbol,
            measured=found,
            expected=3,
            remedy="a number was lost or added, or a semicolon is missing",
        )
    if wrong:
        build.check_words(block, None, run)
        return None
    return build.channel(block, l, local, index_of(count or terms[0]), run, spin_orbit=spin_orbit)


def _check_count(build: Build, block: BlockDraft, count: Token | None, terms: list[Token]) -> None:
    announced = None if count is None else integer(fields_of(count)[0])
    if announced != len(terms):
        fault_field(
            build,
            count or terms[0],
            0,
            "form.count",
            "the number of terms of this channel is missing"
            if count is None
            else f"this channel announces {fields_of(count)[0]} terms, {len(terms)} follow",
            element=block.symbol,
            measured=len(terms),
            expected=announced,
            remedy="a term was lost or added, or the count is wrong",
        )


def stated_lines(block: Block, losses: Losses) -> Iterator[str]:
    """A potential as text, or nothing and a loss."""
    found = block.potential and ladder(block.potential, block.symbol, losses)
    if block.potential is None or not found:
        return
    yield f"ecp, {block.symbol}, {block.potential.electrons}, {len(found) - 1}, 0"
    for channel in found:
        rows = rows_of(channel)
        yield "; ".join([str(len(rows)), *(", ".join(row) for row in rows)])
