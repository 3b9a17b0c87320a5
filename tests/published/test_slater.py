"""Overlaps and expansions of Slater functions against published values."""

from math import exp

import numpy as np
import pytest

from overlapse.grammar.model import Block, Floats, Shell
from overlapse.rules.physics.integrals import overlap
from overlapse.rules.physics.onecentre import eigenvalues, self_overlap
from overlapse.rules.physics.placed import Placed

# Hydrogen 1s, zeta = 1.24, in three Gaussians: W. J. Hehre, R. F. Stewart, J. A. Pople, J. Chem.
# Phys. 51, 2657 (1969), with the digits that files in use carry.
HYDROGEN = np.array([3.42525091, 0.62391373, 0.16885540])
COEFFICIENTS = np.array([0.15432897, 0.53532814, 0.44463454])
EXPONENTS = HYDROGEN / 1.24**2
Function = tuple[Floats, Floats]


def overlap_of_s(left: Function, right: Function, distance: float) -> float:
    """Overlap of two s functions, each (exponents, coefficients), ``distance`` in bohr."""
    blocks = [
        Block(1, (Shell((0,), exponents, coefficients[:, None]),))
        for exponents, coefficients in (left, right)
    ]
    atoms = [Placed(blocks[0], (0.0, 0.0, 0.0)), Placed(blocks[1], (0.0, 0.0, distance))]
    return float(overlap(atoms)[0, 1])


def test_exponents_scale_with_the_square_of_zeta() -> None:
    # For zeta = 1 A. Szabo, N. S. Ostlund, Modern Quantum Chemistry, section 3.5 prints these.
    assert EXPONENTS[1:] == pytest.approx([0.405771, 0.109818], abs=5e-7)
    assert EXPONENTS[0] == pytest.approx(2.22766, abs=5e-6)


def test_the_published_contraction_is_normalised() -> None:
    assert self_overlap(EXPONENTS, COEFFICIENTS, 0) == pytest.approx(1.0, abs=1e-7)
    assert self_overlap(HYDROGEN, COEFFICIENTS, 0) == pytest.approx(1.0, abs=1e-7)


def test_overlap_of_the_hydrogen_molecule() -> None:
    # A. Szabo, N. S. Ostlund, Modern Quantum Chemistry, section 3.5.2: 0.6593 at R = 1.4 bohr.
    function = (HYDROGEN, COEFFICIENTS)
    assert overlap_of_s(function, function, 1.4) == pytest.approx(0.6593, abs=5e-5)


def test_overlap_of_helium_hydride() -> None:
    # The same book, section 3.5.3: 0.4508 at R = 1.4632 bohr, zeta 2.0925 and 1.24.
    helium = (EXPONENTS * 2.0925**2, COEFFICIENTS)
    hydrogen = (EXPONENTS * 1.24**2, COEFFICIENTS)
    assert overlap_of_s(helium, hydrogen, 1.4632) == pytest.approx(0.4508, abs=5e-5)


@pytest.mark.parametrize("distance", [0.5, 1.0, 1.4, 2.0, 4.0])
def test_slater_overlap(distance: float) -> None:
    # exp(-x) (1 + x + x**2 / 3), x = zeta R: R. S. Mulliken, C. A. Rieke, D. Orloff, H. Orloff, J.
    # Chem. Phys. 17, 1248 (1949).  Three Gaussians follow it to a few units in the fourth place.
    slater = exp(-distance) * (1.0 + distance + distance**2 / 3.0)
    function = (EXPONENTS, COEFFICIENTS)
    assert overlap_of_s(function, function, distance) == pytest.approx(slater, abs=3e-3)


def test_more_gaussians_come_closer_to_the_slater_overlap() -> None:
    # Two Gaussians for zeta = 1 from the same paper (digits from memory).
    two = (np.array([0.851818663, 0.151622789]), np.array([0.430128498, 0.678913531]))
    three = (EXPONENTS, COEFFICIENTS)
    slater = exp(-1.4) * (1.0 + 1.4 + 1.4**2 / 3.0)
    errors = [abs(overlap_of_s(f, f, 1.4) - slater) for f in (two, three)]
    assert errors[1] < 0.5 * errors[0]


def test_eigenvalues_of_two_functions_are_one_plus_and_minus_their_overlap() -> None:
    # Any textbook; the values for the hydrogen molecule are 1.6593 and 0.3407, condition 4.871.
    function = (HYDROGEN, COEFFICIENTS)
    s = overlap_of_s(function, function, 1.4)
    values = eigenvalues(np.array([[1.0, s], [s, 1.0]]))
    assert values == pytest.approx([1.0 - s, 1.0 + s], abs=1e-14)
    assert values[1] / values[0] == pytest.approx(4.871, abs=5e-4)
