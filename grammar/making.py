"""From drafts to the model: all numbers converted in one go, blocks made, sets told apart."""

from collections.abc import Iterator
from contextlib import suppress
from itertools import groupby

import numpy as np

from overlapse.grammar.checks import Checks
from overlapse.grammar.drafts import BlockDraft, ShellDraft
from overlapse.grammar.model import (
    BasisSet,
    Block,
    Cells,
    Document,
    Floats,
    Shell,
    Span,
    read_only,
)
from overlapse.grammar.numbers import FORTRAN, has_only_characters
from overlapse.grammar.repairing import block_span

MOST = 2_000  # primitives of a shell, or functions of an element; published sets stay below 500


class Making(Checks):
    """Makes the document of what was collected."""

    blocks: list[BlockDraft]
    pieces: list[str]  # of text, whose words are the numbers of the shells
    count: int  # of these numbers
    _has_holes = False  # whether a number of a shell cannot be read

    def document(self, reason: str = "", raw_primitives: bool = False) -> Document:
        """Convert all numbers and make the model of what was collected."""
        values = self._convert()
        if not self.blocks and not self.faults:
            self.fault(
                "form.syntax",
                (0, 0),
                "nothing was found here that describes an element",
                severity="warning",
                remedy="check that this is the file you meant, and that it is whole",
            )
        blocks = [block for block in self.blocks if block.number is not None]
        made = [self._block(block, values) for block in blocks]
        return Document(
            self.source,
            self.layout,
            tuple(self._sets(blocks, made)),
            tuple(self.remarks),
            tuple(sorted(self.faults, key=lambda fault: fault.span)),
            reason,
            raw_primitives,
        )

    def _convert(self) -> Floats:
        """All numbers of all shells as one read-only array; NaN where one cannot be read."""
        text = " ".join(self.pieces)
        for sign in self.separators:
            text = text.replace(sign, " ")
        if "D" in text or "d" in text:
            text = text.translate(FORTRAN)
        values = np.array([np.nan])
        if has_only_characters(text):
            with suppress(ValueError):  # a slip among the numbers; found below
                values = np.fromiter(map(float, text.split()), np.float64)
        if not np.isfinite(values).all():
            values = self._convert_one_by_one()
        self._has_holes = bool(np.isnan(values).any())
        values.flags.writeable = False
        return values

    def _convert_one_by_one(self) -> Floats:
        values = np.full(self.count, np.nan)
        for block in self.blocks:
            for start, sharing in groupby(block.shells, key=lambda shell: shell.start):
                shells = list(sharing)
                names = {place: shell.name for shell in shells[::-1] for place in shell.places()}
                run = shells[0].run or self.rows_between(shells[0].first, shells[0].last)
                for at, (word, index, ordinal) in enumerate(run.words()):
                    name = names.get(at, shells[-1].name)
                    value = self.number(word, index, ordinal, block.symbol, name)
                    values[start + at] = np.nan if value is None else value
        return values

    def _block(self, block: BlockDraft, values: Floats) -> Block:
        shells = list(block.ready)
        complete = block.complete
        source, comment = self.source, self.comment
        pattern, leading = self.word_pattern, self.leading
        for draft in block.shells:
            exponents, coefficients = self._table(draft, values)
            if self._has_holes and np.isnan(np.append(exponents, coefficients)).any():
                complete = False
                continue
            skip = draft.run.before[0] if draft.run is not None and draft.run.before else 0
            cells = Cells(
                source, draft.first, draft.last, draft.grid, comment, pattern, skip, leading
            )
            if draft.scale != 1.0:
                with np.errstate(over="ignore"):
                    exponents = exponents * np.square(draft.scale)
                if not np.isfinite(exponents).all():
                    complete = False
                    self._say_overflow(block, draft)
                    continue
            # Shapes are right by the way the tables were cut, and all numbers are finite.
            shells.append(
                Shell.checked(draft.angular, exponents, coefficients, draft.heading + 1, cells)
            )
        if self._is_absurd(block, shells):
            complete, shells = False, []
        if block.number is None:
            raise AssertionError("only blocks of known elements are made")
        return Block(
            block.number,
            tuple(shells),
            block.potential,
            block.label,
            block.functions,
            complete,
            block.line + 1,
            block.end + 1,
        )

    def _is_absurd(self, block: BlockDraft, shells: list[Shell]) -> bool:
        """Whether a block is so large that it is none; matrices over it would burst the memory."""
        drafts = block.shells
        if drafts and not block.ready:
            count, columns = drafts[-1].shape
            if drafts[-1].start + count * (1 + columns) - drafts[0].start <= MOST:
                return False  # so few numbers cannot make so many functions
        longest = max((len(shell.exponents) for shell in shells), default=0)
        functions = sum(shell.coefficients.shape[1] for shell in shells)
        if max(longest, functions) <= MOST:
            return False
        count, what = (longest, "primitives in one shell")
        if functions > longest:
            count, what = (functions, "contracted functions")
        self.fault_line(
            "form.count",
            block.line,
            f"{count:,} {what} of {block.symbol}: no basis set has so many; not judged",
            element=block.symbol,
            measured=count,
            limit=MOST,
            remedy="check that this is the file you meant, and that it is whole",
        )
        return True

    def _say_overflow(self, block: BlockDraft, draft: ShellDraft) -> None:
        self.fault_line(
            "form.number",
            draft.heading,
            f"the scale factor {draft.scale:g} makes an exponent too large for a double-precision "
            "number",
            element=block.symbol,
            shell=draft.name,
            measured=draft.scale,
            expected=1.0,
            remedy="mend the scale factor: exponents are multiplied by its square",
        )

    @staticmethod
    def _table(draft: ShellDraft, values: Floats) -> tuple[Floats, Floats]:
        """Exponents (nprim,) and coefficients (nprim, ncontr) of a draft, views where possible."""
        (count, columns), start = draft.shape, draft.start
        e0, es, c0, ci, cj = draft.grid
        if draft.unit:
            first = start + e0
            return values[first : first + es * count : es], read_only(np.eye(count))
        if es == 1 and cj == 1 and ci == columns:  # a list and a matrix
            first, matrix = start + e0, start + c0
            end = matrix + count * columns
            if columns == 1:
                return values[first : first + count], values[matrix:end, None]
            return values[first : first + count], values[matrix:end].reshape(count, columns)
        if cj == 1 and e0 < ci == es >= c0 + columns:  # rows
            end = start + count * es
            if columns == 1:
                return values[start + e0 : end : es], values[start + c0 : end : es, None]
            table = values[start:end].reshape(count, es)
            return table[:, e0], table[:, c0 : c0 + columns]
        rows = np.arange(count)
        cells = start + c0 + ci * rows[:, None] + cj * np.arange(columns)
        return read_only(values[start + e0 + es * rows]), read_only(values[cells])

    def _sets(self, drafts: list[BlockDraft], made: list[Block]) -> Iterator[BasisSet]:
        """Group blocks into sets: by section, and anew where the list of elements starts again."""
        sections: dict[str, list[int]] = {}
        for at, draft in enumerate(drafts):
            sections.setdefault(draft.section, []).append(at)
        for members in sections.values():
            for group in self._restarts(members, made):
                first = drafts[group[0]]
                yield BasisSet(
                    tuple(made[at] for at in group), first.label, first.role, first.line + 1
                )

    def _restarts(self, members: list[int], made: list[Block]) -> Iterator[list[int]]:
        """Split the blocks of a section where several elements in a row come a second time."""
        group: list[int] = []
        seen: dict[int, Block] = {}
        for position, at in enumerate(members):
            block = made[at]
            if block.atomic_number in seen:
                following = [
                    made[other].atomic_number for other in members[position : position + 3]
                ]
                from_the_start = block.atomic_number == made[group[0]].atomic_number
                if from_the_start and len(set(following)) > 1 and all(z in seen for z in following):
                    self._say_restart(block, seen[block.atomic_number])
                    yield group
                    group, seen = [], {}
                else:
                    self._say_repeat(block, seen[block.atomic_number])
            seen.setdefault(block.atomic_number, block)
            group.append(at)
        if group:
            yield group

    def _say_restart(self, block: Block, before: Block) -> None:
        self.fault_line(
            "form.repeat",
            block.line - 1,
            f"the list of elements starts again here ({block.symbol} was on line {before.line}): "
            "judged as a second set",
            severity="note",
            element=block.symbol,
            remedy="keep one set per file, or name the sets",
        )

    def _say_repeat(self, block: Block, before: Block) -> None:
        equal = len(block.shells) == len(before.shells) and all(
            a.angular == b.angular
            and np.array_equal(a.exponents, b.exponents)
            and np.array_equal(a.coefficients, b.coefficients)
            for a, b in zip(block.shells, before.shells, strict=False)
        )
        how = "with the same numbers" if equal else "with other numbers"
        self.fault_line(
            "form.repeat",
            block.line - 1,
            f"{block.symbol} was already given on line {before.line}, {how}",
            element=block.symbol,
            measured=2,
            expected=1,
            edits=((self._span_of(block), ""),) if equal else (),
            remedy="keep one of the two: a reader may add them up, or take either",
        )

    def _span_of(self, block: Block) -> Span:
        return block_span(self.source, self.bodies, block.line, block.end)
