"""Overlap of whole classes of shells at once, by a closed form in momentum space.

The Fourier transform of r**(2s) R_lm(r) exp(-a r**2) is (-i)**l k**l Y_lm(k) times a polynomial in
k**2 (Laguerre, s) times exp(-k**2 / 4a).  With the expansion of a plane wave in spherical Bessel
functions the overlap of two such functions at a distance R becomes, with mu = a b / (a + b),

    sum over L of  g_L(R**2)  *  sum over M of Gaunt(l m, l' m', L M) R_LM(R),
    g_L(R**2) = polynomial(mu R**2) exp(-mu R**2),

and g_L of contracted functions is one matrix product of a table of weights with a table of
exponentials.  A factor k**2 / 2 in the integral gives the kinetic energy instead.  Cartesian
components are sums of such functions with l = degree, degree-2, ... (`harmonics.cartesian_parts`).

    integral of k**(2n+L+2) j_L(k R) exp(-p k**2) over k
        = sqrt(pi) / 2**(L+2) * n! * p**(-n-L-3/2) * R**L * Laguerre_n(R**2/4p) exp(-R**2/4p),

with the generalised Laguerre polynomial of parameter L + 1/2.

Primitive pairs are left out by a bound that holds for every direction: all terms of the polynomial
taken as positive, times the largest value an angular factor can have (Cauchy-Schwarz).

Source: the transform and the integral are in I. S. Gradshteyn, I. M. Ryzhik, Table of Integrals,
Series, and Products, 6.631; closed forms of this kind are old, see for instance
E. J. Weniger, E. O. Steinborn, J. Chem. Phys. 78, 6121 (1983).
"""

from dataclasses import dataclass
from fractions import Fraction
from functools import cache, lru_cache
from math import factorial, gamma, pi, sqrt
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.harmonics import cartesian_parts, gaunt
from overlapse.rules.physics.kinds import Group
from overlapse.rules.physics.placed import Ints


class Factor(NamedTuple):
    """The angular factor of one L for a pair of parts of two shells.

    l, l2: of the parts; third: L.  table: shape (components * components', 2L+1), with its sign.
    size: an upper bound of the factor of R**L, whatever the direction.
    """

    l: int
    l2: int
    third: int
    table: Floats
    size: float


@cache
def _factors(l: int, l2: int, spherical: bool, spherical2: bool) -> tuple[Factor, ...]:
    found = []
    for k, turn in _parts(l, spherical):
        for k2, turn2 in _parts(l2, spherical2):
            for third in range(abs(k - k2), k + k2 + 1, 2):
                table = np.tensordot(turn2, gaunt(k, k2, third), (1, 1))  # b, m, M
                table = np.tensordot(turn, table, (1, 1)).reshape(-1, 2 * third + 1)
                sign = -1.0 if (k - k2 + third) // 2 % 2 else 1.0
                most = float((table**2).sum(axis=1).max())
                size = sqrt(most * (2 * third + 1) / (4.0 * pi))
                found.append(Factor(k, k2, third, sign * table, size))
    return tuple(found)


def _parts(l: int, spherical: bool) -> tuple[tuple[int, Floats], ...]:
    return ((l, np.eye(2 * l + 1)),) if spherical else cartesian_parts(l)


class Term(NamedTuple):
    """One L of one pair of parts: where the coefficients of R**0, R**2, ... in g_L stand."""

    first: int
    rows: int
    factor: Factor


