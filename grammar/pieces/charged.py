"""Core potentials below `INPUT`: the effective charge and six counts, then rows for all parts.

The counts are those of the local part, then of s, p, d, f and g.  Rows are exponent, coefficient,
power; the power is that of r itself, which the model counts as in r**n / r**2.
"""

from collections.abc import Iterator
from dataclasses import replace

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, Run, index_of
from overlapse.grammar.model import Block, Channel, Potential
from overlapse.grammar.numbers import looks_numeric
from overlapse.grammar.pieces.channels import ladder, rows_of
from overlapse.grammar.pieces.plainlines import WITH_POTENTIAL
from overlapse.grammar.pieces.slips import say_not_whole
from overlapse.grammar.writing import Losses, columns

_PARTS = ("local", "s", "p", "d", "f", "g")


def check_potential(build: Build, block: BlockDraft, heading: Token) -> None:
    """Whether an element without a potential announces one."""
    word = heading.split()[0]
    if int(word) >= WITH_POTENTIAL:
        block.complete = False
        build.fault_word(
            "form.syntax",
            index_of(heading),
            0,
            f"{word} announces a core potential, but neither `INPUT` nor a name follows",
            element=block.symbol,
            measured=word,
            expected=int(word) % 100,
            remedy=f"write {int(word) % 100} for an all-electron set, or restore the potential",
        )


def read_potential(build: Build, block: BlockDraft, heading: Token, node: Node) -> None:
    """The potential of an element: written out below `INPUT`, or a name for a known one."""
    name, *rest = [piece for piece in node.children if isinstance(piece, Token)]
    word = heading.split()[0]
    if int(word) < WITH_POTENTIAL:
        build.fault_word(
            "form.syntax",
            index_of(heading),
            0,
            f"{word} announces no core potential, but {str(name)!r} follows",
            element=block.symbol,
            measured=word,
            expected=WITH_POTENTIAL + int(word) % 100,
            remedy=f"write {WITH_POTENTIAL + int(word) % 100}",
        )
    if name.upper() == "INPUT":
        _read_charged(build, block, int(word) % 100, name, rest)
        return
    block.complete = False
    build.fault_line(
        "form.syntax",
        index_of(name),
        f"the core potential {str(name)!r} of {block.symbol} is built into the program that "
        "reads the list: it is not judged, nor is the number of its electrons known"
        if not rest
        else f"numbers follow the name {str(name)!r}: only `INPUT` announces numbers",
        severity="error" if rest else "note",
        element=block.symbol,
        expected="INPUT" if rest else None,
        remedy="write the potential out below `INPUT` to have it judged",
    )


def _read_charged(build: Build, block: BlockDraft, z: int, name: Token, rest: list[Token]) -> None:
    """Give a block the potential whose line of charges, and whose rows, are in ``rest``."""
    line = rest[0] if rest and rest[0].type == "CHARGES" else None
    run = build.rows(rest[-1] if rest and rest[-1].type == "ROWS" else None)
    electrons, counts = _charges(build, block, z, name, line)
    if line is not None and counts is not None and sum(counts) != len(run.rows):
        build.fault_word(
            "form.count",
            index_of(line),
            1,
            f"the six counts announce {sum(counts)} rows, {len(run.rows)} follow",
            element=block.symbol,
            measured=len(run.rows),
            expected=sum(counts),
            remedy="a row was lost or added, or a count is wrong",
        )
        counts = None
    if electrons is None or counts is None:
        block.complete = False
        build.check_words(block, None, run)
        return
    channels = list(_channels(build, block, counts, run, index_of(name)))
    block.complete = block.complete and None not in channels
    block.potential = Potential(
        electrons, tuple(channel for channel in channels if channel), index_of(name) + 1
    )


def _charges(
    build: Build, block: BlockDraft, z: int, name: Token, line: Token | None
) -> tuple[int | None, list[int] | None]:
    """Electrons that the potential replaces, and the six counts; None for what is amiss."""
    words = line.split() if line is not None else []
    if line is None or len(words) < 7 or (len(words) > 7 and looks_numeric(words[7])):
        build.fault_line(
            "form.count",
            index_of(name if line is None else line),
            f"{len(words)} numbers where the effective charge and six counts belong "
            f"({', '.join(_PARTS)})",
            element=block.symbol,
            measured=len(words),
            expected=7,
            remedy="restore the line from the source",
        )
        return None, None
    values = [_whole(build, block, line, at, word) for at, word in enumerate(words[:7])]
    charge = values[0]
    if charge is not None and charge > z:
        build.fault_word(
            "form.number",
            index_of(line),
            0,
            f"an effective charge of {charge} is more than the {z} of {block.symbol}",
            element=block.symbol,
            measured=charge,
            limit=z,
            remedy="write the nuclear charge less the electrons of the core",
        )
        charge = None
    counts = [value for value in values[1:] if value is not None]
    return None if charge is None else z - charge, counts if len(counts) == 6 else None


def _whole(build: Build, block: BlockDraft, line: Token, at: int, word: str) -> int | None:
    value = build.number(word, index_of(line), at, block.symbol, None)
    if value is None or (value >= 0.0 and value.is_integer()):
        return None if value is None else int(value)
    say_not_whole(build, block, index_of(line), at, word, "perhaps one before it was lost")
    return None


def _channels(
    build: Build, block: BlockDraft, counts: list[int], run: Run, index: int
) -> Iterator[Channel | None]:
    """Local part first, then s, p ... up to the last that has terms.

    A part without terms between others is kept: some layouts know a part by its place alone.
    """
    highest = max((l for l, count in enumerate(counts[1:]) if count), default=-1)
    at = 0
    for place, count in enumerate(counts[: highest + 2]):
        rows = Run(run.rows[at : at + count], run.lines[at : at + count])
        channel = build.channel(
            block,
            place - 1 if place else highest + 1,
            place == 0,
            rows.lines[0] if rows.lines else index,
            rows,
            order="exponent coefficient power",
            title=_PARTS[place],
        )
        yield channel and replace(channel, powers=tuple(n + 2 for n in channel.powers))
        at += count


def charged_lines(block: Block, losses: Losses) -> Iterator[str]:
    """A potential as text, or nothing and a loss."""
    potential = block.potential
    found = potential and ladder(potential, block.symbol, losses)
    if potential is None or not found:
        return
    if len(found) > len(_PARTS):
        losses.say("core potentials with parts above g are left out", block.symbol)
        return
    if potential.electrons > block.atomic_number:
        losses.say(
            "a core potential for more electrons than the atom has is left out", block.symbol
        )
        return
    counts = [len(rows_of(channel)) for channel in found] + [0] * (len(_PARTS) - len(found))
    yield "INPUT"
    yield f"{block.atomic_number - potential.electrons}. {' '.join(map(str, counts))}"
    rows = (row for channel in found for row in rows_of(channel))
    yield from columns([[e, c, str(int(n) - 2)] for n, e, c in rows], 2)
