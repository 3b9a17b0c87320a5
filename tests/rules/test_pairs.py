"""Bonded pairs: the closed form against exact quadrature, the bounds against whole matrices."""

import numpy as np
import pytest
from numpy.polynomial.hermite import hermgauss
from numpy.polynomial.laguerre import laggauss
from numpy.polynomial.legendre import legval

from overlapse.grammar.model import Block, Floats, Shell
from overlapse.grammar.reading import read_text
from overlapse.lint.engine import audit_text
from overlapse.lint.settings import Settings
from overlapse.rules.physics.integrals import overlap
from overlapse.rules.physics.pairs import alike_bounds, cube_bounds, lone, mixed_bounds
from overlapse.rules.physics.placed import Placed
from overlapse.rules.physics.radii import covalent_radius
from overlapse.rules.physics.twocentre import axial_overlap


def _by_quadrature(l: int, a: float, k: int, b: float, distance: float) -> float:
    """The overlap by Gauss-Hermite along and Gauss-Laguerre across the axis; exact here."""

    def unnormalised(l: int, a: float, k: int, b: float, far: float) -> float:
        p = a + b
        z, along = hermgauss(12)
        t, across = laggauss(12)
        z = z[:, None] / np.sqrt(p) + b * far / p
        square = t[None, :] / p  # distance from the axis, squared
        left = _harmonic(l, z, square)
        right = _harmonic(k, z - far, square)
        total = np.einsum("i,j,ij->", along, across, left * right)
        return float(np.pi / p**1.5 * np.exp(-a * b / p * far**2) * total)

    norms = unnormalised(l, a, l, a, 0.0) * unnormalised(k, b, k, b, 0.0)
    return unnormalised(l, a, k, b, distance) / norms**0.5


def _harmonic(l: int, z: Floats, square: Floats) -> Floats:
    r = np.sqrt(z**2 + square)
    return np.asarray(r**l * legval(z / r, [0.0] * l + [1.0]))


@pytest.mark.parametrize("l", range(5))
@pytest.mark.parametrize("k", range(5))
def test_functions_along_the_axis(l: int, k: int) -> None:
    for a, b, distance in ((0.1, 0.4, 2.3), (1.7, 0.03, 5.0), (0.9, 0.9, 0.0), (2.0, 3.0, 1.1)):
        found = axial_overlap(l, _one(a), k, _one(b), _one(distance))[0]
        assert found == pytest.approx(_by_quadrature(l, a, k, b, distance), abs=1e-13)


def _one(value: float) -> Floats:
    return np.array([value])


def test_two_s_functions() -> None:
    # (4 a b / (a + b)**2)**(3/4) exp(-a b R**2 / (a + b)): A. Szabo, N. S. Ostlund, Modern Quantum
    # Chemistry, appendix A.
    a, b, distance = 0.7, 0.2, 1.9
    expected = (4.0 * a * b / (a + b) ** 2) ** 0.75 * np.exp(-a * b / (a + b) * distance**2)
    assert axial_overlap(0, _one(a), 0, _one(b), _one(distance))[0] == pytest.approx(expected)


CARBON = [(0, 0.52), (0, 0.16), (0, 0.047), (1, 0.55), (1, 0.15), (1, 0.04), (2, 0.55), (2, 0.15)]
HYDROGEN = [(0, 0.33), (0, 0.12), (0, 0.03), (1, 0.73), (1, 0.14)]


def _block(z: int, functions: list[tuple[int, float]]) -> Block:
    shells = tuple(Shell((l,), np.array([a]), np.ones((1, 1))) for l, a in functions)
    return Block(z, shells)


def _smallest(*atoms: tuple[Block, tuple[float, float, float]]) -> float:
    matrix = overlap([Placed(block, position) for block, position in atoms])
    return float(np.linalg.eigvalsh(matrix)[0])


def test_a_pair_of_like_atoms() -> None:
    carbon = _block(6, CARBON)
    table = lone([CARBON, HYDROGEN])
    bounds = alike_bounds(table, np.array([2.9, 1.4]))
    # Of these the functions along the axis are the ones that decide.
    whole = _smallest((carbon, (0.0, 0.0, 0.0)), (carbon, (0.0, 0.0, 2.9)))
    assert bounds[0] == pytest.approx(whole, rel=1e-6)
    hydrogen = _block(1, HYDROGEN)
    whole = _smallest((hydrogen, (0.0, 0.0, 0.0)), (hydrogen, (0.0, 0.0, 1.4)))
    assert bounds[1] == pytest.approx(whole, rel=1e-6)


def test_a_pair_of_unlike_atoms() -> None:
    table = lone([CARBON, HYDROGEN])
    (bound,) = mixed_bounds(table.of([0]), table.of([1]), np.array([2.03]))
    here, there = (0.0, 0.0, 0.0), (2.03, 0.0, 0.0)
    whole = _smallest((_block(6, CARBON), here), (_block(1, HYDROGEN), there))
    assert whole - 1e-14 <= bound == pytest.approx(whole, rel=1e-6)


def test_the_cube() -> None:
    s = [function for function in HYDROGEN if function[0] == 0]
    (bound,) = cube_bounds(lone([HYDROGEN]), np.array([2.0]))
    corners = [(x, y, z) for x in (0.0, 2.0) for y in (0.0, 2.0) for z in (0.0, 2.0)]
    assert bound == pytest.approx(_smallest(*((_block(1, s), c) for c in corners)), rel=1e-6)
    assert bound >= _smallest(*((_block(1, HYDROGEN), c) for c in corners))


def test_radii() -> None:
    # B. Cordero et al., Dalton Trans. 2008, 2832, from memory; in angstrom.
    for z, radius in ((1, 0.31), (6, 0.76), (17, 1.02), (26, 1.32), (55, 2.44), (96, 1.69)):
        assert covalent_radius(z) == pytest.approx(radius / 0.529177210544)
    assert covalent_radius(97) is None


def _audit(exponents: dict[str, tuple[float, ...]]) -> list[tuple[str, str | None]]:
    shells = "".join(f"{l} 1 1.0\n {a} 1.0\n" for l, es in exponents.items() for a in es)
    result = audit_text(f"C 0\n{shells}****\n", "made.basis", settings=Settings())
    return [(f.severity, f.shell) for f in result.findings if f.rule == "overlap.pair"]


def test_doubly_diffuse_sets_are_noted_and_overcrowded_ones_warned_of() -> None:
    assert not _audit({"S": (2.0, 0.5, 0.15), "P": (0.5, 0.15), "D": (0.6,)})
    crowded = (0.1, 0.04, 0.016)
    assert _audit({"S": crowded, "P": crowded, "D": crowded}) == [("note", "s-3")]
    crowded = (0.1, 0.055, 0.03, 0.016)
    assert _audit({"S": crowded, "P": crowded, "D": crowded}) == [("warning", "s-4")]


def test_what_one_centre_shows_is_left_to_its_own_rule() -> None:
    twins = (0.1, 0.1001)
    assert not _audit({"S": twins, "P": (0.1,)})
    document = read_text("C 0\nS 1 1.0\n 0.0 1.0\nS 1 1.0\n -1.0 1.0\n****\n")
    assert document.blocks  # exponents that are none harm nothing
    assert not _audit({"S": (0.0, -1.0)})