class GroupPair:
    """Everything about two groups that does not depend on where their atoms are.

    reach: distance (bohr) from which each primitive pair is left out, falling, shape (Q,).  mu:
    reduced exponents, shape (Q,).
    """

    def __init__(self, left: Group, right: Group, tail: "Tail", kinetic: bool = False) -> None:
        self.left, self.right = left, right
        a = np.repeat(left.exponents, len(right.exponents))
        b = np.tile(right.exponents, len(left.exponents))
        mu = a * b / (a + b)
        lean = (2.0 * b / (a + b), 2.0 * a / (a + b))
        powers = [np.ones_like(mu), np.sqrt(mu)]
        rows: list[Floats] = []
        self.terms: list[Term] = []
        bounds: dict[int, Floats] = {}  # by twice the power of mu R**2
        for factor in _factors(left.l, right.l, left.spherical, right.spherical):
            shape = ((left.l, factor.l), (right.l, factor.l2), factor.third)
            radial = _radial(shape, kinetic, lean)
            if kinetic:
                radial *= mu
            self.terms.append(Term(len(rows), len(radial), factor))
            for q, row in enumerate(radial):
                twice = 2 * q + factor.third
                while len(powers) <= twice:
                    powers.append(powers[-1] * powers[1])
                rows.append(row * powers[twice])
                bounds[twice] = bounds.get(twice, 0.0) + factor.size * np.abs(row)
        strength = np.abs(left.weights).max(axis=0)[:, None] * np.abs(right.weights).max(axis=0)
        reach = tail.reach(mu, {q: row * strength.ravel() for q, row in bounds.items()})
        order = np.argsort(-reach, kind="stable")
        self.reach, self.mu = reach[order], mu[order]
        self._bounds = (mu, bounds)
        self._spans: dict[float, Floats] = {}
        self.weights = _weights(left.weights, right.weights, order, rows)
        self.top = max(term.factor.third for term in self.terms)

    def fill(
        self, out: Floats, square: Floats, harmonics: list[Floats], shortest: float, room: Floats
    ) -> None:
        """Write the overlaps for p distances into ``out``, shape (n, c, n', c', p).

        n, n': contracted functions; c, c': components.  square: R**2, shape (p,).  harmonics:
        R_LM of the vectors from the right to the left atom.  shortest: the smallest distance.
        room: a buffer of at least the size of ``out``.
        """
        n, c, m, d, p = out.shape
        keep = int(np.searchsorted(-self.reach, -shortest))
        radial = (self.weights[:, :keep] @ self._table(keep, square)).reshape(-1, n, 1, m, 1, p)
        self._combine(out, radial, (1, c, 1, d, p), square, harmonics, room)

    def chosen(
        self, pairs: Ints, square: Floats, harmonics: list[Floats], shortest: float
    ) -> Floats:
        """Overlaps of some pairs of contractions, shape (len(pairs), c, c', p).

        pairs: their numbers in the order (n, n').  Otherwise as `fill`.
        """
        c, d, p = self.left.components, self.right.components, len(square)
        keep = int(np.searchsorted(-self.reach, -shortest))
        count = len(self.left.place) * len(self.right.place)
        rows = (np.arange(self.weights.shape[0] // count)[:, None] * count + pairs).ravel()
        radial = self.weights[rows][:, :keep] @ self._table(keep, square)
        out = np.empty((len(pairs), c, d, p))
        room = np.empty(out.size)
        radial = radial.reshape(-1, len(pairs), 1, 1, p)
        self._combine(out, radial, (1, c, d, p), square, harmonics, room)
        return out

    def spans(self, limit: float) -> Floats:
        """Distances (bohr) from which the elements of each pair of contractions stay below a limit.

        Shape (n * n',).  By the bound of the primitive pairs, each taken at its largest where it
        still rises, on a grid of distances.
        """
        if limit not in self._spans:
            mu, bounds = self._bounds
            grid = np.linspace(0.0, float(self.reach[0]), 256)
            x = np.multiply.outer(mu, grid**2)
            total = np.zeros_like(x)
            for q, row in bounds.items():
                # x**(q/2) exp(-x) falls beyond x = q/2.
                y = np.maximum(x, q / 2.0)
                total += row[:, None] * y ** (q / 2.0) * np.exp(-y)
            left, right = np.abs(self.left.weights), np.abs(self.right.weights)
            total = np.tensordot(left, total.reshape(left.shape[1], right.shape[1], -1), 1)
            total = np.einsum("jb,ibg->ijg", right, total, optimize=True).reshape(-1, len(grid))
            # At the end of the grid everything is below the limit of all screening.
            total[:, -1] = 0.0
            self._spans[limit] = grid[(total <= limit).argmax(axis=1)]
        return self._spans[limit]

    def _table(self, keep: int, square: Floats) -> Floats:
        table = np.multiply.outer(-self.mu[:keep], square)
        return np.exp(table, out=table)

    def _combine(
        self,
        out: Floats,
        radial: Floats,
        shape: tuple[int, ...],
        square: Floats,
        harmonics: list[Floats],
        room: Floats,
    ) -> None:
        """Sum over L of g_L times the angular factor, the latter in the given shape."""
        room = room[: out.size].reshape(out.shape)
        for number, term in enumerate(self.terms):
            value = radial[term.first + term.rows - 1]
            for power in range(term.rows - 2, -1, -1):
                value *= square
                value += radial[term.first + power]
            angular = (term.factor.table @ harmonics[term.factor.third]).reshape(shape)
            np.multiply(value, angular, out=room if number else out)
            if number:
                out += room


def _weights(left: Floats, right: Floats, order: Ints, rows: list[Floats]) -> Any:
    """Weight of each primitive pair in each pair of contractions, once for each of ``rows``.

    Shape (len(rows) * n * n', Q); sparse where it is large and mostly zero, as of many functions
    that are not contracted.
    """
    if len(left) * len(right) * len(order) * len(rows) < 1e6:
        both = np.einsum("ia,jb->ijab", left, right).reshape(-1, len(order))[:, order]
        return np.concatenate([both * row[order] for row in rows])
    # Only here, so that overlaps of ordinary sets need numpy alone.
    from scipy import sparse

    large = sparse.kron(sparse.csr_array(left), sparse.csr_array(right)).tocsc()[:, order]
    stack = sparse.vstack([large @ sparse.diags(row[order]) for row in rows]).tocsr()
    return stack if stack.nnz < 0.2 * stack.shape[0] * stack.shape[1] else stack.toarray()


def group_pair(left: Group, right: Group, tail: "Tail", kinetic: bool) -> GroupPair:
    """Two groups as pairs of molecules need them again and again, or as one lattice does."""
    if type(tail) is Tail:
        return _remembered(left, right, tail.limit, kinetic)
    return GroupPair(left, right, tail, kinetic)


@lru_cache(maxsize=512)
def _remembered(left: Group, right: Group, limit: float, kinetic: bool) -> GroupPair:
    return GroupPair(left, right, Tail(limit), kinetic)


Shape = tuple[tuple[int, int], tuple[int, int], int]  # degree and l of two parts, and L


def _radial(shape: Shape, kinetic: bool, lean: tuple[Floats, Floats]) -> Floats:
    """Coefficients of (mu R**2)**0, ... in g_L / mu**(L/2) for normalised primitives, (m, Q).

    lean: 2 mu / a and 2 mu / b.  The kinetic energy has a factor mu more.
    """
    (_, l), (_, l2), _ = shape
    table = _coefficients(shape, kinetic)
    left, right = lean
    first = left ** (l / 2 + 0.75) * right ** (l2 / 2 + 0.75)
    both = np.stack(
        [first * left**u * right**v for u in range(len(table)) for v in range(table.shape[1])]
    )
    found: Floats = table.reshape(len(both), -1).T @ both
    return found


@cache
def _coefficients(shape: Shape, kinetic: bool) -> Floats:
    """Factors of (2 mu/a)**u (2 mu/b)**v (mu R**2)**j, shape (s+1, s'+1, m)."""
    (degree, l), (degree2, l2), third = shape
    s, s2 = (degree - l) // 2, (degree2 - l2) // 2
    front = 8.0 * pi**1.5 / 2.0 ** (third + 2) * factorial(s) * factorial(s2) * 2.0 ** (s + s2)
    front /= sqrt(gamma(degree + 1.5)) * sqrt(gamma(degree2 + 1.5))
    front *= 2.0**third * (2.0 if kinetic else 1.0)  # (4 mu)**(L/2), and 4 mu / 2
    lowest = (l + l2 - third) // 2 + kinetic
    table = np.zeros((s + 1, s2 + 1, lowest + s + s2 + 1))
    for u in range(s + 1):
        for v in range(s2 + 1):
            n = lowest + u + v
            value = front * _laguerre(s, l + 0.5, u) * _laguerre(s2, l2 + 0.5, v)
            value *= factorial(n) / 2.0 ** (u + v)
            for power in range(n + 1):
                table[u, v, power] = value * _laguerre(n, third + 0.5, power)
    return table


@cache
def _laguerre(n: int, alpha: float, power: int) -> float:
    """Coefficient of x**power in the generalised Laguerre polynomial of degree n."""
    value = Fraction((-1) ** power, factorial(power))
    for step in range(1, n - power + 1):
        value *= (Fraction(alpha) + power + step) / step
    return float(value)


@dataclass(frozen=True, eq=False)
class Tail:
    """How far primitive pairs are followed: what is left out of an element stays below a limit.

    limit: absolute bound of the error of any matrix element.
    """

    limit: float

    def reach(self, mu: Floats, bounds: dict[int, Floats]) -> Floats:
        """Distance from which each pair is left out, shape (Q,), bohr.

        bounds: for each q the factor of x**(q/2) exp(-x), x = mu R**2, in the bound of the pair.
        """
        half = np.array(list(bounds))[:, None] / 2.0
        table = np.stack(list(bounds.values())) * (len(mu) / self.limit)
        # From the largest power on, every term falls; before, the pair is kept whatever it is.
        low = float(half.max()) + 1e-9

        def root(x: Floats) -> Floats:
            with np.errstate(divide="ignore"):
                return np.asarray(np.log((table * x**half).sum(axis=0)))

        # x = log P(x) has its largest root where P(x) exp(-x) falls below the share of a pair;
        # iterated from above, x stays above it.
        x = np.full(len(mu), low + 64.0)
        while (above := root(x) > x).any():
            x[above] *= 2.0
        for _ in range(8):
            x = np.maximum(root(x), low)
        found: Floats = np.sqrt(x / mu)
        return found
