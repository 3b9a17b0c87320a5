"""Measuring crystals, layers and chains: S(k) at the centre of the zone and on a mesh."""

from collections.abc import Callable, Sequence

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.measured.blaming import described
from overlapse.rules.measured.probe import AtPoint, Function, Lattice, Left, Probe
from overlapse.rules.measured.probing import (
    Label,
    Pruned,
    Wanted,
    as_dropped,
    assembled,
    conventional,
    in_short,
    some_of,
    steps,
    turned_spherical,
)
from overlapse.rules.measured.site import Site, size
from overlapse.rules.physics.inertia import Matrix
from overlapse.rules.physics.lattice import lattice_overlap, lattice_reach, monkhorst_pack
from overlapse.rules.physics.placed import lay_out
from overlapse.rules.physics.pruning import Drop, shells_to_drop
from overlapse.rules.physics.spectrum import smallest

TOLERANCE = 1e-13  # bound of what is left out of an element of S(k)
_LOOSE = 0.3  # bohr**-2: functions below are listed
# At this part of the converged distance primitives have fallen to the square root of what they
# have at its end: to about 1e-6, a usual limit of programs.
_CUT = 0.5**0.5


def probe_lattice(
    sites: Sequence[Site],
    cell: Floats,
    periodic: tuple[bool, bool, bool],
    wanted: Wanted,
    label: Label = Label(),  # noqa: B008
) -> Probe:
    """Measure one cell: the numbers are those of the k point with the smallest eigenvalue.

    cell: rows are vectors, bohr.  Raises ValueError for a cell that is none, `NotNormalisable`
    where a function has no norm.
    """
    points = _points(wanted.mesh, periodic)

    def at(members: Sequence[Site], k: int, reach: float | None = None) -> Matrix:
        placed = [site.placed for site in members]
        found = lattice_overlap(
            placed, cell, points[k : k + 1], tolerance=TOLERANCE, periodic=periodic, reach=reach
        )[0]
        # At points that are their own negative the matrix is real, and so cheaper.
        real = not np.any((2.0 * points[k]) % 1.0)
        matrix = np.ascontiguousarray(found.real) if real else found
        conventional(matrix, placed)
        return matrix

    lowest = [smallest(at(sites, k)) for k in range(len(points))]
    worst = int(np.argmin(lowest))
    # One large matrix at a time, and no more than one copy of it.
    pruned: Pruned = ((), None)
    if lowest[worst] < wanted.tolerance:
        pruned = _pruned(sites, at, np.argsort(lowest).tolist(), wanted)
    turned = turned_spherical(sites)
    counterpart = in_short(at(turned, worst)) if turned else None
    placed = [site.placed for site in sites]
    reach = lattice_reach(placed, cell, tolerance=TOLERANCE, periodic=periodic)
    lattice = Lattice(
        tuple(
            AtPoint((float(k[0]), float(k[1]), float(k[2])), value)
            for k, value in zip(points, lowest, strict=True)
        ),
        TOLERANCE * size(sites),
        reach,
        smallest(at(sites, worst, reach * _CUT)),
        reach * _CUT,
        tuple(_loose(sites)),
    )
    matrix = at(sites, worst)
    found = steps(matrix, wanted)
    return assembled(sites, wanted, label, matrix, found, pruned, counterpart, lattice)


def _points(mesh: Sequence[int], periodic: Sequence[bool]) -> Floats:
    """The centre of the zone, then the points of the mesh, each once."""
    counts = [count if repeats else 1 for count, repeats in zip(mesh, periodic, strict=True)]
    points = monkhorst_pack(counts)
    others = points[np.abs(points).max(axis=1) > 1e-12]
    return np.concatenate([np.zeros((1, 3)), others])


def _loose(sites: Sequence[Site]) -> list[Function]:
    """Functions with a small exponent, each once, the loosest first."""
    functions = lay_out([site.placed for site in sites])
    found: dict[Function, None] = {}
    for at in np.flatnonzero(functions.exponent < _LOOSE):
        site = sites[int(functions.atom[at])]
        shell, column = int(functions.shell[at]), int(functions.column[at])
        found[described(site, shell, column, float(functions.exponent[at]))] = None
    return sorted(found, key=lambda function: function.exponent)


def _pruned(
    sites: Sequence[Site],
    at: Callable[[Sequence[Site], int], Matrix],
    order: Sequence[int],
    wanted: Wanted,
) -> Pruned:
    """What has to go so that no k point is nearly dependent, the worst point first."""
    placed = [site.placed for site in sites]
    functions = lay_out(placed)
    kept = np.arange(len(functions.atom))
    drops: list[Drop] = []
    lows: list[Left] = []
    for k in order:
        part = at(sites, k)[np.ix_(kept, kept)]
        left = in_short(part)
        if left.smallest < wanted.tolerance:
            pruning = shells_to_drop(
                part,
                some_of(functions, kept),
                placed,
                wanted.tolerance,
                "atom" if wanted.per_atom else "element",
            )
            kept = kept[pruning.kept]
            drops += pruning.drops
            left = Left(len(kept), pruning.smallest, pruning.condition)
        lows.append(left)
    if not drops:
        return (), None
    low = min(lows, key=lambda left: left.smallest)
    return tuple(as_dropped(drops, sites, wanted)), low._replace(functions=len(kept))
