"""Overlap matrices against closed formulas and against published or independently computed values.

Geometries and exponents are those of A. Szabo, N. S. Ostlund, Modern Quantum Chemistry, chapter 3
(from memory); the basis sets are read from the files bundled with PySCF.
"""

from math import cos, exp, pi, radians, sin, sqrt
from pathlib import Path

import numpy as np
import pytest

from overlapse.grammar.elements import number_of
from overlapse.grammar.model import Block, Floats, Shell
from overlapse.grammar.reading import read
from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.lattice import lattice_overlap
from overlapse.rules.physics.placed import Placed, radial_norms

ORIGIN = (0.0, 0.0, 0.0)


def _s(exponents: list[float], coefficients: list[float], z: float = 0.0) -> Placed:
    table = np.array(coefficients)[:, None]
    return Placed(Block(1, (Shell((0,), np.array(exponents), table),)), (0.0, 0.0, z))


@pytest.mark.parametrize(
    ("a", "b", "distance"), [(0.3, 1.1, 1.4), (2.0, 2.0, 0.5), (8.0, 0.05, 6.0)]
)
def test_two_s_functions(a: float, b: float, distance: float) -> None:
    """(4ab/(a+b)**2)**(3/4) exp(-ab R**2/(a+b)): Szabo, Ostlund, appendix A."""
    found = overlap([_s([a], [1.0]), _s([b], [1.0], distance)])
    expected = (4.0 * a * b / (a + b) ** 2) ** 0.75 * exp(-a * b / (a + b) * distance**2)
    assert found[0, 1] == pytest.approx(expected, abs=1e-15)
    assert np.array_equal(found, found.T)


@pytest.mark.parametrize("l", range(7))
@pytest.mark.parametrize("ratio", [1.5, 2.0, 3.0, 1e6])
def test_one_centre(l: int, ratio: float) -> None:
    """(2 sqrt(ab)/(a+b))**(l+3/2), components of one l orthogonal, different l orthogonal."""
    shells = (Shell((l,), [ratio * 0.4], [[1.0]]), Shell((l,), [0.4], [[1.0]]))
    found = overlap([Placed(Block(1, (*shells, Shell((l + 1,), [1.0], [[1.0]]))), ORIGIN)])
    size = 2 * l + 1
    expected = (2.0 * sqrt(ratio) / (1.0 + ratio)) ** (l + 1.5)
    assert found[:size, size : 2 * size] == pytest.approx(expected * np.eye(size), abs=1e-14)
    assert np.abs(found[: 2 * size, 2 * size :]).max() < 1e-14


@pytest.mark.parametrize("l", range(5))
def test_kinetic_energy_of_a_primitive(l: int) -> None:
    """a (2l+3)/2 hartree: by the virial theorem, from <r**2> = (2l+3)/4a."""
    found = kinetic([Placed(Block(1, (Shell((l,), [0.7], [[1.0]]),)), ORIGIN)])
    assert found == pytest.approx(0.7 * (2 * l + 3) / 2 * np.eye(2 * l + 1), abs=1e-13)


# W. J. Hehre, R. F. Stewart, J. A. Pople, J. Chem. Phys. 51, 2657 (1969): 1s of zeta = 1.
EXPONENTS = np.array([2.227660584, 0.405771156, 0.109818036])
COEFFICIENTS = [0.154328967, 0.535328142, 0.444634542]


def _scaled(zeta: float, z: float = 0.0) -> Placed:
    return _s(list(EXPONENTS * zeta**2), COEFFICIENTS, z)


def test_hydrogen_molecule() -> None:
    """S12 0.6593, T11 0.7600, T12 0.2365: the book; more digits computed with another program."""
    atoms = [_scaled(1.24), _scaled(1.24, 1.4)]
    found, energy = overlap(atoms), kinetic(atoms)
    assert found[0, 1] == pytest.approx(0.6593, abs=5e-5)
    assert found[0, 1] == pytest.approx(0.659318, abs=5e-7)
    assert energy[0, 0] == pytest.approx(0.760032, abs=5e-7)
    assert energy[0, 1] == pytest.approx(0.236455, abs=5e-7)
    values = np.linalg.eigvalsh(found)
    assert values == pytest.approx([0.340682, 1.659318], abs=5e-7)
    assert values[1] / values[0] == pytest.approx(4.8706, abs=5e-5)


