"""The integrals F_j(x) of t**(2j) exp(-x t**2) over t from 0 to 1, for arrays.

Near a tabulated point, F_j(x) = sum_n F_(j+n)(x0) (x0 - x)**n / n!; downwards from the highest j,
F_(j-1) = (2x F_j + exp(-x)) / (2j - 1), which is stable; for large x, F_j(x) =
Gamma(j+1/2) / (2 x**(j+1/2)).

Source: S. F. Boys, Proc. R. Soc. A 200, 542 (1950); I. Shavitt, Methods Comput. Phys. 2, 1 (1963).
"""

from functools import cache
from math import gamma

import numpy as np

from overlapse.grammar.model import Floats

_STEP = 0.125
_FAR = 50.0
_TERMS = 8


def boys(top: int, x: Floats) -> Floats:
    """F_0 to F_top at x >= 0, shape (top + 1, *x.shape); accurate to 1e-13 relative."""
    # One point's values lie side by side, so that each is fetched with its neighbours.
    table = _table(top + _TERMS).T[:, top:].copy()
    near = np.minimum(x, _FAR)
    at = np.rint(near / _STEP).astype(np.intp)
    step = at * _STEP - near
    result = np.empty((top + 1, *x.shape))
    fetched = table[at]
    highest = fetched[..., _TERMS - 1].copy()
    for n in range(_TERMS - 2, -1, -1):
        highest *= step / (n + 1)
        highest += fetched[..., n]
    far = x > _FAR
    if far.any():
        highest[far] = 0.5 * gamma(top + 0.5) * x[far] ** -(top + 0.5)
    result[top] = highest
    decay = np.exp(-x)
    for j in range(top, 0, -1):
        result[j - 1] = (2.0 * x * result[j] + decay) / (2 * j - 1)
    return result


@cache
def _table(count: int) -> Floats:
    """F_0 to F_(count-1) at the multiples of the step up to the far limit, by their power series.

    exp(-x) sum_i (2x)**i / [(2j+1)(2j+3)...(2j+2i+1)]: all terms positive.
    """
    x = np.arange(int(_FAR / _STEP) + 2) * _STEP
    table = np.empty((count, len(x)))
    top = count - 1
    term = np.full(len(x), 1.0 / (2 * top + 1))
    total = term.copy()
    for i in range(1, 300):
        term *= 2.0 * x / (2 * top + 2 * i + 1)
        total += term
    table[top] = total * np.exp(-x)
    for j in range(top, 0, -1):
        table[j - 1] = (2.0 * x * table[j] + np.exp(-x)) / (2 * j - 1)
    return table
