"""Overlap of two functions that point along the line between their centres.

Real solid harmonics with m = 0 about the z axis are r**l P_l(z/r) = sum_k c_lk z**(l-2k) rho**(2k),
c_lk = (-1)**k l! / (4**k k!**2 (l-2k)!), rho the distance from the axis.  With p = a + b, the
product of two Gaussians is one about P = b R / p, and

    int rho**(2k) exp(-p rho**2) d2rho = pi k! / p**(k+1),
    int u**(2j) exp(-p u**2) du = sqrt(pi / p) (2j-1)!! / (2p)**j.

Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
chapters 6 and 9.
"""

from collections import defaultdict
from functools import cache
from math import comb, factorial, pi, prod

import numpy as np

from overlapse.grammar.model import Floats

# One term of the overlap: power of 1/p, of the distances from P to either centre, and its factor.
Term = tuple[int, int, int, float]


def axial_overlap(l: int, left: Floats, k: int, right: Floats, distance: Floats) -> Floats:
    """Overlap of normalised primitives of m = 0 with exponents ``left`` and ``right``.

    The left one, of angular momentum l, sits at 0, the right one, of k, at z = ``distance`` (bohr).
    All arrays have one shape; exponents are positive, bohr**-2.
    """
    inverse = 1.0 / (left + right)
    to_left = right * inverse * distance  # P as seen from the left centre
    to_right = to_left - distance
    # All terms of one power of 1/p together, each as a polynomial of the distances.
    found = np.zeros_like(inverse)
    for power in _by_power(l, k)[::-1]:
        found *= inverse
        for m, n, factor in power:
            found += factor * _power(to_left, m) * _power(to_right, n)
    found *= (pi * inverse) ** 1.5 * np.exp(-left * right * inverse * distance**2)
    return found * _norm(l, left) * _norm(k, right)


def _power(values: Floats, n: int) -> Floats | float:
    """A whole power by products, which are quicker than the library's power."""
    if n == 0:
        return 1.0
    half = _power(values, n // 2)
    square = values if n == 1 else half * half
    return square * values if n > 1 and n % 2 else square


def _norm(l: int, exponents: Floats) -> Floats:
    """Factors that normalise primitives of m = 0."""
    own = sum(factor for _, m, n, factor in _terms(l, l) if m == n == 0)  # all of one power, l
    total = 2.0 * exponents
    norm: Floats = np.sqrt((total / pi) ** 1.5 * total**l / own)
    return norm


@cache
def _harmonic(l: int) -> tuple[tuple[int, int, float], ...]:
    """Powers of z and of rho**2, and factors."""
    return tuple(
        (l - 2 * k, k, (-1) ** k * factorial(l) / (4**k * factorial(k) ** 2 * factorial(l - 2 * k)))
        for k in range(l // 2 + 1)
    )


@cache
def _by_power(l: int, k: int) -> tuple[tuple[tuple[int, int, float], ...], ...]:
    """The terms sorted by their power of 1/p, from 0 up."""
    terms = _terms(l, k)
    top = max(power for power, _, _, _ in terms)
    return tuple(
        tuple((m, n, factor) for power, m, n, factor in terms if power == p) for p in range(top + 1)
    )


@cache
def _terms(l: int, k: int) -> tuple[Term, ...]:
    """Terms of the overlap but for (pi/p)**(3/2) and the exponential."""
    terms: dict[tuple[int, int, int], float] = defaultdict(float)
    for z_left, flat_left, one in _harmonic(l):
        for z_right, flat_right, two in _harmonic(k):
            flat = flat_left + flat_right
            for i in range(z_left + 1):
                for j in range(z_right + 1):
                    if (i + j) % 2 == 0:
                        half = (i + j) // 2
                        odd = prod(range(1, 2 * half, 2)) / 2.0**half
                        factor = one * two * comb(z_left, i) * comb(z_right, j) * odd
                        key = (flat + half, z_left - i, z_right - j)
                        terms[key] += factor * factorial(flat)
    return tuple((*key, value) for key, value in terms.items())