def test_helium_hydride_ion() -> None:
    """S12 0.4508 in the book; T11 2.1643, T12 0.1670 of its appendix B."""
    atoms = [_scaled(2.0925), _scaled(1.24, 1.4632)]
    found, energy = overlap(atoms), kinetic(atoms)
    assert found[0, 1] == pytest.approx(0.450770, abs=5e-7)
    assert energy[0, 0] == pytest.approx(2.164311, abs=5e-6)
    assert energy[0, 1] == pytest.approx(0.167013, abs=5e-7)


def test_one_centre_chain_of_s_functions_has_a_theta_function_for_spectrum() -> None:
    """A chain of equal s functions a apart: S(k) = sum over n of q**(n*n) cos(2 pi n k).

    With q = exp(-alpha a**2 / 2): the definition of Jacobi's third theta function.
    """
    alpha, step = 0.15, 1.9
    points = np.array([[0.0, 0.0, 0.0], [0.21, 0.0, 0.0], [0.5, 0.0, 0.0]])
    cell = np.diag([step, 1.0, 1.0])
    found = lattice_overlap(
        [_s([alpha], [1.0])], cell, points, periodic=(True, False, False), tolerance=1e-14
    )
    q = exp(-alpha * step**2 / 2.0)
    for value, (k, *_) in zip(found[:, 0, 0], points, strict=True):
        series = sum(q ** (n * n) * cos(2.0 * pi * n * k) for n in range(-40, 41))
        assert value == pytest.approx(series, abs=2e-14)


def test_a_plane_wave_is_what_a_crystal_of_diffuse_functions_adds_up_to() -> None:
    """At the zone centre s functions that overlap widely add to a constant (Poisson's sum):

    S = (2 pi / alpha)**(3/2) / volume, but for terms exp(-2 pi**2 / (alpha a**2)).
    """
    alpha, step = 0.05, 2.5
    (found,) = lattice_overlap([_s([alpha], [1.0])], np.eye(3) * step, np.zeros((1, 3)))
    expected = (2.0 * pi / alpha) ** 1.5 / step**3
    assert found[0, 0].real == pytest.approx(expected, rel=1e-11)


def _pyramid(length: float, angle: float) -> list[tuple[str, tuple[float, float, float]]]:
    """Three H around N, the angle between two bonds given in degrees."""
    out = 2.0 * length * sin(radians(angle) / 2.0) / sqrt(3.0)
    height = sqrt(length**2 - out**2)
    turns = [0.0, 2.0 * pi / 3.0, 4.0 * pi / 3.0]
    return [("N", ORIGIN), *(("H", (out * cos(t), out * sin(t), height)) for t in turns)]


MOLECULES: dict[str, list[tuple[str, tuple[float, float, float]]]] = {
    "H2": [("H", ORIGIN), ("H", (0.0, 0.0, 1.4))],
    "CO": [("C", ORIGIN), ("O", (0.0, 0.0, 2.132))],
    "N2": [("N", ORIGIN), ("N", (0.0, 0.0, 2.074))],
    "CH4": [
        ("C", ORIGIN),
        *(
            ("H", tuple(2.050 / sqrt(3.0) * s for s in signs))
            for signs in ((1, 1, 1), (1, -1, -1), (-1, 1, -1), (-1, -1, 1))
        ),
    ],
    "NH3": _pyramid(1.913, 106.7),
    "H2O": [
        ("O", ORIGIN),
        ("H", (0.0, 1.809 * sin(radians(52.26)), 1.809 * cos(radians(52.26)))),
        ("H", (0.0, -1.809 * sin(radians(52.26)), 1.809 * cos(radians(52.26)))),
    ],
    "FH": [("F", ORIGIN), ("H", (0.0, 0.0, 1.733))],
}

