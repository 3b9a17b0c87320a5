"""Measuring: from atoms with their blocks to what is known of their overlap matrix."""

from collections.abc import Iterable, Iterator, Sequence
from typing import NamedTuple

from overlapse.grammar.model import Floats
from overlapse.rules.measured.blaming import blame, described
from overlapse.rules.measured.probe import NEAR, Dropped, Lattice, Left, Probe
from overlapse.rules.measured.site import Site, formula, kind_of
from overlapse.rules.physics.inertia import Matrix
from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.molecule import affordable
from overlapse.rules.physics.onecentre import eigenvalues
from overlapse.rules.physics.outlook import LOOKED_AT, Outlook, foresee, outlook
from overlapse.rules.physics.placed import Functions, Ints, Placed, lay_out, radial_norms
from overlapse.rules.physics.pruning import Drop, shells_to_drop
from overlapse.rules.physics.spectrum import LADDER, Spectrum, smallest, spectrum
from overlapse.rules.physics.worth import Worth, worth_of


class Wanted(NamedTuple):
    """What to measure: removal threshold, tolerance of pruning, and whether it is atom by atom.

    mesh: number of k points along each vector of a cell.  values: all eigenvalues are wanted.
    charge, unpaired: of the molecule, for the outlook; unpaired electrons the fewest possible where
    None.
    """

    threshold: float = 1e-6
    tolerance: float = 1e-7
    per_atom: bool = True
    mesh: tuple[int, int, int] = (2, 2, 2)
    values: bool = False
    charge: int = 0
    unpaired: int | None = None


class Label(NamedTuple):
    """Which frame it is: path of the geometry, place in it counted from 1, comment line."""

    geometry: str = "<geometry>"
    frame: int = 1
    title: str = ""


Pruned = tuple[tuple[Dropped, ...], Left | None]


def probe(sites: Sequence[Site], wanted: Wanted, label: Label = Label()) -> Probe:  # noqa: B008
    """Measure one molecule.

    Raises `overlapse.rules.physics.placed.NotNormalisable` where a function has no norm.
    """
    # One large matrix at a time, and no more than one copy of it.
    turned = turned_spherical(sites)
    counterpart = in_short(overlap([s.placed for s in turned])) if turned else None
    placed = [site.placed for site in sites]
    matrix = overlap(placed)
    norms = conventional(matrix, placed)
    found = steps(matrix, wanted)
    pruned = pruned_set(matrix, norms, sites, wanted, found)
    return assembled(sites, wanted, label, matrix, found, pruned, counterpart, norms=norms)


def conventional(matrix: Matrix, placed: Sequence[Placed]) -> Floats | None:
    """Give an overlap matrix, in place, the usual norms of Cartesian functions.

    The norms, shape (n,); None without any such function.
    """
    norms = radial_norms(placed)
    if (norms == 1.0).all():
        return None
    _scaled(matrix, norms)
    return norms


def _scaled(matrix: Matrix, norms: Floats) -> None:
    matrix *= norms[:, None]
    matrix *= norms


def ladder_of(wanted: Wanted) -> tuple[float, ...]:
    """Where eigenvalues are counted: the ladder, and on both sides of the removal threshold."""
    edges = (wanted.threshold / NEAR, wanted.threshold, wanted.threshold * NEAR)
    return tuple(sorted({*LADDER, *edges}, reverse=True))


def steps(matrix: Matrix, wanted: Wanted) -> Spectrum:
    """The spectrum with all counts."""
    return spectrum(matrix, ladder_of(wanted))


def assembled(
    sites: Sequence[Site],
    wanted: Wanted,
    label: Label,
    matrix: Matrix,
    found: Spectrum,
    pruned: Pruned,
    counterpart: Left | None,
    lattice: Lattice | None = None,
    functions: Functions | None = None,
    norms: Floats | None = None,
) -> Probe:
    """All that is known of a matrix, in one piece; ``functions`` are its own, all if None.

    norms: as of `conventional`; they are taken out of the matrix, which is lost.
    """
    if functions is None:
        functions = lay_out([site.placed for site in sites])
    low, step, high = wanted.threshold / NEAR, wanted.threshold, wanted.threshold * NEAR
    small = blame(matrix, functions, sites, found, high)
    values = tuple(eigenvalues(matrix).tolist()) if wanted.values else ()
    if norms is not None:
        _scaled(matrix, 1.0 / norms)
    molecule = lattice is None and len(matrix) == found.functions
    return Probe(
        geometry=label.geometry,
        frame=label.frame,
        title=label.title,
        formula=formula(sites),
        atoms=len(sites),
        spherical=kind_of(sites),
        spectrum=found._replace(below={rung: found.below[rung] for rung in LADDER}),
        threshold=step,
        kept=found.functions - found.below[step],
        near=found.below[high] - found.below[low],
        outlook=_outlook(sites, wanted, matrix, found.smallest, norms, molecule),
        tolerance=wanted.tolerance,
        blame=small,
        drop=pruned[0],
        after=pruned[1],
        counterpart=counterpart,
        lattice=lattice,
        fitting=any(site.fitting for site in sites),
        files=tuple(dict.fromkeys(site.path for site in sites)),
        values=values,
    )


