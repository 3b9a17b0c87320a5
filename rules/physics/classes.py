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

from collections.abc import Sequence
from math import factorial, gamma, lgamma, log, pi, sqrt
from typing import Any, NamedTuple

import numpy as np
from scipy import sparse

from overlapse.grammar.model import Block, Floats
from overlapse.rules.physics.harmonics import cartesian_parts, gaunt
from overlapse.rules.physics.placed import Ints, Placed, components, normalised_columns


class Group(NamedTuple):
    """The contracted functions of one l of one atom.

    exponents: the union of those they use, shape (P,).  weights: shape (n, P).  parts: pairs of l
    and the expansion of a component in harmonics of that l.  place: index of each function's first
    component within the atom, shape (n,).
    """

    l: int
    exponents: Floats
    weights: Floats
    parts: tuple[tuple[int, Floats], ...]
    place: Ints

    @property
    def components(self) -> int:
        return len(self.parts[0][1])


class Kind(NamedTuple):
    """Atoms with the same functions.

    members: indices of the atoms.  groups: by rising l.  size: functions of an atom.  order: where
    the functions, taken group by group, stand in the atom; None where that is their order anyway.
    """

    members: Ints
    groups: tuple[Group, ...]
    size: int
    order: Ints | None

    @property
    def top(self) -> int:
        return max((group.l for group in self.groups), default=0)


def kinds(atoms: Sequence[Placed]) -> list[Kind]:
    """The atoms sorted by what functions they carry, in order of first appearance.

    Raises `NotNormalisable` for a function that has no finite positive self-overlap.
    """
    known: dict[int, tuple[object, ...]] = {}
    found: dict[tuple[object, ...], list[int]] = {}
    for index, atom in enumerate(atoms):
        if id(atom.block) not in known:
            known[id(atom.block)] = tuple(
                (shell.angular, shell.exponents.tobytes(), shell.coefficients.tobytes())
                for shell in atom.block.shells
            )
        found.setdefault((atom.spherical, known[id(atom.block)]), []).append(index)
    made = []
    for members in found.values():
        first = atoms[members[0]]
        groups = _groups(first.block, first.spherical)
        order = _order(groups)
        made.append(Kind(np.array(members), groups, len(order), order))
        if np.array_equal(order, np.arange(len(order))):
            made[-1] = made[-1]._replace(order=None)
    return made


def _order(groups: tuple[Group, ...]) -> Ints:
    spread = [(g.place[:, None] + np.arange(g.components)).ravel() for g in groups]
    return np.concatenate(spread) if spread else np.zeros(0, dtype=np.intp)


