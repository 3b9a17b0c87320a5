"""Measuring: from atoms with their blocks to what is known of their overlap matrix."""

from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from typing import NamedTuple

import numpy as np

from overlapse.grammar.geometry import Atom
from overlapse.grammar.model import Block, Floats, letter_of
from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.onecentre import eigenvalues
from overlapse.rules.physics.outlook import LOOKED_AT, Outlook, foresee, outlook
from overlapse.rules.physics.placed import Functions, Ints, Placed, lay_out
from overlapse.rules.physics.pruning import Drop, shells_to_drop
from overlapse.rules.physics.spectrum import LADDER, SMALL, Matrix, Spectrum, lowest, spectrum
from overlapse.rules.probe import NEAR, Dropped, Function, Lattice, Left, Probe, Share, Small

_BLAMED = 12  # eigenvalues whose combinations are looked into
_TOLD = 12  # shares that are kept of each
_LEAST = 0.005  # share that is worth telling


class Site(NamedTuple):
    """An atom of a geometry and the block that was chosen for it, from the file at ``path``.

    fitting: the block is of a set for fitting, so that no field is solved in its functions.
    """

    atom: Atom
    path: str
    block: Block
    spherical: bool = True
    fitting: bool = False

    @property
    def placed(self) -> Placed:
        return Placed(self.block, self.atom.position, self.spherical)


class Wanted(NamedTuple):
    """What to measure: removal threshold, tolerance of pruning, and whether it is atom by atom.

    mesh: number of k points along each vector of a cell.  values: all eigenvalues are wanted.
    charge, unpaired: of the molecule, for the outlook; unpaired electrons the fewest possible where
    None.
    """

    threshold: float = 1e-6
    tolerance: float = 1e-7
    per_atom: bool = False
    mesh: tuple[int, int, int] = (2, 2, 2)
    values: bool = False
    charge: int = 0
    unpaired: int | None = None


