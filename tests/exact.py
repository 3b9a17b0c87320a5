"""Overlap and kinetic-energy integrals of primitives to 40 digits, by another way than the code's.

Cartesian Gaussians by the recurrences of S. Obara, A. Saika, J. Chem. Phys. 84, 3963 (1986), turned
into real solid harmonics by the explicit coefficients of T. Helgaker, P. Jorgensen, J. Olsen,
Molecular Electronic-Structure Theory, Wiley 2000, equation 6.4.47 (formulas from memory; that the
harmonics come out normalised is checked where they are made).
"""

from functools import cache
from math import comb

import mpmath

mpmath.mp.dps = 40
mpf = mpmath.mpf
Powers = tuple[int, int, int]
Parts = tuple[tuple[Powers, mpmath.mpf], ...]  # a sum of powers of x, y and z


@cache
def solid_harmonic(l: int, m: int) -> Parts:
    """Powers of x, y, z and coefficients of r**l Y_lm, up to a common factor."""
    found: dict[Powers, mpmath.mpf] = {}
    a = abs(m)
    twice = [2 * v for v in range(a // 2 + 1)] if m >= 0 else list(range(1, a + 1, 2))
    for t in range((l - a) // 2 + 1):
        for u in range(t + 1):
            for v2 in twice:  # two times v
                sign = (-1) ** (t + (v2 // 2))
                value = mpf(sign * comb(l, t) * comb(l - t, a + t) * comb(t, u) * comb(a, v2))
                powers = (2 * t + a - 2 * u - v2, 2 * u + v2, l - 2 * t - a)
                found[powers] = found.get(powers, mpf(0)) + value / 4**t
    return tuple(found.items())


def _double_factorial(n: int) -> int:
    return 1 if n < 1 else n * _double_factorial(n - 2)


def self_overlap(powers: Powers, a: mpmath.mpf) -> mpmath.mpf:
    """Self-overlap of x**i y**j z**k exp(-a r**2)."""
    value = mpmath.sqrt(mpmath.pi / (2 * a)) ** 3
    for power in powers:
        value *= _double_factorial(2 * power - 1) / (4 * a) ** power
    return value


def _table(i: int, j: int, a: mpmath.mpf, b: mpmath.mpf, x: mpmath.mpf) -> list[list[mpmath.mpf]]:
    """One-dimensional overlaps of (t-A)**i and (t-B)**j, x = A - B."""
    total = a + b
    left, right, half = -b / total * x, a / total * x, 1 / (2 * total)
    first = mpmath.sqrt(mpmath.pi / total) * mpmath.exp(-a * b / total * x * x)
    table = [[mpf(0)] * (j + 1) for _ in range(i + 1)]
    for p in range(i + 1):
        for q in range(j + 1):
            if p:
                value = left * table[p - 1][q]
                value += (p - 1) * half * table[p - 2][q] if p > 1 else 0
                value += q * half * table[p - 1][q - 1] if q else 0
            elif q:
                value = right * table[0][q - 1] + ((q - 1) * half * table[0][q - 2] if q > 1 else 0)
            else:
                value = first
            table[p][q] = value
    return table


def block(
    one: tuple[int, float],
    two: tuple[int, float],
    vector: tuple[float, float, float],
    *,
    components: list[list[Parts]],
    kinetic: bool = False,
) -> list[list[mpmath.mpf]]:
    """Integrals of two shells of primitives (l, exponent), each component normalised.

    vector: from the second to the first centre, bohr.  components: of each shell, as sums of
    Cartesian powers.
    """
    (l, a), (k, b) = (one[0], mpf(one[1])), (two[0], mpf(two[1]))
    axes = [_table(l, k + 2, a, b, mpf(x)) for x in vector]

    def moved(axis: int, i: int, j: int) -> mpmath.mpf:
        """<i| -1/2 d2/dx2 |j> along one axis."""
        table = axes[axis]
        value = -2 * b * b * table[i][j + 2] + b * (2 * j + 1) * table[i][j]
        return value - mpf(j * (j - 1)) / 2 * table[i][j - 2] if j > 1 else value

    def element(p: Powers, q: Powers) -> mpmath.mpf:
        x, y, z = (axes[axis][p[axis]][q[axis]] for axis in range(3))
        if not kinetic:
            return x * y * z
        tx, ty, tz = (moved(axis, p[axis], q[axis]) for axis in range(3))
        return tx * y * z + x * ty * z + x * y * tz

    left, right = (
        [_normalised(parts, exponent) for parts in side]
        for side, exponent in zip(components, (a, b), strict=True)
    )
    powers = [sorted({p for parts in side for p, _ in parts}) for side in (left, right)]
    values = {(p, q): element(p, q) for p in powers[0] for q in powers[1]}
    return [
        [sum(c * d * values[p, q] for p, c in some for q, d in others) for others in right]
        for some in left
    ]


@cache
def _normalised(parts: Parts, exponent: mpmath.mpf) -> Parts:
    norm = mpf(0)
    for (i, j, k), c in parts:
        for (u, v, w), d in parts:
            if not ((i + u) % 2 or (j + v) % 2 or (k + w) % 2):
                half = ((i + u) // 2, (j + v) // 2, (k + w) // 2)
                norm += c * d * self_overlap(half, exponent)
    return tuple((p, c / mpmath.sqrt(norm)) for p, c in parts)
