"""Principal angles, against an independent implementation and against closed forms."""

from math import acos

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.linalg import subspace_angles

from overlapse.grammar.model import Function
from overlapse.rules.physics.onecentre import primitive_overlap
from overlapse.rules.physics.spans import difference, principal_angles, projection


def function(l: int, exponents: list[float], coefficients: list[float]) -> Function:
    rows = np.arange(len(exponents))
    return Function(l, np.array(exponents), np.array(coefficients), rows, 0)


@pytest.mark.parametrize("l", [0, 1, 2, 4])
def test_two_primitives_have_the_angle_of_their_overlap(l: int) -> None:
    # <a|b> = (2 sqrt(ab) / (a + b))**(l + 3/2): Helgaker, Jorgensen, Olsen 2000, chapter 6.
    (angle,) = principal_angles([function(l, [0.9], [1.0])], [function(l, [0.4], [-3.0])])
    assert angle == pytest.approx(acos((2 * 0.6 / 1.3) ** (l + 1.5)), abs=1e-14)


columns = st.lists(st.floats(-1, 1).map(lambda x: round(x, 3)), min_size=4, max_size=4)


@settings(max_examples=60, deadline=None)
@given(st.lists(columns, min_size=1, max_size=3), st.lists(columns, min_size=1, max_size=3))
def test_angles_equal_those_of_scipy_in_orthogonalised_primitives(
    left: list[list[float]], right: list[list[float]]
) -> None:
    exponents = [8.0, 2.0, 0.5, 0.125]
    metric = primitive_overlap(np.array(exponents), np.array(exponents), 1)
    root = np.linalg.cholesky(metric).T
    tables = [root @ np.array(table).T for table in (left, right)]
    if any(np.linalg.svd(t)[1].min() < 1e-2 for t in tables):
        return  # dependent columns: scipy's ranks and ours may be cut at different places
    mine = principal_angles(
        [function(1, exponents, c) for c in left], [function(1, exponents, c) for c in right]
    )
    assert mine == pytest.approx(np.sort(subspace_angles(*tables)), abs=1e-7)


def test_a_mixture_lies_in_the_space() -> None:
    first, second = function(0, [9.0, 1.0], [0.4, 0.7]), function(0, [3.0, 0.3], [0.5, 0.6])
    mixed = function(0, [9.0, 3.0, 1.0, 0.3], [0.8, 1.5, 1.4, 1.8])
    found = projection([mixed], [first, second])
    assert found.distances == pytest.approx([0.0], abs=1e-8)
    assert found.weights.shape == (1, 2)
    outside = projection([function(0, [0.01], [1.0])], [first, second])
    assert outside.distances[0] > 0.5


def test_a_small_difference_keeps_its_digits() -> None:
    rest, size = difference(
        function(0, [9.0, 1.0], [0.4, 0.7]), function(0, [9.0, 1.0], [0.4, 0.7 + 1e-11])
    )
    assert 1e-13 < size < 1e-11
    assert rest.l == 0


def test_exponents_that_are_not_positive_give_no_angle() -> None:
    sound, broken = function(0, [1.0], [1.0]), function(0, [-1.0], [1.0])
    assert np.isnan(principal_angles([sound], [broken])).all()
    assert np.isnan(projection([sound], [broken]).distances).all()
