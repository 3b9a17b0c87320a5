"""Do atoms stand at distances that atoms have?  A wrong unit of length shows here first."""

from collections.abc import Sequence
from itertools import product
from typing import NamedTuple

import numpy as np

from overlapse.grammar.geometry import BOHR, Atom
from overlapse.grammar.model import Floats
from overlapse.rules.physics.radii import covalent_radius

# Of the sum of covalent radii; a wrong unit is a factor of 1.9.  Atoms farther still are lone ones.
TOO_CLOSE, TOO_FAR = 0.6, (1.7, 2.2)
_MANY = 2000  # atoms; the first of more tell enough
_MANY_IMAGES = 300  # the same with their images


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
        with np.errstate(over="ignore"):  # a number may stand where no place can be
            distances = np.sqrt(((places[:row] - places[row]) ** 2).sum(axis=1))
        shares = distances / (radii[:row] + radii[row])
        at = int(np.argmin(shares))
        if best is None or shares[at] < best.share:
            one, two = nuclei[at][0], nuclei[row][0]
            best = Nearest(one, two, float(distances[at]) * BOHR, float(shares[at]))
    return best


def nearest_image(atoms: Sequence[Atom], cell: Floats, periodic: Sequence[bool]) -> Nearest | None:
    """The nucleus that is closest to an image of one, by covalent radii; None without nuclei.

    cell: rows are vectors, bohr, shape (3, 3).
    """
    nuclei = [
        (k, radius)
        for k, atom in enumerate(atoms[:_MANY_IMAGES])
        if not atom.ghost and (radius := covalent_radius(atom.atomic_number)) is not None
    ]
    steps = [range(-1, 2) if repeats else range(1) for repeats in periodic]
    places = np.array([atoms[k].position for k, _ in nuclei]).reshape(-1, 3)
    radii = np.array([radius for _, radius in nuclei])
    best: Nearest | None = None
    for step in product(*steps):
        if not any(step) or not nuclei:
            continue
        moved = places + np.array(step) @ cell
        with np.errstate(over="ignore"):
            distances = np.linalg.norm(places[:, None, :] - moved[None, :, :], axis=2)
        shares = distances / (radii[:, None] + radii)
        one, two = np.unravel_index(int(np.argmin(shares)), shares.shape)
        share = float(shares[one, two])
        if best is None or share < best.share:
            distance = float(distances[one, two]) * BOHR
            best = Nearest(nuclei[int(one)][0], nuclei[int(two)][0], distance, share)
    return best


def doubt(
    atoms: Sequence[Atom],
    cell: Floats | None = None,
    periodic: Sequence[bool] = (False, False, False),
) -> tuple[int, str] | None:
    """What is odd about the distances, in words, with the index of the atom it is seen at.

    cell: rows are vectors, bohr, shape (3, 3); the directions that are ``periodic`` count.
    """
    image = None if cell is None else nearest_image(atoms, cell, periodic)
    if image is not None and image.share < TOO_CLOSE:
        one, two = (f"{atoms[k].symbol} {k + 1}" for k in (image.one, image.two))
        whose = "its own image" if image.one == image.two else f"an image of {two}"
        if image.share < 1e-3 and image.one != image.two:
            return image.one, f"{one} stands where {whose} stands"
        return image.one, (
            f"suspect: {one} and {whose} are {image.distance:.3g} angstrom apart, closer than any "
            "bond: are cell and unit of length right"
        )
    found = nearest(atoms)
    if found is not None and image is not None and image.share < found.share:
        return None  # bonded through the wall of the cell
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