def size(sites: Sequence[Site]) -> int:
    """Number of basis functions, without making any."""
    return sum(
        (2 * l + 1 if site.spherical else (l + 1) * (l + 2) // 2) * count
        for site in sites
        for l, count in site.block.counts.items()
    )


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
    placed = [site.placed for site in sites]
    matrix = overlap(placed)
    found = steps(matrix, wanted)
    pruned = pruned_set(matrix, lay_out(placed), sites, wanted, found)
    energies = kinetic(placed) if found.smallest < LOOKED_AT else None
    turned = turned_spherical(sites)
    counterpart = in_short(overlap([s.placed for s in turned])) if turned else None
    return assembled(sites, wanted, label, matrix, found, pruned, energies, counterpart)


def steps(matrix: Matrix, wanted: Wanted) -> Spectrum:
    """The spectrum, with counts at the ladder and on both sides of the removal threshold."""
    edges = (wanted.threshold / NEAR, wanted.threshold, wanted.threshold * NEAR)
    return spectrum(matrix, tuple(sorted({*LADDER, *edges}, reverse=True)))


def assembled(
    sites: Sequence[Site],
    wanted: Wanted,
    label: Label,
    matrix: Matrix,
    found: Spectrum,
    pruned: Pruned,
    energies: Floats | None,
    counterpart: Left | None,
    lattice: Lattice | None = None,
) -> Probe:
    """All that is known of a matrix, in one piece."""
    functions = lay_out([site.placed for site in sites])
    low, step, high = wanted.threshold / NEAR, wanted.threshold, wanted.threshold * NEAR
    return Probe(
        geometry=label.geometry,
        frame=label.frame,
        title=label.title,
        formula=formula(sites),
        atoms=len(sites),
        spherical=_spherical(sites),
        spectrum=found._replace(below={rung: found.below[rung] for rung in LADDER}),
        threshold=step,
        kept=found.functions - found.below[step],
        near=found.below[high] - found.below[low],
        outlook=_outlook(sites, wanted, matrix, found, energies),
        tolerance=wanted.tolerance,
        blame=blame(matrix, functions, sites, found, high),
        drop=pruned[0],
        after=pruned[1],
        counterpart=counterpart,
        lattice=lattice,
        fitting=any(site.fitting for site in sites),
        files=tuple(dict.fromkeys(site.path for site in sites)),
        values=tuple(eigenvalues(matrix).tolist()) if wanted.values else (),
    )


def _outlook(
    sites: Sequence[Site],
    wanted: Wanted,
    matrix: Matrix,
    found: Spectrum,
    energies: Floats | None,
) -> Outlook:
    """The outlook; by the eigenvalue alone for crystals and for functions that are for fitting."""
    if energies is None or any(site.fitting for site in sites):
        return outlook(matrix, smallest=found.smallest)
    placed = [site.placed for site in sites]
    return foresee(
        placed,
        matrix,
        energies,
        lay_out(placed),
        empty=[k for k, site in enumerate(sites) if site.atom.ghost],
        charge=wanted.charge,
        unpaired=wanted.unpaired,
        smallest=found.smallest,
    )


def _above(smallest: float) -> float:
    """A limit that the smallest eigenvalue is below, and few others."""
    return smallest + max(1e-9 * abs(smallest), 1e-15)


def _spherical(sites: Sequence[Site]) -> bool | None:
    kinds = {site.spherical for site in sites if max(site.block.counts, default=0) > 1}
    return None if len(kinds) > 1 else kinds.pop() if kinds else True


def formula(sites: Sequence[Site]) -> str:
    """Hill's order: carbon, hydrogen, the others by letter; ghosts apart."""
    parts = []
    for ghost in (False, True):
        symbols = Counter(site.atom.symbol for site in sites if site.atom.ghost == ghost)
        first = ("C", "H") if "C" in symbols else ()
        order = sorted(symbols, key=lambda symbol: (*(symbol != f for f in first), symbol))
        text = "".join(f"{s}{symbols[s] if symbols[s] > 1 else ''}" for s in order)
        if text:
            parts.append(f"ghosts {text}" if ghost else text)
    return " and ".join(parts)


def in_short(matrix: Matrix) -> Left:
    """Number of functions, smallest eigenvalue and condition number."""
    found = spectrum(matrix, ())
    return Left(found.functions, found.smallest, found.condition)


def turned_spherical(sites: Sequence[Site]) -> list[Site]:
    """The same with spherical functions, where some are Cartesian; nothing where none are."""
    if all(site.spherical or max(site.block.counts, default=0) < 2 for site in sites):
        return []
    return [site._replace(spherical=True) for site in sites]


# ---- who is to blame


def blame(
    matrix: Matrix, functions: Functions, sites: Sequence[Site], found: Spectrum, least: float
) -> tuple[Small, ...]:
    """Shares of the functions in the combinations of the smallest eigenvalues.

    A share is the squared component of the unit eigenvector, summed over a function's components.
    Eigenvalues below ``least`` and below 1e-4 are looked into, the dozen smallest at most; of a
    small matrix the smallest eigenvalue in any case.
    """
    counts = {rung: n for rung, n in found.below.items() if n and rung <= max(least, LADDER[0])}
    few = [rung for rung, n in counts.items() if n <= _BLAMED]
    if counts:
        limit = max(few) if few else min(counts)
    elif found.functions <= SMALL:
        limit = _above(found.smallest)
    else:
        return ()
    values, vectors = lowest(matrix, limit)
    order = np.argsort(values)[:_BLAMED]
    groups = _groups(functions)
    return tuple(_small(float(values[k]), vectors[:, k], groups, functions, sites) for k in order)


def _groups(functions: Functions) -> Ints:
    """Number of the contracted function of an atom that each basis function belongs to."""
    keys = np.column_stack([functions.atom, functions.shell, functions.column])
    new = np.any(np.diff(keys, axis=0) != 0, axis=1)
    return np.concatenate([[0], np.cumsum(new)]).astype(np.intp)


def _small(
    value: float, vector: Matrix, groups: Ints, functions: Functions, sites: Sequence[Site]
) -> Small:
    weights = np.bincount(groups, weights=np.abs(vector) ** 2)
    firsts = np.flatnonzero(np.diff(groups, prepend=-1))
    shares: list[Share] = []
    kinds: dict[Function, float] = {}
    for k in np.argsort(-weights, kind="stable"):
        weight = float(weights[k])
        at = int(firsts[k])
        site = sites[int(functions.atom[at])]
        function = described(
            site,
            int(functions.shell[at]),
            int(functions.column[at]),
            float(functions.exponent[at]),
        )
        kinds[function] = kinds.get(function, 0.0) + weight
        if weight >= _LEAST and len(shares) < _TOLD:
            shares.append(Share(weight, function, int(functions.atom[at]) + 1))
    summed = sorted(kinds.items(), key=lambda item: -item[1])
    told = [Share(weight, function) for function, weight in summed if weight >= _LEAST]
    return Small(value, tuple(shares), tuple(told[:_TOLD] or [Share(summed[0][1], summed[0][0])]))


def described(site: Site, index: int, column: int, exponent: float) -> Function:
    """A contracted function of an atom: shell ``index`` of its block, and the column in it."""
    shell = site.block.shells[index]
    name = site.block.names[index]
    if shell.columns_per_l > 1:
        name += f"/{column % shell.columns_per_l + 1}"
    return Function(
        site.path,
        shell.line,
        site.block.symbol,
        site.block.names[index],
        name,
        column,
        letter_of(shell.angular[column // shell.columns_per_l]) * (len(shell.angular) > 1),
        exponent,
        _is_outermost(site.block, index, column),
    )


def _is_outermost(block: Block, index: int, column: int) -> bool:
    shell = block.shells[index]
    l = shell.angular[column // shell.columns_per_l]
    own = shell.exponents[shell.coefficients[:, column] != 0.0]
    loosest = min(float(f.exponents.min()) for _, f in block.functions_of(l) if f.exponents.size)
    return own.size == 1 and float(own[0]) <= loosest


# ---- what to drop


def pruned_set(
    matrix: Matrix,
    functions: Functions,
    sites: Sequence[Site],
    wanted: Wanted,
    found: Spectrum,
) -> Pruned:
    """What the Cholesky choice takes away, and what it leaves.

    A pivot is a diagonal element of a Schur complement, so it is never below the smallest
    eigenvalue: above the tolerance nothing can go.
    """
    if found.smallest >= wanted.tolerance:
        return (), None
    pruning = shells_to_drop(
        matrix,
        functions,
        [site.placed for site in sites],
        wanted.tolerance,
        "atom" if wanted.per_atom else "element",
    )
    if not pruning.drops:
        return (), None
    left = Left(len(pruning.kept), pruning.smallest, pruning.condition)
    return tuple(as_dropped(pruning.drops, sites, wanted)), left


def as_dropped(drops: Iterable[Drop], sites: Sequence[Site], wanted: Wanted) -> Iterator[Dropped]:
    """What was chosen to be dropped, with its places in the files."""
    for drop in drops:
        function = described(sites[drop.like], drop.shell, drop.column, drop.exponent)
        yield Dropped(function, drop.like + 1 if wanted.per_atom else 0)
