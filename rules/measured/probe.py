"""What was measured of a set in a real geometry; rules judge it, reports show it.

Plain data: no block and no text hangs on it, so that it can be sent between processes.
"""

from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:  # a plain audit has no use for what they import
    from overlapse.rules.physics.outlook import Outlook
    from overlapse.rules.physics.spectrum import Spectrum

NEAR = 3.0  # a factor: eigenvalues this close to a threshold may fall on either side of it


class Function(NamedTuple):
    """A contracted function of a basis file: where it stands and what it is.

    path, line: of its shell's heading.  shell: its name, "s-4"; column: of its coefficients,
    counted from 0, and name: the shell's with the column, "s-4/2", where the contraction is
    general.  letter: "s" or "p" where the shell has both, else "".  exponent: bohr**-2, the
    smallest with weight in the contraction.  outermost: a lone primitive, and the loosest of its
    angular momentum.
    """

    path: str
    line: int
    element: str
    shell: str
    name: str
    column: int
    letter: str
    exponent: float
    outermost: bool = False

    def __str__(self) -> str:
        return f"{' '.join(self.words)} ({self.exponent:.4g})"

    @property
    def words(self) -> tuple[str, ...]:
        """Element, shell, and the part of a shared shell."""
        return (self.element, self.name, *([self.letter] if self.letter else []))


class Share(NamedTuple):
    """Part of a vanishing combination: the squared weight of a function, all components together.

    atom: its number in the geometry, counted from 1, 0 where the atoms of an element are summed.
    """

    weight: float
    function: Function
    atom: int = 0


class Small(NamedTuple):
    """A small eigenvalue, and the functions that make up its combination, the weightiest first.

    shares: atom by atom.  kinds: the same, summed over the atoms that have one block.
    """

    value: float
    shares: tuple[Share, ...]
    kinds: tuple[Share, ...]


class Dropped(NamedTuple):
    """A function that pruning takes away: from one atom, or (atom 0) from all of its element."""

    function: Function
    atom: int = 0


class Left(NamedTuple):
    """Another matrix in short: number of functions, smallest eigenvalue, condition number.

    loss: energy that a field loses with these functions alone, hartree, as an approximate field has
    it (`overlapse.rules.physics.worth`); None where none was made.
    """

    functions: int
    smallest: float
    condition: float
    loss: float | None = None


class AtPoint(NamedTuple):
    """Smallest eigenvalue at one k point (fractions of the reciprocal vectors)."""

    k: tuple[float, float, float]
    smallest: float


@dataclass(frozen=True)
class Lattice:
    """What a cell adds to the numbers of its worst k point.

    points: smallest eigenvalues, the centre of the zone first.  bound: of the error that cutting
    the sums off leaves in an eigenvalue.  reach: how far the sums went, bohr.  cut: the smallest
    eigenvalue of the worst point when images beyond ``cut_at`` (bohr) are left out, as a program
    with looser limits does.  loose: functions with an exponent below 0.3 bohr**-2.
    """

    points: tuple[AtPoint, ...]
    bound: float
    reach: float
    cut: float
    cut_at: float
    loose: tuple[Function, ...] = ()


@dataclass(frozen=True)
class Probe:
    """One frame of one geometry with the functions that were chosen for it.

    threshold: below it a program removes combinations; kept: how many orbitals it would be left
    with; near: eigenvalues within a factor of three of it.  spherical: None where both kinds
    occur.  drop, after: what the Cholesky choice at ``tolerance`` takes away and what it leaves
    (None where nothing is taken).  counterpart: the same with spherical functions, where some are
    Cartesian.  fitting: the functions are for fitting, so that no field is solved in them.
    files: paths of the basis files.  values: all eigenvalues, rising, where they were asked for.
    """

    geometry: str
    frame: int
    title: str
    formula: str
    atoms: int
    spherical: bool | None
    spectrum: "Spectrum"
    threshold: float
    kept: int
    near: int
    outlook: "Outlook"
    tolerance: float
    blame: tuple[Small, ...] = ()
    drop: tuple[Dropped, ...] = ()
    after: Left | None = None
    counterpart: Left | None = None
    lattice: Lattice | None = None
    fitting: bool = False
    files: tuple[str, ...] = ()
    values: tuple[float, ...] = ()

    @property
    def smallest(self) -> float:
        return self.spectrum.smallest

    @property
    def at_most(self) -> str:
        """A word before the smallest eigenvalue, where only a bound of it is known."""
        return "at most " if self.spectrum.method.startswith("bounds") else ""

    @property
    def culprit(self) -> Function | None:
        """The function with the largest share in the smallest eigenvalue that was looked into."""
        return self.blame[0].kinds[0].function if self.blame else None

    @property
    def where(self) -> str:
        """The frame in words, for messages."""
        return f"{self.geometry}, frame {self.frame}"
