"""Basis files without some of their functions, in the layout they came in."""

from collections.abc import Collection, Sequence
from dataclasses import dataclass, replace

import numpy as np

from overlapse.grammar.layouts import layout_of
from overlapse.grammar.model import BasisSet, Block, Cells, Document, Shell, read_only
from overlapse.grammar.reading import read_text

# Element, line and name of a shell, and the column of its coefficients.
Marked = frozenset[tuple[str, int, str, int]]


class PruneError(ValueError):
    """A file that cannot be written without the functions; the message says why."""


@dataclass(slots=True)
class _Kept(Cells):
    """Cells of a shell of which some rows and columns were taken out; ``inner`` has all."""

    inner: Cells | None = None
    rows: tuple[int, ...] = ()
    columns: tuple[int, ...] = ()
    whole: tuple[int, int] = (0, 0)

    def spellings(self, shape: tuple[int, int]) -> tuple[list[str], list[list[str]]]:
        assert self.inner is not None
        exponents, coefficients = self.inner.spellings(self.whole)
        return (
            [exponents[row] for row in self.rows],
            [[coefficients[row][column] for column in self.columns] for row in self.rows],
        )


def pruned_text(document: Document, marked: Marked) -> tuple[str, tuple[str, ...]]:
    """The text without the marked functions, and what could not be kept of it.

    Where whole shells go and the layout counts nothing, their lines are taken out and all else
    stays as it is.  Otherwise the layout's writer makes the text anew: numbers keep their spelling,
    comments are lost.  Either way the text is read back and compared.  Raises PruneError if no
    function of an element would stay, or if the text does not read back as it should.
    """
    wanted = _without(document, marked)
    edited = _cut(document, marked)
    if edited is not None and _same(read_text(edited, layout=document.layout), wanted):
        return edited, ()
    written = layout_of(document.layout).write(wanted)
    if not _same(read_text(written.text, layout=document.layout), wanted):
        raise PruneError(f"{document.path}: layout {document.layout} cannot hold what is left")
    losses = ["comments"] if document.remarks else []
    return written.text, (*losses, *written.losses)


def encoded(document: Document, text: str) -> bytes:
    """A text in the encoding of the document it was made of."""
    mark = b"\xef\xbb\xbf" if document.source.marked else b""
    return mark + text.encode(document.source.encoding, "replace")


def _without(document: Document, marked: Marked) -> Document:
    return replace(document, sets=tuple(_set(members, marked) for members in document.sets))


def _set(members: BasisSet, marked: Marked) -> BasisSet:
    return replace(members, blocks=tuple(_block(block, marked) for block in members.blocks))


def _block(block: Block, marked: Marked) -> Block:
    shells = [
        part
        for name, shell in zip(block.names, block.shells, strict=True)
        for part in _parts(shell, _gone(block, name, shell, marked))
    ]
    if not shells and block.shells:
        raise PruneError(f"{block.symbol} (line {block.line}) would be left without functions")
    return replace(block, shells=tuple(shells)) if tuple(shells) != block.shells else block


def _gone(block: Block, name: str, shell: Shell, marked: Marked) -> list[int]:
    """The columns of a shell that are marked."""
    columns = range(shell.coefficients.shape[1])
    return [c for c in columns if (block.symbol, shell.line, name, c) in marked]


def _parts(shell: Shell, gone: Collection[int]) -> list[Shell]:
    """What is left of a shell: itself, nothing, or a part; two where s and p now differ."""
    count = shell.coefficients.shape[1]
    kept = [column for column in range(count) if column not in gone]
    if len(kept) == count:
        return [shell]
    each = shell.columns_per_l
    by_l = [[c for c in kept if c // each == at] for at in range(len(shell.angular))]
    places = [[c % each for c in columns] for columns in by_l]
    if all(place == places[0] for place in places) and kept:
        return [_part(shell, shell.angular, kept)]
    return [
        _part(shell, (l,), columns)
        for l, columns in zip(shell.angular, by_l, strict=True)
        if columns
    ]


def _part(shell: Shell, angular: tuple[int, ...], columns: Sequence[int]) -> Shell:
    table = shell.coefficients[:, columns]
    rows = np.flatnonzero((table != 0.0).any(axis=1))
    cells = shell.cells
    if cells is not None:
        cells = _Kept(
            cells.source,
            cells.first,
            cells.last,
            cells.grid,
            inner=cells,
            rows=tuple(rows.tolist()),
            columns=tuple(columns),
            whole=(shell.coefficients.shape[0], shell.coefficients.shape[1]),
        )
    return Shell(
        angular, read_only(shell.exponents[rows]), read_only(table[rows]), shell.line, cells
    )


def _cut(document: Document, marked: Marked) -> str | None:
    """The text without the lines of the shells that go; None where only a part of one does."""
    lines: set[int] = set()
    for block in document.blocks:
        for name, shell in zip(block.names, block.shells, strict=True):
            gone = _gone(block, name, shell, marked)
            if not gone:
                continue
            if len(gone) < shell.coefficients.shape[1] or shell.cells is None:
                return None
            lines |= set(range(min(shell.line - 1, shell.cells.first), shell.cells.last))
    source = document.source
    ends = [*source.starts[1:], len(source.text)]
    return "".join(
        source.text[start:end]
        for line, (start, end) in enumerate(zip(source.starts, ends, strict=True))
        if line not in lines
    )


def _same(found: Document, wanted: Document) -> bool:
    """Whether a text was read as the functions and potentials that were meant."""
    if any(fault.severity == "error" for fault in found.faults):
        return False
    one = [_numbers(block) for block in found.blocks]
    return one == [_numbers(block) for block in wanted.blocks]


def _numbers(block: Block) -> object:
    functions = sorted(
        (f.l, f.exponents.tolist(), f.coefficients.tolist()) for _, f in block.contracted
    )
    core = block.potential.electrons if block.potential else None
    return block.atomic_number, functions, core
