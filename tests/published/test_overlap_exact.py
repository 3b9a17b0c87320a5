"""Overlap and kinetic energy against integrals of 40 digits, for every pair of l up to 6."""

import exact
import numpy as np
import pytest

from overlapse.grammar.model import Block, Shell
from overlapse.rules.physics.harmonics import powers
from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.placed import Placed

# Exponents and the vector between the centres: alike and close, unlike, nearly equal and very
# close, far apart, tight on diffuse, so far that all but the diffuse is nothing.
CASES = [
    (0.31, 1.7, (0.4, -0.7, 1.1)),
    (0.83, 0.8301, (0.011, 0.002, -0.007)),
    (0.045, 0.11, (5.2, -6.1, 3.3)),
    (3400.0, 0.27, (0.9, 1.4, -0.3)),
    (1.9, 2.3, (1.3, 2.0, -1.1)),
]


Case = tuple[float, float, tuple[float, float, float]]


def _pair(l: int, k: int, case: Case, spherical: bool) -> list[Placed]:
    a, b, vector = case
    return [
        Placed(Block(1, (Shell((l,), [a], [[1.0]]),)), vector, spherical),
        Placed(Block(1, (Shell((k,), [b], [[1.0]]),)), (0.0, 0.0, 0.0), spherical),
    ]


def _some(count: int, turn: int) -> list[int]:
    """At most five of ``count`` components, others at every turn: 40 digits are slow."""
    return sorted({(turn + step * count // 5) % count for step in range(5)})


@pytest.mark.parametrize("l", range(7))
def test_overlap_of_spherical_functions(l: int) -> None:
    for k in range(7):
        for turn, case in enumerate(CASES):
            rows, columns = _some(2 * l + 1, turn + k), _some(2 * k + 1, turn)
            parts = [
                [exact.solid_harmonic(n, at - n) for at in some]
                for n, some in ((l, rows), (k, columns))
            ]
            expected = exact.block((l, case[0]), (k, case[1]), case[2], components=parts)
            found = overlap(_pair(l, k, case, True))[: 2 * l + 1, 2 * l + 1 :]
            difference = found[np.ix_(rows, columns)] - np.array(expected, dtype=float)
            assert np.abs(difference).max() < 1e-13, (k, case)


@pytest.mark.parametrize("l", range(7))
def test_kinetic_energy_of_spherical_functions(l: int) -> None:
    for k in range(7):
        case = CASES[k % 3]
        rows, columns = _some(2 * l + 1, k), _some(2 * k + 1, l)
        parts = [
            [exact.solid_harmonic(n, at - n) for at in some]
            for n, some in ((l, rows), (k, columns))
        ]
        pair = exact.block((l, case[0]), (k, case[1]), case[2], components=parts, kinetic=True)
        found = kinetic(_pair(l, k, case, True))[: 2 * l + 1, 2 * l + 1 :]
        difference = found[np.ix_(rows, columns)] - np.array(pair, dtype=float)
        assert np.abs(difference).max() < 1e-12, k


@pytest.mark.parametrize("l", range(7))
def test_cartesian_components_have_each_a_norm_of_one(l: int) -> None:
    for k in range(7):
        case = CASES[k % len(CASES)]
        rows, columns = _some(len(powers(l)), k), _some(len(powers(k)), l)
        parts = [
            [((powers(n)[at], exact.mpf(1)),) for at in some]
            for n, some in ((l, rows), (k, columns))
        ]
        found = overlap(_pair(l, k, case, False))
        assert np.abs(np.diagonal(found) - 1.0).max() < 1e-13
        size = len(powers(l))
        pair = exact.block((l, case[0]), (k, case[1]), case[2], components=parts)
        difference = found[:size, size:][np.ix_(rows, columns)] - np.array(pair, dtype=float)
        assert np.abs(difference).max() < 1e-13, k
