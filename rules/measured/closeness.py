"""Do atoms stand at distances that atoms have?  A wrong unit of length shows here first."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from overlapse.grammar.geometry import BOHR, Atom
from overlapse.rules.physics.radii import covalent_radius

# Of the sum of covalent radii; a wrong unit is a factor of 1.9.  Atoms farther still are lone ones.
TOO_CLOSE, TOO_FAR = 0.6, (1.7, 2.2)
_MANY = 2000  # atoms; the first of more tell enough


class Nearest(NamedTuple):
    """The two nuclei that are closest for their size: indices, angstrom, share of the radii."""

    one: int
    two: int
    distance: float
    share: float


def nearest(atoms: Sequence[Atom]) -> Nearest | None:
    """The closest pair of nuclei, measured by covalent radii; None where there are not two."""
    nuclei = [
        (k, radius)
        for k, atom in enumerate(atoms[:_MANY])
        if not atom.ghost and (radius := covalent_radius(atom.atomic_number)) is not None
    ]
    if len(nuclei) < 2:
        return None
    places = np.array([atoms[k].position for k, _ in nuclei])
    radii = np.array([radius for _, radius in nuclei])
    best: Nearest | None = None
    for row in range(1, len(nuclei)):
        distances = np.sqrt(((places[:row] - places[row]) ** 2).sum(axis=1))
        shares = distances / (radii[:row] + radii[row])
        at = int(np.argmin(shares))
        if best is None or shares[at] < best.share:
            one, two = nuclei[at][0], nuclei[row][0]
            best = Nearest(one, two, float(distances[at]) * BOHR, float(shares[at]))
    return best


def doubt(atoms: Sequence[Atom]) -> tuple[int, str] | None:
    """What is odd about the distances, in words, with the index of the atom it is seen at."""
    found = nearest(atoms)
    if found is None or TOO_CLOSE <= found.share < TOO_FAR[0] or found.share > TOO_FAR[1]:
        return None
    if found.share > 1.0 and len(atoms) < 3:
        return None  # two atoms that are drawn apart
    one, two = (f"{atoms[k].symbol} {k + 1}" for k in (found.one, found.two))
    if found.share < 1e-3:
        return found.two, f"{two} stands where {one} stands"
    if found.share < TOO_CLOSE:
        return found.two, (
            f"suspect: {two} and {one} are {found.distance:.3g} angstrom apart, closer than any "
            "bond: is the unit of length right"
        )
    return found.two, (
        f"suspect: no two atoms are within bonding distance, the closest are {found.distance:.3g} "
        f"angstrom apart ({two} and {one}): is the unit of length right"
    )