# Smallest eigenvalues of the overlap matrix, computed with another program: STO-3G, 4-31G, 6-31G*
# with six Cartesian d functions and with five spherical ones.  The program's Cartesian d functions
# share one radial norm: x**2 has the self-overlap 4 pi / 5, xy a third of it.  The eigenvalues of
# Cartesian sets depend on such norms, and with them on the direction of the axes.
SMALLEST = {
    "H2": (0.34068, 0.09640, 0.09640, 0.09640),
    "CO": (0.20334, 0.02207, 0.00796, 0.01512),
    "N2": (0.16222, 0.00888, 0.00436, 0.00543),
    "CH4": (0.21783, 0.02548, 0.01784, 0.02018),
    "NH3": (0.26767, 0.04552, 0.02329, 0.03890),
    "H2O": (0.34227, 0.07255, 0.02413, 0.06247),
    "FH": (0.41312, 0.11310, 0.01381, 0.09345),
}
FILES = ("sto-3g.dat", "pople-basis/4-31G.dat", "pople-basis/6-31Gs.dat", "pople-basis/6-31Gs.dat")


@pytest.mark.parametrize("column", range(4))
def test_smallest_eigenvalues_of_small_molecules(column: int) -> None:
    pyscf = pytest.importorskip(
        "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
    )
    path = Path(pyscf.__file__).parent / "gto" / "basis" / FILES[column]
    blocks = {block.atomic_number: block for block in read(path).blocks}
    found: dict[str, float] = {}
    for name, atoms in MOLECULES.items():
        placed = [
            Placed(blocks[number_of(symbol) or 0], place, column != 2) for symbol, place in atoms
        ]
        norms = radial_norms(placed)
        matrix = overlap(placed) * norms[:, None] * norms
        found[name] = round(float(np.linalg.eigvalsh(matrix)[0]), 5)
    assert found == {name: row[column] for name, row in SMALLEST.items()}


def _rotation(dice: np.random.Generator) -> Floats:
    turn: Floats = np.linalg.qr(dice.normal(size=(3, 3)))[0]
    return turn


def test_the_spectrum_does_not_know_places_or_the_order_of_atoms() -> None:
    dice = np.random.default_rng(11)
    shells = tuple(Shell((l,), [1.3, 0.4], [[0.6, 1.0], [0.5, 0.0]]) for l in range(5))
    mixed = (*shells, Shell((0, 1), [0.9, 0.2], [[0.3, 0.4], [0.7, 0.7]]))
    blocks = [Block(8, mixed), Block(6, shells[:3])]
    places = dice.uniform(-2.0, 2.0, (4, 3))
    for spherical in (True, False):
        spectra = []
        for _ in range(3):
            turned = places + dice.normal(size=3)
            if spherical:  # Cartesian components of norm one do know directions
                turned = turned @ _rotation(dice)
            order = dice.permutation(4)
            atoms = [
                Placed(blocks[at % 2], tuple(map(float, turned[at])), spherical) for at in order
            ]
            spectra.append(np.linalg.eigvalsh(overlap(atoms)))
        assert spectra[1] == pytest.approx(spectra[0], abs=2e-13)
        assert spectra[2] == pytest.approx(spectra[0], abs=2e-13)


def test_radial_norms_of_cartesian_components() -> None:
    """xy has a third of the self-overlap of x**2, xyz a fifteenth of that of x**3."""
    shells = (Shell((0,), [1.0], [[1.0]]), Shell((2,), [1.0], [[1.0]]), Shell((3,), [1.0], [[1.0]]))
    found = radial_norms([Placed(Block(8, shells), ORIGIN, False)]) ** 2
    third, fifteenth = 1.0 / 3.0, 1.0 / 15.0
    d = np.array([1.0, third, third, 1.0, third, 1.0]) * 4.0 * pi / 5.0
    f = np.array([1.0, 0.2, 0.2, 0.2, fifteenth, 0.2, 1.0, 0.2, 0.2, 1.0]) * 4.0 * pi / 7.0
    assert found == pytest.approx([1.0, *d, *f], abs=1e-14)
    assert (radial_norms([Placed(Block(8, shells), ORIGIN)]) == 1.0).all()