def _groups(block: Block, spherical: bool) -> tuple[Group, ...]:
    columns: dict[int, list[tuple[Floats, Floats, int]]] = {}
    at = 0
    for index, shell in enumerate(block.shells):
        table = normalised_columns(block, index)
        for column in range(table.shape[1]):
            l = shell.angular[column // shell.columns_per_l]
            used = table[:, column] != 0.0
            columns.setdefault(l, []).append((shell.exponents[used], table[used, column], at))
            at += components(l, spherical)
    groups = []
    for l, members in sorted(columns.items()):
        union = np.unique(np.concatenate([exponents for exponents, _, _ in members]))
        weights = np.zeros((len(members), len(union)))
        for row, (exponents, values, _) in enumerate(members):
            np.add.at(weights[row], np.searchsorted(union, exponents), values)
        parts = ((l, np.eye(2 * l + 1)),) if spherical else cartesian_parts(l)
        groups.append(Group(l, union, weights, parts, np.array([place for *_, place in members])))
    return tuple(groups)


class Term(NamedTuple):
    """One L of one pair of parts: rows of the weight table, and the angular factor.

    first, rows: these rows hold the coefficients of R**0, R**2, ... in g_L.  third: L.  angular:
    shape (components * components', 2L+1).
    """

    first: int
    rows: int
    third: int
    angular: Floats


class GroupPair:
    """Everything about two groups that does not depend on where their atoms are.

    reach: distance (bohr) from which each primitive pair is left out, falling, shape (Q,).  mu:
    reduced exponents, shape (Q,).
    """

    def __init__(self, left: Group, right: Group, tail: "Tail", kinetic: bool = False) -> None:
        self.left, self.right = left, right
        a, b = (
            np.repeat(left.exponents, len(right.exponents)),
            np.tile(right.exponents, len(left.exponents)),
        )
        mu = a * b / (a + b)
        lean = (np.log(2.0 * b / (a + b)), np.log(2.0 * a / (a + b)))
        rows: list[Floats] = []
        self.terms: list[Term] = []
        bounds: dict[int, Floats] = {}  # by twice the power of mu R**2
        for k, turn in left.parts:
            for kk, other in right.parts:
                for third in range(abs(k - kk), k + kk + 1, 2):
                    shape = ((left.l, k), (right.l, kk), third)
                    radial = _radial(*shape, kinetic, lean, mu)
                    factor = np.einsum("am,bn,mnk->abk", turn, other, gaunt(k, kk, third))
                    sign = -1.0 if (k - kk + third) // 2 % 2 else 1.0
                    angular = sign * factor.reshape(-1, 2 * third + 1)
                    self.terms.append(Term(len(rows), len(radial), third, angular))
                    rows += radial
                    size = sqrt(float((angular**2).sum(axis=1).max()) * (2 * third + 1) / (4 * pi))
                    for power, row in enumerate(radial):
                        q = 2 * power + third
                        bounds[q] = bounds.get(q, 0.0) + size * np.abs(row) / mu ** (q / 2)
        strength = np.abs(left.weights).max(axis=0)[:, None] * np.abs(right.weights).max(axis=0)
        reach = tail.reach(mu, {q: row * strength.ravel() for q, row in bounds.items()})
        order = np.argsort(-reach, kind="stable")
        self.reach, self.mu = reach[order], mu[order]
        self.weights = _weights(left.weights, right.weights, order, rows)
        self.top = max(term.third for term in self.terms)

    def fill(
        self, out: Floats, square: Floats, harmonics: list[Floats], shortest: float, room: Floats
    ) -> None:
        """Write the overlaps for p distances into ``out``, shape (n, c, n', c', p).

        n, n': contracted functions; c, c': components.  square: R**2, shape (p,).  harmonics:
        R_LM of the vectors from the right to the left atom.  shortest: the smallest distance.
        room: a buffer of at least the size of ``out``.
        """
        keep = int(np.searchsorted(-self.reach, -shortest))
        table = np.multiply.outer(-self.mu[:keep], square)
        np.exp(table, out=table)
        n, c, m, d, p = out.shape
        radial = (self.weights[:, :keep] @ table).reshape(-1, n, 1, m, 1, p)
        room = room[: out.size].reshape(out.shape)
        for number, term in enumerate(self.terms):
            value = radial[term.first + term.rows - 1]
            for power in range(term.rows - 2, -1, -1):
                value *= square
                value += radial[term.first + power]
            angular = (term.angular @ harmonics[term.third]).reshape(1, c, 1, d, p)
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
    large = sparse.kron(sparse.csr_array(left), sparse.csr_array(right)).tocsc()[:, order]
    stack = sparse.vstack([large @ sparse.diags(row[order]) for row in rows]).tocsr()
    return stack if stack.nnz < 0.2 * stack.shape[0] * stack.shape[1] else stack.toarray()


def _radial(
    one: tuple[int, int],
    two: tuple[int, int],
    third: int,
    kinetic: bool,
    lean: tuple[Floats, Floats],
    mu: Floats,
) -> list[Floats]:
    """Coefficients of R**0, R**2, ... in g_L for normalised primitives, each of shape (Q,).

    one, two: degree and l of the parts.  lean: logarithms of 2 mu / a and 2 mu / b.
    """
    (degree, l), (degree2, l2) = one, two
    s, s2 = (degree - l) // 2, (degree2 - l2) // 2
    front = 8.0 * pi**1.5 / 2.0 ** (third + 2) * factorial(s) * factorial(s2) * 2.0 ** (s + s2)
    front /= sqrt(gamma(degree + 1.5)) * sqrt(gamma(degree2 + 1.5))
    if kinetic:
        front /= 2.0
    lowest = (l + l2 - third) // 2 + kinetic
    rows = [np.zeros_like(mu) for _ in range(lowest + s + s2 + 1)]
    scale = (4.0 * mu) ** (third / 2 + kinetic)
    for u in range(s + 1):
        for v in range(s2 + 1):
            n = lowest + u + v
            value = front * _laguerre(s, l + 0.5, u) * _laguerre(s2, l2 + 0.5, v)
            value *= factorial(n) / 2.0 ** (u + v)
            whole = value * np.exp((l / 2 + 0.75 + u) * lean[0] + (l2 / 2 + 0.75 + v) * lean[1])
            for power in range(n + 1):
                rows[power] += _laguerre(n, third + 0.5, power) * whole * scale * mu**power
    return rows


def _laguerre(n: int, alpha: float, power: int) -> float:
    """Coefficient of x**power in the generalised Laguerre polynomial of degree n."""
    size = lgamma(n + alpha + 1) - lgamma(n - power + 1) - lgamma(alpha + power + 1)
    return float((-1) ** power * np.exp(size - lgamma(power + 1)))


class Tail:
    """How far primitive pairs are followed: what is left out of an element stays below a limit.

    limit: absolute bound of the error of any matrix element.
    """

    def __init__(self, limit: float) -> None:
        self.limit = limit

    def reach(self, mu: Floats, bounds: dict[int, Floats]) -> Floats:
        """Distance from which each pair is left out, shape (Q,), bohr.

        bounds: for each q the factor of x**(q/2) exp(-x), x = mu R**2, in the bound of the pair.
        """
        share = log(self.limit / len(mu))
        with np.errstate(divide="ignore"):
            logs = np.stack([np.log(row) for row in bounds.values()])
        half = np.array(list(bounds))[:, None] / 2.0
        # From the largest power on, every term falls; before, the pair is kept whatever it is.
        low = np.full(len(mu), float(half.max()) + 1e-9)
        high = low + 64.0

        def too_large(x: Floats) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
            size = logs + half * np.log(x) - x
            most = size.max(axis=0)
            with np.errstate(invalid="ignore"):
                total = most + np.log(np.exp(size - most).sum(axis=0))
            return np.asarray(total > share)

        while (large := too_large(high)).any():
            high[large] *= 2.0
        for _ in range(26):
            middle = 0.5 * (low + high)
            large = too_large(middle)
            low, high = np.where(large, middle, low), np.where(large, high, middle)
        found: Floats = np.sqrt(high / mu)
        return found
