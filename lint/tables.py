"""What a file contains, for people: tables of at most 100 columns."""

from collections.abc import Iterator, Sequence
from itertools import groupby
from textwrap import wrap
from typing import TextIO

from overlapse.grammar.elements import period_of
from overlapse.grammar.model import Block, Potential, letter_of
from overlapse.lint.describe import Description, Portrait, SetPortrait, ranges
from overlapse.lint.reports.lines import one_line
from overlapse.rules.labels.composition import (
    exponent_limits,
    function_counts,
    lengths_of,
    notation,
)
from overlapse.rules.labels.naming import Naming, listed

WIDTH = 100
_LETTERS_IN_A_ROW = 4  # of the table of exponents
_TIE = "\N{NO-BREAK SPACE}"  # a blank at which no line is broken; written as a blank


def write_text(description: Description, out: TextIO) -> None:
    """Tables of at most 100 columns: composition, exponents, potentials; then the labels."""
    document = description.document
    out.write(f"{one_line(document.path)}  (layout {document.layout})\n")
    if count := description.broken:
        out.write(f"{count} fault{'s' * (count != 1)} of form: what follows may lack something\n")
    for each in description.sets:
        out.write("\n" + "\n".join(_set_lines(each, len(document.sets) > 1)) + "\n")


def _set_lines(each: SetPortrait, several: bool) -> Iterator[str]:
    yield from _heading(each, several)
    shelled = [portrait.block for portrait in each.elements if portrait.block.shells]
    if shelled:
        yield ""
        yield from _compositions(shelled)
        yield ""
        yield from _exponents(shelled)
    if any(portrait.block.potential for portrait in each.elements):
        yield ""
        yield from _potentials([portrait.block for portrait in each.elements])
    if shelled:
        yield ""
        yield from _labels(each)


def _heading(each: SetPortrait, several: bool) -> Iterator[str]:
    name = one_line(each.claimed) if each.claimed else "a set without a label"
    count = len(each.elements)
    numbers = sorted({portrait.block.atomic_number for portrait in each.elements})
    facts = [f"{count} element{'s' * (count != 1)}: {ranges(numbers)}"]
    facts.append(_stated([portrait.block for portrait in each.elements]))
    if each.members.role == "fitting":
        facts.append("a fitting set by its layout")
    yield from _wrapped(f"set {each.ordinal}: " if several else "", f"{name}; {'; '.join(facts)}")


def _stated(blocks: Sequence[Block]) -> str:
    stated = {block.functions for block in blocks}
    if stated == {None}:
        return "whether spherical or Cartesian is not stated"
    words = sorted(word or "unstated" for word in stated)
    return " and ".join(words) + " functions"


def _wrapped(head: str, text: str, hang: int | None = None) -> list[str]:
    """Text after a head, its further lines indented to stand below its beginning."""
    indent = " " * (len(head) if hang is None else hang)
    lines = wrap(text, WIDTH, initial_indent=head, subsequent_indent=indent, break_on_hyphens=False)
    return [line.replace(_TIE, " ") for line in lines]


def _compositions(blocks: Sequence[Block]) -> Iterator[str]:
    rows = [
        (
            block.symbol + ("" if block.complete else " *"),
            notation(block, ""),
            *map(str, function_counts(block)),
            _pattern(block),
        )
        for block in blocks
    ]
    titles = ("element", "composition", "spher.", "Cart.", "contraction lengths")
    yield from _table(titles, rows, [block.atomic_number for block in blocks], "<<>><")
    if not all(block.complete for block in blocks):
        yield "* parts of this element could not be read"


def _pattern(block: Block) -> str:
    """Contraction lengths with repeats drawn together: s 6,3,1; p 3,4x1."""
    parts = []
    for l, lengths in lengths_of(block).items():
        runs = [(n, len(list(run))) for n, run in groupby(lengths)]
        told = [f"{count}x{n}" if count > 2 else ",".join([str(n)] * count) for n, count in runs]
        parts.append(f"{letter_of(l)}{_TIE}{','.join(told)}")
    return "; ".join(parts)


