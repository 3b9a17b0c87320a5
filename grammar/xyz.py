"""XYZ and extended XYZ: a number of atoms, a comment line, and a row for each atom; once or often.

    3
    water, angstrom
    O   0.000000   0.000000   0.117300
    H   0.000000   0.757200  -0.469200
    H   0.000000  -0.757200  -0.469200

Columns behind the coordinates are passed over.
"""

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from math import isfinite

import numpy as np

from overlapse.grammar.atomnames import name_of
from overlapse.grammar.extendedxyz import Columns, Comment, read_comment
from overlapse.grammar.geometry import BOHR, Atom, Frame, Geometry, Unit
from overlapse.grammar.model import Fault, Severity
from overlapse.grammar.numbers import FORTRAN, read_number
from overlapse.grammar.source import Source

_COUNT = re.compile(r"\s*\d+\s*")
_MANY = 20  # faults of one kind in a row are enough to see what is wrong


def recognised(source: Source) -> bool:
    """Whether the first line that is not empty is a count, as each frame begins with one."""
    first = next((line for line in source.lines if line.strip()), "")
    return _COUNT.fullmatch(first) is not None


def read(source: Source, unit: Unit | None = None) -> Geometry:
    """Read all frames; ``unit`` wins over what the comment lines say."""
    reader = _Reader(source, unit)
    frames = tuple(reader.frames())
    return Geometry(source, frames, tuple(reader.faults), "xyz", reader.told[0], reader.told[1])


def _scaled(atom: Atom, factor: float) -> Atom:
    x, y, z = atom.position
    return atom._replace(position=(x * factor, y * factor, z * factor))