def _outlook(
    sites: Sequence[Site],
    wanted: Wanted,
    matrix: Matrix,
    lowest: float,
    norms: Floats | None,
    molecule: bool,
) -> Outlook:
    """The outlook; by the eigenvalue alone where no field can be made of a whole molecule, and for
    functions that are for fitting.

    lowest: smallest eigenvalue of the matrix with the ``norms`` that it has no longer.
    """
    if norms is not None and lowest < LADDER[0]:  # above, norms do not matter
        lowest = smallest(matrix)
    placed = [site.placed for site in sites]
    if (
        lowest >= LOOKED_AT
        or not molecule
        or any(site.fitting for site in sites)
        or not affordable(placed, len(matrix))
    ):
        return outlook(matrix, smallest=lowest)
    return foresee(
        placed,
        matrix,
        kinetic(placed),
        lay_out(placed),
        empty=_empty(sites),
        charge=wanted.charge,
        unpaired=wanted.unpaired,
        smallest=lowest,
    )


def _empty(sites: Sequence[Site]) -> list[int]:
    """Indices of the atoms that only carry functions."""
    return [k for k, site in enumerate(sites) if site.atom.ghost]


def in_short(matrix: Matrix) -> Left:
    """Number of functions, smallest eigenvalue and condition number."""
    found = spectrum(matrix, ())
    return Left(found.functions, found.smallest, found.condition)


def turned_spherical(sites: Sequence[Site]) -> list[Site]:
    """The same with spherical functions, where some are Cartesian; nothing where none are."""
    if all(site.spherical or max(site.block.counts, default=0) < 2 for site in sites):
        return []
    return [site._replace(spherical=True) for site in sites]


# ---- what to drop


def pruned_set(
    matrix: Matrix, norms: Floats | None, sites: Sequence[Site], wanted: Wanted, found: Spectrum
) -> Pruned:
    """What the Cholesky choice takes away, and what it leaves.

    norms: as of `conventional`.  A pivot is a diagonal element of a
    Schur complement, so it is never below the smallest eigenvalue: above the tolerance nothing can
    go.
    """
    if found.smallest >= wanted.tolerance:
        return (), None
    placed = [site.placed for site in sites]
    worth = _worth(matrix, norms, sites, wanted)
    pruning = shells_to_drop(
        matrix,
        lay_out(placed),
        placed,
        wanted.tolerance,
        "atom" if wanted.per_atom else "element",
        None if worth is None else worth.loss,
    )
    if not pruning.drops:
        return (), None
    loss = None if worth is None else worth.loss(pruning.kept)
    left = Left(len(pruning.kept), pruning.smallest, pruning.condition, loss)
    return tuple(as_dropped(pruning.drops, sites, wanted)), left


def _worth(
    matrix: Matrix, norms: Floats | None, sites: Sequence[Site], wanted: Wanted
) -> Worth | None:
    """The field that tells what functions are worth; None where none is made."""
    placed = [site.placed for site in sites]
    if any(site.fitting for site in sites) or not affordable(placed, len(matrix)):
        return None
    plain = matrix.copy()
    if norms is not None:
        _scaled(plain, 1.0 / norms)
    return worth_of(
        placed,
        plain,
        kinetic(placed),
        empty=_empty(sites),
        charge=wanted.charge,
        unpaired=wanted.unpaired,
    )


def as_dropped(drops: Iterable[Drop], sites: Sequence[Site], wanted: Wanted) -> Iterator[Dropped]:
    """What was chosen to be dropped, with its places in the files."""
    for drop in drops:
        function = described(sites[drop.like], drop.shell, drop.column, drop.exponent)
        yield Dropped(function, drop.like + 1 if wanted.per_atom else 0)


def some_of(functions: Functions, at: Ints) -> Functions:
    """Some of the functions, by their indices."""
    return Functions(
        functions.atom[at],
        functions.shell[at],
        functions.column[at],
        functions.l[at],
        functions.component[at],
        functions.exponent[at],
    )
