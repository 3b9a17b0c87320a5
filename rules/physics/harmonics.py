"""Real solid harmonics, integrals of three of them, and Cartesian powers expressed in them.

R_lm(r) = r**l Y_lm(r / |r|) with the real spherical harmonics Y_lm, orthonormal on the sphere, m =
-l ... l, without the phase (-1)**m: l = 1 gives y, z, x times sqrt(3 / 4 pi).

Integrals over the sphere are sums over a product of Gauss-Legendre nodes in cos(theta) and evenly
spaced phi, which is exact for polynomials of the degree it is made for.

Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
section 6.4; recurrence of normalised Legendre functions: W. H. Press et al., Numerical Recipes, 3rd
edition, section 6.7.
"""

from functools import cache
from math import pi, sqrt

import numpy as np

from overlapse.grammar.model import Floats


def solid_harmonics(vectors: Floats, top: int) -> list[Floats]:
    """R_lm for l = 0 ... ``top``, each of shape (2l+1, p); ``vectors`` of shape (p, 3)."""
    x, y, z = (np.ascontiguousarray(vectors[:, k]) for k in range(3))
    square = x * x + y * y + z * z
    found = [np.empty((2 * l + 1, len(x))) for l in range(top + 1)]
    cosine, sine = np.ones_like(x), np.zeros_like(x)  # of (x + iy)**m
    lead = sqrt(1.0 / (4.0 * pi))
    for m in range(top + 1):
        if m:
            cosine, sine = cosine * x - sine * y, cosine * y + sine * x
            lead *= sqrt((2 * m + 1) / (2 * m))
        before, now = np.zeros_like(x), np.full_like(x, lead * (sqrt(2.0) if m else 1.0))
        for l in range(m, top + 1):
            if l > m:
                rise = sqrt((4 * l * l - 1) / (l * l - m * m))
                fall = sqrt(((l - 1) ** 2 - m * m) / (4 * (l - 1) ** 2 - 1)) if l > 1 else 0.0
                before, now = now, rise * (z * now - fall * square * before)
            found[l][l + m] = now * cosine
            if m:
                found[l][l - m] = now * sine
    return found


@cache
def sphere(degree: int) -> tuple[Floats, Floats]:
    """Nodes (p, 3) and weights (p,) that integrate polynomials up to ``degree`` exactly."""
    height, weight = np.polynomial.legendre.leggauss(degree // 2 + 1)
    angle = 2.0 * pi * np.arange(degree + 1) / (degree + 1)
    radius = np.sqrt(1.0 - height**2)
    nodes = np.stack(
        [
            np.outer(radius, np.cos(angle)),
            np.outer(radius, np.sin(angle)),
            np.outer(height, np.ones_like(angle)),
        ],
        axis=-1,
    )
    return nodes.reshape(-1, 3), np.repeat(weight * 2.0 * pi / (degree + 1), degree + 1)


@cache
def gaunt(left: int, right: int, third: int) -> Floats:
    """Integrals of Y_left,m Y_right,n Y_third,k over the sphere, one axis for each (2l+1 long)."""
    nodes, weights = sphere(left + right + third)
    values = solid_harmonics(nodes, max(left, right, third))
    product = (values[left] * weights)[:, None, :] * values[right][None, :, :]
    found: Floats = product @ values[third].T
    found[np.abs(found) < 1e-14] = 0.0  # those that vanish by symmetry
    return found


@cache
def powers(l: int) -> tuple[tuple[int, int, int], ...]:
    """Powers of x, y and z of the Cartesian components of degree l, in order."""
    return tuple((i, j, l - i - j) for i in range(l, -1, -1) for j in range(l - i, -1, -1))


@cache
def cartesian_parts(l: int) -> tuple[tuple[int, Floats], ...]:
    """Each Cartesian component of degree l, norm one on the sphere, as a sum of harmonics.

    Pairs of an angular momentum k = l, l-2, ... and the expansion, shape (components, 2k+1).
    """
    nodes, weights = sphere(2 * l)
    values = np.stack([np.prod(nodes ** np.array(p), axis=1) for p in powers(l)])
    values /= np.sqrt(values**2 @ weights)[:, None]
    harmonics = solid_harmonics(nodes, l)
    parts = []
    for k in range(l, -1, -2):
        part = (values * weights) @ harmonics[k].T
        part[np.abs(part) < 1e-14] = 0.0
        parts.append((k, part))
    return tuple(parts)
