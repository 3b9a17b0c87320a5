"""Radial integrals over Gaussian primitives on one centre, in closed form.

A normalised primitive has the radial part N r**l exp(-a r**2) with
N**2 = 2 (2a)**(l+3/2) / Gamma(l+3/2).  With s = (2 sqrt(ab) / (a+b))**(l+3/2) the overlap of two,

    <a| -1/2 nabla**2 |b> = (2l+3) ab/(a+b) s,     <a| 1/r |b> = l!/Gamma(l+3/2) sqrt(a+b) s.

Two distributions r**m exp(-p r**2) and r**n exp(-q r**2) have the Slater integral

    R_k = U(m, p; n, q) + U(n, q; m, p),
    U = 1/4 B! Gamma(h) q**-(B+1) (p+q)**-h sum_(i=0..B) (h)_i / i! (q/(p+q))**i,

B = (n-k)/2, h = (m+k+3)/2: the part of the second outside the first, where k and m, n have one
parity.  All terms are positive, so nothing is lost to rounding.

Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
chapters 6 and 9, for the primitives; U by parts, from the incomplete gamma function of whole order.
"""

from functools import cached_property
from math import factorial, gamma

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Floats
from overlapse.rules.physics.configuration import SQUARES, Configuration
from overlapse.rules.physics.onecentre import norms, primitive_overlap

Indices = npt.NDArray[np.intp]


def kinetic(left: Floats, right: Floats, l: int) -> Floats:
    """Kinetic energy of normalised primitives, hartree, shape (len(left), len(right))."""
    a, b = left[:, None], right[None, :]
    energy: Floats = (2 * l + 3) * (a / (a + b)) * b * primitive_overlap(left, right, l)
    return energy


def attraction(left: Floats, right: Floats, l: int) -> Floats:
    """Mean value of 1/r, bohr**-1, shape (len(left), len(right))."""
    total = left[:, None] + right[None, :]
    value: Floats = factorial(l) / gamma(l + 1.5) * np.sqrt(total)
    value *= primitive_overlap(left, right, l)
    return value


