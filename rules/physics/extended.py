"""Radial integrals over primitives and their derivatives with respect to ln(exponent).

A normalised primitive phi_a changes with its exponent a into phi' = d phi / d ln a and
phi'' = d phi' / d ln a.  Overlaps and one-electron energies over phi, phi', phi'' are derivatives
of the closed forms in `radial`: with x = a / (a+b) and L = l + 3/2,

    d ln s / d ln a = L (1/2 - x),    d ln(ab/(a+b)) / d ln a = 1 - x,
    d ln sqrt(a+b) / d ln a = x / 2,  dx / d ln a = x (1-x).

Repulsion is written with the charge inside a sphere of radius s, Q(s), by the identity

    R_k(1, 2) = (2k+1) integral of s**(-2k-2) Q_1(s) Q_2(s) ds,
    Q(s) = integral of r**(k+2) rho(r) dr from 0 to s,

over s from zero to infinity.  For a pair of primitives Q = N_a N_b s**(2j+1) F_j((a+b) s**2),
2j = l + l' + k + 2 (`boys`).  The integrand is smooth in ln s, so the trapezoidal rule converges
exponentially, and every integral is a product of vectors over some 80 radii.

Source: r<**k / r>**(k+1) = (2k+1) (r1 r2)**k times the integral of s**(-2k-2) from r> on, by
elementary calculus; convergence: L. N. Trefethen, J. A. C. Weideman, SIAM Rev. 56, 385 (2014).
"""

from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.boys import boys
from overlapse.rules.physics.configuration import SQUARES
from overlapse.rules.physics.onecentre import norms
from overlapse.rules.physics.radial import Integrals, attraction, kinetic

_STEP = 0.2  # of ln s; the error falls as exp(-4.9 / step)


class OneElectron(NamedTuple):
    """Integrals of one kind for one l.

    first: over (phi, phi'), shape (2n, 2n).  second: phi'' with phi, shape (n, n).
    """

    first: Floats
    second: Floats


def _derivatives(plain: Floats, a: Floats, b: Floats, cross: Floats) -> OneElectron:
    """From logarithmic first derivatives by a and b, and the second one by both.

    For all kinds the mixed second derivative is minus the pure one.
    """
    n = len(plain)
    first = np.empty((2 * n, 2 * n))
    first[:n, :n] = plain
    first[n:, :n] = plain * a
    first[:n, n:] = plain * b
    first[n:, n:] = plain * (a * b + cross)
    return OneElectron(first, plain * (a * a - cross))


def overlaps(integrals: Integrals, l: int) -> OneElectron:
    """Overlaps over primitives and their derivatives."""
    x, length = _share(integrals.exponents[l]), l + 1.5
    a = length * (0.5 - x)
    return _derivatives(integrals.overlap[l], a, -a, length * x * (1.0 - x))


def energies(integrals: Integrals, l: int) -> OneElectron:
    """Kinetic energy and attraction by the nucleus over primitives and their derivatives."""
    exponents = integrals.exponents[l]
    x, length = _share(exponents), l + 1.5
    lean, curl = length * (0.5 - x), x * (1.0 - x)
    moving = _derivatives(
        kinetic(exponents, exponents, l), 1.0 - x + lean, x - lean, (1.0 + length) * curl
    )
    drawn = _derivatives(
        -integrals.shells.charge * attraction(exponents, exponents, l),
        0.5 * x + lean,
        0.5 * (1.0 - x) - lean,
        (length - 0.5) * curl,
    )
    return OneElectron(moving.first + drawn.first, moving.second + drawn.second)


def _share(exponents: Floats) -> Floats:
    a, b = exponents[:, None], exponents[None, :]
    share: Floats = a / (a + b)
    return share


class Charges(NamedTuple):
    """Weighted charges inside the radii; two of them multiply to a Slater integral.

    first: of (phi, phi') of l with (phi, phi') of l', shape (2n, 2n', radii).  second: of phi'' of
    l with phi of l', shape (n, n', radii).
    """

    first: Floats
    second: Floats

    def turned(self, second: Floats) -> "Charges":
        return Charges(self.first.transpose(1, 0, 2), second)


def charges(integrals: Integrals) -> dict[tuple[int, int, int], Charges]:
    """For all pairs of l and orders k that meet in an atom: {(l, l', k): charges}."""
    every = np.concatenate(list(integrals.exponents.values()))
    tightest, loosest = 2.0 * float(every.max()), 2.0 * float(every.min())
    start, stop = np.log(0.005 / np.sqrt(tightest)), np.log(6.5 / np.sqrt(loosest))
    radii = np.exp(np.arange(start, stop + _STEP, _STEP))
    found: dict[tuple[int, int, int], Charges] = {}
    for l in integrals.exponents:
        for m in integrals.exponents:
            if l <= m:
                _pair(integrals, l, m, radii, found)
    return found


def _pair(
    integrals: Integrals,
    l: int,
    m: int,
    radii: Floats,
    found: dict[tuple[int, int, int], Charges],
) -> None:
    a, b = integrals.exponents[l][:, None, None], integrals.exponents[m][None, :, None]
    square = radii * radii
    table = boys(l + m + 3, (a + b) * square)
    scale = (
        norms(integrals.exponents[l], l)[:, None, None]
        * norms(integrals.exponents[m], m)[None, :, None]
    )
    half_a, half_b = 0.5 * (l + 1.5), 0.5 * (m + 1.5)
    n, o = a.shape[0], b.shape[1]
    for k in SQUARES[l, m]:
        weight = np.full(len(radii), (2 * k + 1) * _STEP)
        fall = np.exp(-(2 * k + 1) * _STEP)
        weight[-1] *= 1.0 + fall / (1.0 - fall)  # beyond the last radius all charge is inside
        factor = scale * (radii ** (l + m + 2.5) * np.sqrt(weight))
        j = (l + m + k + 2) // 2
        plain = factor * table[j]
        once = -factor * square * table[j + 1]
        twice = factor * square**2 * table[j + 2]
        first = np.empty((2 * n, 2 * o, len(radii)))
        first[:n, :o] = plain
        first[n:, :o] = half_a * plain + a * once
        first[:n, o:] = half_b * plain + b * once
        first[n:, o:] = half_a * half_b * plain + (half_a * b + half_b * a) * once + a * b * twice
        second = half_a**2 * plain + (2.0 * half_a + 1.0) * a * once + a * a * twice
        found[l, m, k] = Charges(first, second)
        if l != m:
            other = half_b**2 * plain + (2.0 * half_b + 1.0) * b * once + b * b * twice
            found[m, l, k] = found[l, m, k].turned(other.transpose(1, 0, 2))
