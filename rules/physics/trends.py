"""Smooth progressions along a row of the periodic table, and what falls out of them.

Exponents of corresponding primitives scale roughly with the square of an effective nuclear charge,
so their logarithms are smooth in ln Z; coefficients at the same place in a contraction are smooth
as well.  Each element is compared with the polynomial through all the others: a suspect that took
part in its own fit would hide itself.

Formula: with the hat matrix H of the fit, the residual e_k of an element against the fit through
the others is e_k / (1 - H_kk), and the sum of squares without it is SSE - e_k**2 / (1 - H_kk).
Source: R. D. Cook, S. Weisberg, Residuals and Influence in Regression, Chapman and Hall 1982.
"""

from collections.abc import Iterable
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Floats


def quantile(values: Iterable[float], share: float) -> float:
    """The value below which ``share`` of the values lie, without interpolation; 0.5: the median.

    numpy's own function imports a good deal more of numpy than an audit needs.
    """
    ordered = sorted(values)
    return float(ordered[min(int(share * len(ordered)), len(ordered) - 1)])


class Deviations(NamedTuple):
    """Departures of each element from the others: shapes (elements, quantities).

    departure: value less the value that the others suggest.  scatter: how well the others follow
    their own fit.  reach: 1 inside the row, larger at its ends, where the fit extrapolates.
    """

    departure: Floats
    scatter: Floats
    reach: Floats


FEWEST = 6  # elements that a fit with one of them left out needs


@lru_cache(maxsize=256)
def fit_through(numbers: tuple[int, ...], degree: int) -> tuple[Floats, Floats]:
    x = np.log(np.array(numbers, dtype=float))
    x = (x - x.mean()) / (np.ptp(x) or 1.0)
    vandermonde = np.vander(x, degree + 1)
    hat: Floats = vandermonde @ np.linalg.pinv(vandermonde)
    return hat, np.asarray(1.0 - np.diagonal(hat))


def leave_one_out(numbers: tuple[int, ...], values: Floats) -> Deviations:
    """Deviations of each element's quantities from the trend through the other elements.

    numbers: atomic numbers, rising, at least `FEWEST`; values: shape (elements, quantities).
    """
    count = len(numbers)
    degree = 2
    hat, free = fit_through(numbers, degree)
    residual = values - hat @ values
    departure = residual / free[:, None]
    total = (residual**2).sum(axis=0)
    without = np.maximum(total - residual * departure, 0.0)
    scatter = np.sqrt(without / max(1, count - 1 - (degree + 1)))
    # An end is extrapolated: its leverage tells how far the fit has to reach.
    reach = 1.0 / np.sqrt(free)
    return Deviations(departure, scatter, np.broadcast_to(reach[:, None], values.shape))