def outside(m: int, p: Floats, n: int, q: Floats, k: int) -> Floats:
    """U(m, p; n, q) for all pairs of sums of exponents, shape (len(p), len(q)).

    Raises ValueError where k exceeds n or differs in parity.
    """
    steps, odd = divmod(n - k, 2)
    if steps < 0 or odd:
        raise ValueError(f"no Slater integral of order {k} for powers {m} and {n}")
    h = 0.5 * (m + k + 3)
    rest = 1.0 / (p[:, None] + q[None, :])
    result = np.sqrt(rest)
    for _ in range((m + k + 2) // 2):
        result *= rest
    result *= (0.25 * factorial(steps) * gamma(h)) * q ** -(steps + 1)
    if steps:
        rest *= q
        series = (h + steps - 1) / steps * rest
        for i in range(steps - 1, 0, -1):
            series += 1.0
            series *= (h + i - 1) / i * rest
        series += 1.0
        result *= series
    return result


class Integrals:
    """All integrals that an atom needs over its primitives.

    exponents: for each occupied l shape (n_l,), bohr**-2, distinct and positive.  Densities are
    packed: the elements (a, b), a <= b, of each l in turn, those with a < b counted twice.
    """

    def __init__(self, exponents: dict[int, Floats], shells: Configuration) -> None:
        self.exponents = exponents
        self.shells = shells
        self.kept: object = None  # what `response` makes of the same primitives
        self.upper = {l: np.triu_indices(len(a)) for l, a in exponents.items()}
        self.places: dict[int, Indices] = {}
        self.parts: dict[int, slice] = {}
        start = 0
        for l, (first, second) in self.upper.items():
            place = np.empty((len(exponents[l]),) * 2, dtype=np.intp)
            place[first, second] = place[second, first] = np.arange(len(first))
            self.places[l] = place
            self.parts[l] = slice(start, start + len(first))
            start += len(first)
        self.size = start

    @cached_property
    def overlap(self) -> dict[int, Floats]:
        """Overlaps per l, shape (n_l, n_l)."""
        return {l: primitive_overlap(a, a, l) for l, a in self.exponents.items()}

    @cached_property
    def bare(self) -> dict[int, Floats]:
        """Kinetic energy and attraction by the nucleus per l, hartree, shape (n_l, n_l)."""
        z = self.shells.charge
        return {l: kinetic(a, a, l) - z * attraction(a, a, l) for l, a in self.exponents.items()}

    def pack(self, matrices: dict[int, Floats]) -> Floats:
        """Densities per l as one vector."""
        packed = np.empty(self.size)
        for l, part in self.parts.items():
            first, second = self.upper[l]
            packed[part] = matrices[l][first, second] * np.where(first == second, 1.0, 2.0)
        return packed

    def unpack(self, vector: Floats) -> dict[int, Floats]:
        """Elements per l as symmetric matrices."""
        return {l: vector[part][self.places[l]] for l, part in self.parts.items()}

    @cached_property
    def _sums(self) -> dict[int, tuple[Floats, Floats]]:
        """Sums of exponents and products of norms of the packed pairs of each l."""
        found = {}
        for l, a in self.exponents.items():
            first, second = self.upper[l]
            n = norms(a, l)
            found[l] = (a[first] + a[second], n[first] * n[second])
        return found

    def _slater(self, l: int, k: int) -> Floats:
        """R_k(ab, cd) of one l over packed pairs, shape (pairs, pairs)."""
        key = (l, k)
        if key not in self._kept:
            p, n = self._sums[l]
            part = outside(2 * l, p, 2 * l, p, k)
            self._kept[key] = (part + part.T) * n[:, None] * n
        return self._kept[key]

    @cached_property
    def _kept(self) -> dict[tuple[int, int], Floats]:
        return {}

    def attraction_by(self, width: float) -> dict[int, Floats]:
        """Repulsion by one electron spread as exp(-width r**2), per l, shape (n_l, n_l)."""
        q = np.array([width])
        norm = 4.0 * width**1.5 / np.sqrt(np.pi)
        found = {}
        for l, (p, n) in self._sums.items():
            both = outside(2 * l, p, 0, q, 0)[:, 0] + outside(0, q, 2 * l, p, 0)[0]
            found[l] = (norm * n * both)[self.places[l]]
        return found

    @cached_property
    def repulsion(self) -> Floats:
        """Coulomb less half the averaged exchange of evenly spread electrons, shape (size, size).

        The repulsion energy of a packed density d is d M d / 2, its field M d.
        """
        matrix = np.empty((self.size, self.size))
        ls = list(self.exponents)
        for at, l in enumerate(ls):
            for m in ls[at:]:
                block = self._coulomb(l, m)
                block -= 0.5 * self.exchange(l, m, SQUARES[l, m])
                matrix[self.parts[l], self.parts[m]] = block
                if l != m:
                    matrix[self.parts[m], self.parts[l]] = block.T
        return matrix

    def _coulomb(self, l: int, m: int) -> Floats:
        if l == m:
            return self._slater(l, 0).copy()
        (p, n), (q, o) = self._sums[l], self._sums[m]
        both = outside(2 * l, p, 2 * m, q, 0)
        both += outside(2 * m, q, 2 * l, p, 0).T
        both *= n[:, None] * o
        return both

    def exchange(self, l: int, m: int, weights: dict[int, float]) -> Floats:
        """Sum over k of weight * [R_k(ac, bd) + R_k(ad, bc)] / 2, rows ab of l, columns cd of m."""
        if l == m:
            table = np.zeros((len(self.upper[l][0]),) * 2)
            for k, w in weights.items():
                table += w * self._slater(l, k)
            pair = self.places[l]
        else:
            p = np.add.outer(self.exponents[l], self.exponents[m]).ravel()
            n = np.multiply.outer(norms(self.exponents[l], l), norms(self.exponents[m], m)).ravel()
            table = np.zeros((len(p), len(p)))
            for k, w in weights.items():
                table += w * outside(l + m, p, l + m, p, k)
            table += table.T.copy()
            table *= n[:, None]
            table *= n
            pair = np.arange(len(p)).reshape(len(self.exponents[l]), -1)
        (a, b), (c, d) = self.upper[l], self.upper[m]
        flat = table.ravel()
        width = len(table)
        ac, bd = pair[a[:, None], c], pair[b[:, None], d]
        gathered: Floats = flat[ac * width + bd]
        ad, bc = pair[a[:, None], d], pair[b[:, None], c]
        gathered += flat[ad * width + bc]
        gathered *= 0.5
        return gathered

    @cached_property
    def coupling(self) -> dict[tuple[int, int], Floats]:
        """Corrections for the term, over packed densities of one electron in each open shell.

        For each (l, l') shape (pairs, pairs'): the energy is p X p' over the pairs of open shells.
        """
        found: dict[tuple[int, int], Floats] = {}
        for l, factors in self.shells.same.items():
            if any(factors.values()):
                found[l, l] = sum(  # type: ignore[assignment]
                    factor * self._slater(l, k) for k, factor in factors.items()
                )
        for (l, m), factors in self.shells.mixed.items():
            found[l, m] = self.exchange(l, m, factors)
        return found
