"""Edits of the text that rules propose: the parts from which they are made.

A proposal may be wrong about the layout it edits.  That does no harm: a mended text is read again,
and one that does not say what it should is refused.
"""

import re
from collections.abc import Iterable, Sequence

from overlapse.grammar.model import Block, Document, Function, Shell
from overlapse.grammar.numbers import NUMBER, plain
from overlapse.rules.finding import Edit

_POWER = re.compile(r"[EeDd]")


def respelled(word: str, value: float, decimals: int = 0) -> str:
    """A value in the spelling of another number: as many decimals, the same letter, the same sign.

    A sign that is written, or left out, stays so where the value allows it.  decimals: at least so
    many, because numbers beside it have them.
    """
    mantissa, letter, power = _parts(word)
    decimals = max(decimals, _decimals(word))
    if letter:
        digits, _, new = f"{value:.{max(decimals, 1)}e}".partition("e")
        width = len(power.lstrip("+-"))
        sign = "-" if new.startswith("-") else "+" * (power[0] == "+")
        text = f"{digits}{letter}{sign}{abs(int(new)):0{width}d}"
    else:
        text = f"{value:.{decimals or 8}f}"
    if mantissa.lstrip("+-").startswith(".") and text.lstrip("-").startswith("0."):
        text = text.replace("0.", ".", 1)
    return "+" + text if word.startswith("+") and value >= 0.0 else text


def _decimals(word: str) -> int:
    return len(_parts(word)[0].partition(".")[2])


def _parts(word: str) -> tuple[str, str, str]:
    """Mantissa, letter and power of a number; both "" where it has no power."""
    found = _POWER.search(word)
    if found is None:
        return word, "", ""
    return word[: found.start()], found[0], word[found.end() :]


def rescaled(shell: Shell, function: Function, factor: float) -> tuple[Edit, ...]:
    """Multiply the coefficients of one function; nothing where they are not written so."""
    if shell.cells is None:
        return ()
    rows = function.rows.tolist()
    words = [shell.cells.spelling(row, function.column) for row in rows]
    values = shell.coefficients[rows, function.column].tolist()
    for word, value in zip(words, values, strict=True):
        if NUMBER.fullmatch(word) is None or plain(word) != value:
            return ()
    decimals = max(map(_decimals, words))
    return tuple(
        Edit(
            shell.cells.span(row, function.column),
            respelled(word, value * factor, decimals),
        )
        for row, word, value in zip(rows, words, values, strict=True)
    )


def without_row(shell: Shell, row: int) -> tuple[Edit, ...]:
    """Take out a primitive that has a line of its own, and count one less in the heading."""
    if shell.cells is None or len(shell.exponents) < 2:
        return ()
    source, count = shell.cells.source, len(shell.exponents)
    line = source.place(shell.cells.span(row)[0]).line
    if any(source.place(shell.cells.span(r)[0]).line == line for r in range(count) if r != row):
        return ()
    edits = [Edit((source.starts[line - 1], _end(source.starts, line, source.text)), "")]
    heading = source.lines[shell.line - 1]
    counted = [m for m in re.finditer(r"(?<!\S)\d+(?!\S)", heading) if int(m[0]) == count]
    if counted and shell.line != line:
        start = source.starts[shell.line - 1]
        at = counted[0]
        edits.insert(0, Edit((start + at.start(), start + at.end()), str(count - 1)))
    return tuple(edits)


def _end(starts: list[int], line: int, text: str) -> int:
    """Where the line after one (counted from 1) begins."""
    return starts[line] if line < len(starts) else len(text)


def replaced_words(
    document: Document, lines: Iterable[int], old: str, new: str
) -> tuple[Edit, ...]:
    """Put new words in the place of old ones, once on each of the lines (counted from 1)."""
    source = document.source
    pattern = re.compile(rf"(?<![\w+*(-]){re.escape(old)}(?![\w+*(-])")
    edits = []
    for line in sorted(set(lines)):
        found = pattern.search(source.lines[line - 1])
        if found is not None:
            start = source.starts[line - 1]
            edits.append(Edit((start + found.start(), start + found.end()), new))
    return tuple(edits)


def label_lines(blocks: Iterable[Block], label: str, line: int) -> list[int]:
    """The lines on which a set's label stands: its own, and the headings of its blocks."""
    return [line, *(block.line for block in blocks if block.label == label)]


def reordered(shell: Shell, order: Sequence[int]) -> tuple[Edit, ...]:
    """Put a shell's rows in another order, number by number; nothing where one is not written."""
    if shell.cells is None:
        return ()
    columns = (None, *range(int(shell.coefficients.shape[1])))
    places = [[shell.cells.span(row, column) for column in columns] for row in range(len(order))]
    if len({span for row in places for span in row}) < len(order) * len(columns):
        return ()
    text = shell.cells.source.text
    return tuple(
        Edit(target, text[slice(*new)])
        for at, row in enumerate(order)
        for target, new in zip(places[at], places[row], strict=True)
        if at != row
    )
