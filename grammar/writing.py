"""What all writers share: numbers as they were spelled, columns that line up, losses that are said.

A writer gets a document and gives back text; what its layout cannot express goes into
`Losses`, never away in silence.
"""

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field

from overlapse.grammar.model import Block, Channel, Document, Shell


@dataclass
class Losses:
    """Remarks on what the new layout cannot hold; each is said once, with the elements it met."""

    seen: dict[str, list[str]] = field(default_factory=dict)

    def say(self, what: str, element: str = "") -> None:
        elements = self.seen.setdefault(what, [])
        if element and element not in elements:
            elements.append(element)

    def lines(self) -> tuple[str, ...]:
        """One sentence for each kind of loss."""
        return tuple(
            f"{what} ({', '.join(elements)})" if elements else what
            for what, elements in self.seen.items()
        )


def columns(rows: Iterable[Sequence[str]], indent: int = 4) -> Iterator[str]:
    """Rows of number words as lines, the decimal points of each column below one another."""
    table = [list(row) for row in rows]
    count = max(map(len, table), default=0)
    before = [
        max((_point(row[k]) for row in table if k < len(row)), default=0) for k in range(count)
    ]
    after = [
        max((len(row[k]) - _point(row[k]) for row in table if k < len(row)), default=0)
        for k in range(count)
    ]
    for row in table:
        words = (
            " " * (before[k] - _point(word))
            + word
            + " " * (after[k] - len(word) + _point(word) if k < len(row) - 1 else 0)
            for k, word in enumerate(row)
        )
        yield " " * indent + "   ".join(words)


def _point(word: str) -> int:
    """Number of characters before the decimal point (of the mantissa)."""
    for at, character in enumerate(word):
        if character in ".EeDd":
            return at
    return len(word)


def segments(shell: Shell) -> Iterator[tuple[tuple[int, ...], list[list[str]]]]:
    """A shell as contractions of one column each: (angular, rows of exponent and coefficients).

    For layouts without general contraction.  A column keeps only the primitives it uses; an s+p
    shell keeps both columns and all its rows.
    """
    exponents, coefficients = shell.spellings()
    if len(shell.angular) > 1:
        each = shell.columns_per_l
        for column in range(each):
            at = [column + each * k for k in range(len(shell.angular))]
            yield (
                shell.angular,
                [
                    [exponent, *(row[k] for k in at)]
                    for exponent, row in zip(exponents, coefficients, strict=True)
                ],
            )
        return
    for column in range(shell.coefficients.shape[1]):
        used = shell.coefficients[:, column] != 0.0
        keep = used if used.any() else ~used
        yield (
            shell.angular,
            [
                [exponent, row[column]]
                for exponent, row, kept in zip(exponents, coefficients, keep, strict=True)
                if kept
            ],
        )


def is_general(shell: Shell) -> bool:
    """Whether a shell has more than one contraction for one angular momentum."""
    return shell.columns_per_l > 1


def split_shared(shell: Shell) -> Iterator[tuple[int, list[str], list[list[str]]]]:
    """A shell as one table for each l: (l, exponents, coefficient rows); splits s+p shells."""
    exponents, coefficients = shell.spellings()
    each = shell.columns_per_l
    for place, l in enumerate(shell.angular):
        yield l, exponents, [row[place * each : (place + 1) * each] for row in coefficients]


def title_of(document: Document, block: Block) -> str:
    """The name under which a block is written: its label, its set's label, or "unnamed"."""
    if block.label:
        return block.label
    for members in document.sets:
        if members.label and any(block is member for member in members.blocks):
            return members.label
    return "unnamed"


def say_shared_names(document: Document, losses: Losses) -> None:
    """For layouts that keep the sets of a file apart by the names of their blocks."""
    seen: set[tuple[int, str]] = set()
    for block in document.blocks:
        key = block.atomic_number, title_of(document, block)
        if key in seen:
            losses.say(f"several sets have the name {key[1]!r} and become one", block.symbol)
        seen.add(key)


def terms(channel: Channel) -> list[tuple[str, str, str]]:
    """Power, exponent and coefficient of each term of a channel, as shortest exact spellings."""
    return [
        (str(power), repr(float(exponent)), repr(float(coefficient)))
        for power, exponent, coefficient in zip(
            channel.powers, channel.exponents, channel.coefficients, strict=True
        )
    ]