def _exponents(blocks: Sequence[Block]) -> Iterator[str]:
    limits = {block.atomic_number: exponent_limits(block) for block in blocks}
    letters = sorted({l for found in limits.values() for l in found})
    for start in range(0, len(letters), _LETTERS_IN_A_ROW):
        part = letters[start : start + _LETTERS_IN_A_ROW]
        shown = [block for block in blocks if any(l in limits[block.atomic_number] for l in part)]
        rows = [
            (block.symbol, *(_limits(limits[block.atomic_number].get(l)) for l in part))
            for block in shown
        ]
        if start:
            yield ""
        else:
            yield "highest and lowest exponent of each l, bohr^-2"
        titles = ("element", *(letter_of(l).center(_PAIR).rstrip() for l in part))
        yield from _table(titles, rows, [block.atomic_number for block in shown], "<" * len(titles))


_PAIR = 20  # width of two exponents side by side


def _limits(pair: tuple[float, float] | None) -> str:
    return f"{_number(pair[0]):>9} {_number(pair[1]):>9}" if pair else ""


def _number(value: float) -> str:
    """Four digits, those of large numbers not cut: 12345, 3047, 0.1687, 1.234e+06."""
    return f"{value:.0f}" if 1000 <= value < 1e6 else f"{value:#.4g}"


def _potentials(blocks: Sequence[Block]) -> Iterator[str]:
    held = [block for block in blocks if block.potential is not None]
    rows = [
        (block.symbol, str(block.potential.electrons), _channels(block.potential))
        for block in held
        if block.potential
    ]
    titles = ("element", "core electrons", "channels of the potential (number of terms)")
    yield from _table(titles, rows, [block.atomic_number for block in held], "<><")
    if bare := [block.symbol for block in blocks if block.potential is None]:
        yield f"without a core potential: {listed(bare, 12)}"


def _channels(potential: Potential) -> str:
    told = []
    for channel in potential.channels:
        marks = ["local"] * channel.local + ["spin-orbit"] * (channel.kind == "spin-orbit")
        words = " ".join([letter_of(channel.l), *marks])
        told.append(f"{words} ({len(channel.powers)})")
    return ", ".join(told) or "none given"


def _labels(each: SetPortrait) -> Iterator[str]:
    if each.best is None:
        yield "label: no known label fits most of these elements"
    else:
        yield from _naming("label", each.best)
    for naming in each.doubtful:
        yield from _naming("claimed", naming)
    if each.best is not None:
        yield from _odd(each.elements, str(each.best.label))


def _odd(elements: Sequence[Portrait], label: str) -> Iterator[str]:
    """Elements that the set's label does not fit, but others do; those of equal labels together."""
    groups: dict[tuple[str, ...], list[str]] = {}
    for portrait in elements:
        if portrait.labels and label not in portrait.labels:
            groups.setdefault(portrait.labels, []).append(portrait.block.symbol)
    for labels, symbols in groups.items():
        verb = "fits" if len(symbols) == 1 else "fit"
        yield from _wrapped("  ", f"by itself {listed(symbols, 12)} {verb} {listed(labels)}")


def _naming(head: str, naming: Naming) -> Iterator[str]:
    yield f"{head}: {naming.label} fits {naming.fits} of {naming.of}"
    for mark, reasons in (("for", naming.speaks_for), ("against", naming.speaks_against)):
        for reason in reasons:
            yield from _wrapped(f"  {mark + ':':<9}", one_line(reason))


def _table(
    titles: Sequence[str], rows: Sequence[Sequence[str]], numbers: Sequence[int], sides: str
) -> Iterator[str]:
    """Columns as wide as they need, the last wrapped; a blank line between periods."""
    widths = [max(map(len, column)) for column in zip(titles, *rows, strict=True)]
    form = "  ".join(f"{{:{side}{width}}}" for side, width in zip(sides, widths, strict=True))
    hang = sum(widths[:-1]) + 2 * (len(widths) - 1)
    yield form.format(*titles).rstrip()
    yield "-" * min(WIDTH, hang + widths[-1])
    for number, row, before in zip(numbers, rows, [numbers[0], *numbers], strict=False):
        if period_of(number) != period_of(before):
            yield ""
        yield from _row(form, row, hang)


def _row(form: str, row: Sequence[str], hang: int) -> list[str]:
    line = form.format(*row).rstrip()
    if len(line) <= WIDTH:
        return [line.replace(_TIE, " ")]
    head = form.format(*row[:-1], "").ljust(hang)[:hang]
    return _wrapped(head, row[-1], hang)
