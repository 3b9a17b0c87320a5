"""Where atoms stand: molecules, and cells that repeat.

Positions are in bohr.  XYZ and extended XYZ are read here (`overlapse.grammar.xyz`); files of other
kinds by the library ASE, where the extra ``ase`` is installed.
"""

import os
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal, NamedTuple

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.model import Fault, Floats, read_only
from overlapse.grammar.source import Source

Unit = Literal["angstrom", "bohr"]
# CODATA recommended value of 2022, in angstrom: E. Tiesinga et al., physics.nist.gov/constants.
BOHR = 0.529177210544


class GeometryError(ValueError):
    """A geometry that cannot be read at all; the message says why, and what would help."""


class Atom(NamedTuple):
    """A nucleus, or with ``ghost`` only its functions.

    atomic_number: Z.  position: bohr.  line, column: of its name in the text, counted from 1.
    """

    atomic_number: int
    position: tuple[float, float, float]
    ghost: bool = False
    line: int = 1
    column: int = 1

    @property
    def symbol(self) -> str:
        return symbol_of(self.atomic_number)


@dataclass(frozen=True)
class Frame:
    """One arrangement of atoms.

    index: place in the file, counted from 1.  cell: shape (3, 3), bohr, rows are the vectors, or
    None.  periodic: whether it repeats along each of them.  title: the comment line as it stands.
    line: line of its first row, counted from 1.  complete: False where a row could not be read, so
    that what is said of the frame would not hold for what was meant.
    """

    index: int
    atoms: tuple[Atom, ...]
    cell: Floats | None = None
    periodic: tuple[bool, bool, bool] = (False, False, False)
    title: str = ""
    line: int = 1
    complete: bool = True

    def __post_init__(self) -> None:
        if self.cell is not None:
            object.__setattr__(self, "cell", read_only(self.cell))
            if self.cell.shape != (3, 3):
                raise ValueError(f"a cell has shape (3, 3), not {self.cell.shape}")
        elif any(self.periodic):
            raise ValueError("what repeats needs a cell")

    @property
    def elements(self) -> tuple[int, ...]:
        """Atomic numbers that occur, rising."""
        return tuple(sorted({atom.atomic_number for atom in self.atoms}))


@dataclass(frozen=True)
class Geometry:
    """The frames of one file, with what was wrong in its text.

    layout: "xyz", or the name under which the library that read it knows its kind.  unit: in which
    the text gives lengths; unit_from: who says so, in words.
    """

    source: Source
    frames: tuple[Frame, ...]
    faults: tuple[Fault, ...] = ()
    layout: str = "xyz"
    unit: Unit = "angstrom"
    unit_from: str = ""

    @property
    def path(self) -> str:
        return self.source.path


def read(path: str | os.PathLike[str], *, unit: Unit | None = None) -> Geometry:
    """Read a geometry file; what is wrong with its text comes back in `Geometry.faults`.

    unit: of its lengths, over what the file says; without either, angstrom.  Raises OSError for a
    file that cannot be opened, GeometryError for one that is no geometry.
    """
    return read_bytes(Path(path).read_bytes(), os.fspath(path), unit=unit)


def read_bytes(data: bytes, path: str, *, unit: Unit | None = None) -> Geometry:
    """As `read`, for the bytes of a file."""
    from overlapse.grammar import xyz

    if b"\x00" not in data[:8192]:
        source = Source.decode(data, path)
        if xyz.recognised(source):
            return xyz.read(source, unit)
        if not source.text.strip():
            raise GeometryError(f"{path}: the file is empty")
        if Path(path).suffix.lower() in (".xyz", ".extxyz"):
            raise GeometryError(f"{path}: the first line of a frame is its number of atoms, alone")
    return _by_library(path)


def _by_library(path: str) -> Geometry:
    """Read a file of another kind with the library ASE, which gives angstrom."""
    try:
        from ase.io import read as read_any
        from ase.io.formats import filetype
    except ImportError as problem:
        raise GeometryError(
            f"{path} is no XYZ file; other kinds are read with the extra ase: "
            "pip install 'overlapse[ase]'"
        ) from problem
    try:
        images = read_any(path, index=":")
        kind = str(filetype(path))
        frames = tuple(_frame(index, image) for index, image in enumerate(images, 1))
    except Exception as problem:  # of many kinds: each of its readers has its own
        reason = " ".join(str(problem).split()) or type(problem).__name__
        raise GeometryError(f"{path} cannot be read as a geometry: {reason}") from problem
    if not any(frame.atoms for frame in frames):
        raise GeometryError(f"{path} holds no atoms")
    return Geometry(Source("", path), frames, (), kind, "angstrom", "the library that read it")


def _frame(index: int, image: Any) -> Frame:
    positions = (image.get_positions() / BOHR).tolist()
    x, y, z = (bool(flag) for flag in image.get_pbc())
    atoms = tuple(
        Atom(int(number), (place[0], place[1], place[2]))
        for number, place in zip(image.get_atomic_numbers(), positions, strict=True)
        if number > 0  # zero stands for a point without an element
    )
    cell = image.get_cell()[:] / BOHR if x or y or z else None
    return Frame(index, atoms, cell, (x, y, z))
