"""Predictions of one number from the others, against fits done one by one."""

import numpy as np
import pytest

from overlapse.rules.physics.prediction import beside, predictions
from overlapse.rules.slips import likeliest, slips

ROW = (5, 6, 7, 8, 9, 10)
NONE: list[tuple[np.ndarray, float]] = []


def test_the_departure_is_that_of_a_fit_without_the_element() -> None:
    values = np.random.default_rng(11).normal(size=(10, 1))
    numbers = tuple(range(21, 31))
    told = predictions(numbers, values, NONE, 1e-6, 1e-9)
    # numpy's own polynomials, each time without the element: an independent way to the same number.
    x = np.log(np.array(numbers, dtype=float))
    for at in range(10):
        others = [k for k in range(10) if k != at]
        found = [
            values[at, 0] - np.polyval(np.polyfit(x[others], values[others, 0], degree), x[at])
            for degree in (1, 2, 3)
        ]
        # The weighed mean lies between those of the three degrees.
        assert min(found) - 1e-9 <= told.departure[at, 0] <= max(found) + 1e-9


def test_an_exact_line_leaves_no_departure_and_a_slip_all_of_it() -> None:
    x = np.log(np.array(ROW, dtype=float))
    values = np.array([2.0 * x + 1.0, 2.1 * x, 2.2 * x - 1.0]).T
    told = predictions(ROW, values, NONE, 0.003, 1e-6)
    assert np.abs(told.departure).max() < 1e-12
    values[2, 1] += np.log(10.0)
    told = predictions(ROW, values, NONE, 0.003, 1e-6)
    assert told.departure[2, 1] == pytest.approx(np.log(10.0), abs=1e-9)
    assert told.surprise[2, 1] == told.surprise.max() > 6.0


def test_a_companion_explains_what_the_row_cannot() -> None:
    # One element goes its own way with all its numbers: that is no slip.
    x = np.log(np.array(ROW, dtype=float))
    own_way = np.array([0.0, 0.0, 0.2, -0.1, 0.0, 0.0])
    values = np.array([2.0 * x + own_way + c for c in (3.0, 2.0, 1.0, 0.0)]).T
    alone = predictions(ROW, values, NONE, 0.003, 1e-6)
    together = predictions(ROW, values, [(t, 1.0) for t in beside(values)], 0.003, 1e-6)
    assert np.abs(together.departure).max() < 0.1 * np.abs(alone.departure).max()
    # Ten per cent in one of them then falls out, though the row scatters by twenty.
    values[4, 1] += 0.1
    together = predictions(ROW, values, [(t, 1.0) for t in beside(values)], 0.003, 1e-6)
    assert np.unravel_index(int(together.surprise.argmax()), values.shape) == (4, 1)


@pytest.mark.parametrize(
    ("wrong", "meant", "what"),
    [
        ("71.616837", "7.1616837", "decimal point moved"),
        ("0.1688554", "1.688554", "decimal point moved"),
        ("1.155787450", "1.515787450", "digits exchanged"),
        ("1.1557874500", "1.157874500", "digit doubled"),
        ("0.53532814D+02", "0.53532814D-02", "sign of the power of ten lost or added"),
    ],
)
def test_a_slip_is_recognised(wrong: str, meant: str, what: str) -> None:
    value = float(meant.replace("D", "E"))
    found = likeliest(wrong, *sorted((0.99 * value, 1.01 * value)), value)
    assert found is not None
    assert (found.told, found.value) == (what, pytest.approx(value, rel=1e-12))


def test_no_slip_where_none_fits_and_none_of_a_word() -> None:
    assert likeliest("7.0", 1.9, 2.1, 2.0) is None
    assert not list(slips("nan"))
    # Nobody prints a zero before other digits, unless the word is printed so already.
    assert "0347.5" not in {slip.word for slip in slips("3047.5")}
    assert "0034.5" in {slip.word for slip in slips("0043.5")}
