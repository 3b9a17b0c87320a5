"""For writers of layouts that give all functions of one l as one table."""

from dataclasses import dataclass, field

from overlapse.grammar.model import Block, letter_of
from overlapse.grammar.writing import Losses, split_shared

# Exponents, and coefficients row by row.
Table = tuple[list[str], list[list[str]]]


@dataclass
class _Row:
    """A primitive: its exponent, as value and as spelled, and its coefficients by column."""

    value: float
    word: str
    cells: dict[int, str] = field(default_factory=dict)


def gathered(block: Block, losses: Losses) -> list[Table]:
    """For each l from 0 to the highest: exponents, and coefficient rows (none for an empty l)."""
    if any(len(shell.angular) > 1 for shell in block.shells):
        losses.say("exponents that several l share are written for each of them", block.symbol)
    momenta = [l for shell in block.shells for l in shell.angular]
    if len(set(momenta)) < len(momenta):
        losses.say("the shells of one angular momentum become one table", block.symbol)
    return [_table(block, l) for l in range(max(momenta, default=-1) + 1)]


def composition(tables: list[Table], separator: str) -> tuple[str, str]:
    """Counts of primitives and of contracted functions, as remarks state them: "4s,2p"."""
    primitives, contracted = [], []
    for l, (exponents, rows) in enumerate(tables):
        if exponents:
            primitives.append(f"{len(exponents)}{letter_of(l)}")
            contracted.append(f"{len(rows[0])}{letter_of(l)}")
    return separator.join(primitives), separator.join(contracted)


def _table(block: Block, l: int) -> Table:
    rows: list[_Row] = []
    width = 0
    for shell in block.shells:
        values = shell.exponents.tolist()
        for momentum, words, table in split_shared(shell) if l in shell.angular else ():
            if momentum != l:
                continue
            at = 0
            for value, word, coefficients in zip(values, words, table, strict=True):
                at = _seat(rows, value, word, at)
                rows[at].cells.update(enumerate(coefficients, width))
                at += 1
            width += len(table[0])
    cells = [[row.cells.get(column, "0.0") for column in range(width)] for row in rows]
    return [row.word for row in rows], cells


def _seat(rows: list[_Row], value: float, word: str, first: int) -> int:
    """The row of an exponent at or after ``first``; a new one, where it falls, if there is none.

    Rows are never exchanged, so every function keeps its primitives in their order.
    """
    for at in range(first, len(rows)):
        if rows[at].value == value:
            return at
    at = next((k for k in range(first, len(rows)) if rows[k].value < value), len(rows))
    rows.insert(at, _Row(value, word))
    return at