@dataclass
class _Reader:
    source: Source
    wanted: Unit | None
    faults: list[Fault] = field(default_factory=list)
    told: tuple[Unit, str] = ("angstrom", "the habit of the format; the file does not say")

    def frames(self) -> Iterator[Frame]:
        lines, at, index = self.source.lines, 0, 0
        if self.wanted:
            self.told = (self.wanted, "the option")
        while at < len(lines):
            if not lines[at].strip():
                at += 1
            elif _COUNT.fullmatch(lines[at]):
                index += 1
                frame, at = self._frame(at, index)
                if frame is not None:
                    yield frame
            else:
                start = at
                while at < len(lines) and not _COUNT.fullmatch(lines[at]):
                    at += 1
                self._surplus(start, at, index)

    def _surplus(self, start: int, end: int, index: int) -> None:
        rows = sum(bool(line.strip()) for line in self.source.lines[start:end])
        self._say(
            "form.count",
            f"{rows} row{'s' * (rows != 1)} more than the frame announces"
            if index
            else "a frame begins with its number of atoms",
            start,
            "mend the number of atoms in the frame's first line, or remove the rows",
        )

    def _frame(self, at: int, index: int) -> tuple[Frame | None, int]:
        lines = self.source.lines
        faults = len(self.faults)
        announced = int(lines[at]) if len(lines[at].strip()) < 10 else 10**9
        comment_line = lines[at + 1] if at + 1 < len(lines) else ""
        comment = read_comment(comment_line, self._start(at + 1))
        self.faults += comment.faults
        rows, end = self._taken(at + 2, announced)
        if len(rows) < announced:
            self._too_few(at, announced, len(rows), comment_line)
        factor = 1.0 if self._unit(comment, at + 1) == "bohr" else 1.0 / BOHR
        atoms = tuple(_scaled(atom, factor) for atom in self._atoms(rows, comment.columns))
        if not atoms:
            if announced == 0:
                self._say("form.count", "a frame of no atoms", at, "remove it", severity="warning")
            return None, end
        cell = np.array(comment.lattice).reshape(3, 3) * factor if comment.lattice else None
        periodic = comment.periodic
        cell = cell if any(periodic) else None
        complete = all(fault.severity != "error" for fault in self.faults[faults:])
        return Frame(index, atoms, cell, periodic, comment_line, at + 1, complete), end

    def _taken(self, first: int, announced: int) -> tuple[list[int], int]:
        """The lines of a frame's rows, and the line behind them.

        The next frame's count, or the end of the text, before all have come: some are missing.
        """
        lines, rows, at, gap = self.source.lines, list[int](), first, -1
        while at < len(lines) and len(rows) < announced:
            if _COUNT.fullmatch(lines[at]):
                break
            if lines[at].strip():
                if gap >= 0:
                    self._say("form.syntax", "an empty line within a frame", gap, "remove it")
                    gap = -1
                rows.append(at)
            elif gap < 0:
                gap = at
            at += 1
        return rows, at

    def _too_few(self, at: int, announced: int, found: int, comment: str) -> None:
        is_row = len(comment.split()) >= 4 and name_of(comment.split()[0]) is not None
        because = (
            "; its second line looks like an atom: is the comment line missing?" if is_row else ""
        )
        self._say(
            "form.count",
            f"the frame announces {announced} atom{'s' * (announced != 1)}, {found} "
            f"row{'s follow' if found != 1 else ' follows'}{because}",
            at,
            "mend the number, restore the lost rows"
            + (", or put a comment line (it may be empty) before the first atom" if is_row else ""),
            measured=found,
            limit=announced,
        )

    def _unit(self, comment: Comment, line: int) -> Unit:
        if self.wanted is not None:
            if comment.unit not in (None, self.wanted):
                self._say(
                    "form.syntax",
                    f"the comment line says {comment.unit}, the option {self.wanted}",
                    line,
                    "leave the option out, or mend the comment line",
                    severity="warning",
                )
            return self.wanted
        if comment.unit is not None:
            self.told = (comment.unit, f"the comment on line {line + 1}")
            return comment.unit
        return "angstrom"

    def _atoms(self, rows: list[int], columns: Columns) -> Iterator[Atom]:
        told = 0
        for line in rows:
            words = self.source.lines[line].split()
            faults = len(self.faults)
            atom = self._atom(line, words, columns)
            if atom is not None:
                yield atom
            if len(self.faults) > faults:
                told += 1
                if told == _MANY:
                    self._say(
                        "form.syntax",
                        f"more than {_MANY} rows of this frame cannot be read; the others are "
                        "not looked at",
                        line,
                        "look whether this is a geometry at all",
                    )
                    return

    def _atom(self, line: int, words: list[str], columns: Columns) -> Atom | None:
        if len(words) < max(columns.position + 3, columns.name + 1):
            self._say(
                "form.syntax",
                f"a row has a name and three coordinates, this one {len(words)} "
                f"word{'s' * (len(words) != 1)}",
                line,
                "write symbol, x, y and z",
            )
            return None
        name = name_of(words[columns.name])
        values = [
            self._number(line, k, words[k]) for k in range(columns.position, columns.position + 3)
        ]
        if name is None:
            self._say(
                "form.element",
                f"{words[columns.name]!r} is not the name of an element",
                line,
                "write an element's symbol; a ghost as Gh(H), @H, X-H or H_ghost",
                word=columns.name,
            )
            return None
        if name.atomic_number == 0:
            self._say(
                "form.element",
                f"{words[columns.name]!r} is a point without an element; it is left out",
                line,
                "",
                word=columns.name,
                severity="note",
            )
            return None
        x, y, z = values
        if x is None or y is None or z is None:
            return None
        column = self.source.lines[line].index(words[columns.name]) + 1
        return Atom(name.atomic_number, (x, y, z), name.ghost, line + 1, column)

    def _number(self, line: int, ordinal: int, word: str) -> float | None:
        try:
            value = float(word.translate(FORTRAN))
        except ValueError:
            value = float("nan")
        # The quick way also takes spellings that are no numbers of a table: 1_0, nan, infinity.
        if isfinite(value) and "_" not in word and word.isascii():
            return value
        reading = read_number(word)
        self._say(
            "form.number",
            f"{word!r} {reading.slip or 'is not a number'}"
            + (f"; {reading.spelling} was probably meant" if reading.spelling else ""),
            line,
            "" if reading.value is not None else "write the coordinate",
            word=ordinal,
            expected=reading.value,
        )
        return reading.value

    def _start(self, line: int) -> int:
        starts = self.source.starts
        return starts[line] if line < len(starts) else len(self.source.text)

    def _say(
        self,
        rule: str,
        message: str,
        line: int,
        remedy: str,
        *,
        word: int | None = None,
        severity: Severity = "error",
        measured: float | None = None,
        limit: float | None = None,
        expected: float | None = None,
    ) -> None:
        span = (
            self.source.span_of_line(line) if word is None else self.source.span_of_word(line, word)
        )
        self.faults.append(
            Fault(
                rule, message, span, severity,
                measured=measured, limit=limit, expected=expected, remedy=remedy,
            )
        )  # fmt: skip
