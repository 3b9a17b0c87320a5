"""How an atom's energy changes with the numbers of its functions, its orbitals following.

The orbitals are psi_i = sum_m u_im f_m, the functions f_m = sum_a c_am phi_a.  With multipliers
e_ij that keep the orbitals orthonormal, L = E - sum_ij e_ij (<i|j> - d_ij) is stationary in all u
and e at the solution.  So the derivative with respect to a printed number x is that of L at fixed
orbitals, and the second derivatives, orbitals relaxed, are

    E_xy = L_xy - L_xz (L_zz)**-1 L_zy,   z = (u, e).

All second derivatives of L are those of the orbitals in the space of phi and phi' (`extended`).

Source: P. Pulay, Mol. Phys. 17, 197 (1969) (derivatives); J. Gerratt, I. M. Mills, J. Chem. Phys.
49, 1719 (1968) (relaxation of orbitals); derived here for equivalent orbitals.
"""

from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.configuration import pair_weights
from overlapse.rules.physics.extended import Charges, charges, energies, overlaps
from overlapse.rules.physics.radial import Integrals


class Handle(NamedTuple):
    """A printed number as what it does to the functions.

    exponent: whether it is an exponent, else a coefficient.  parts: where it acts, as (l,
    primitive, functions); a coefficient acts in one function.
    """

    exponent: bool
    parts: tuple[tuple[int, int, tuple[int, ...]], ...]


class Response(NamedTuple):
    """Derivatives with respect to ln(exponent) and ln|coefficient| of each handle, hartree.

    gradient: shape (handles,).  curvature: shape (handles, handles), orbitals relaxed.
    """

    gradient: Floats
    curvature: Floats


def _charges(integrals: Integrals) -> dict[tuple[int, int, int], Charges]:
    """The charges of an atom's primitives, kept beside its other integrals."""
    if integrals.kept is None:
        integrals.kept = charges(integrals)
    return integrals.kept  # type: ignore[return-value]


class _Orbital(NamedTuple):
    l: int
    at: int  # among those of its l
    electrons: int
    vector: Floats  # over primitives
    over: Floats  # over functions
    slot: slice  # its place in the space of all orbitals' phi and phi'


def response(
    integrals: Integrals,
    functions: dict[int, Floats],
    orbitals: dict[int, Floats],
    handles: list[Handle],
) -> Response:
    """Derivatives of the energy at converged orbitals.

    functions: shape (nprim, ncontr) for each l; orbitals: over the functions, shape
    (ncontr, nshell), from `atom.solve`.
    """
    with np.errstate(all="ignore"):
        return _Work(integrals, functions, orbitals).response(handles)


def gradient(
    integrals: Integrals,
    functions: dict[int, Floats],
    orbitals: dict[int, Floats],
    handles: list[Handle],
) -> Floats:
    """The first derivatives alone, as in `response`, several times as fast."""
    with np.errstate(all="ignore"):
        return _Work(integrals, functions, orbitals, bends=False).gradient(handles)


class _Work:
    def __init__(
        self,
        integrals: Integrals,
        functions: dict[int, Floats],
        orbitals: dict[int, Floats],
        bends: bool = True,
    ) -> None:
        self.integrals = integrals
        self.functions = functions
        self.bends = bends
        pairs, self.weights = pair_weights(integrals.shells)
        self.orbitals: list[_Orbital] = []
        start = 0
        for l, at in pairs:
            over = orbitals[l][:, at]
            size = 2 * len(integrals.exponents[l])
            held = integrals.shells.electrons[l][at]
            self.orbitals.append(
                _Orbital(l, at, held, functions[l] @ over, over, slice(start, start + size))
            )
            start += size
        self.size = start
        ls = list(integrals.exponents)
        self.one = {l: energies(integrals, l) for l in ls}
        self.metric = {l: overlaps(integrals, l) for l in ls}
        self.charges = _charges(integrals)
        self._contract()
        self._derive()

    def _contract(self) -> None:
        """Charges of each primitive (phi, phi'; phi'') with each orbital, and of two orbitals."""
        self.with_orbital: dict[tuple[int, int, int], tuple[Floats, Floats]] = {}
        self.of_pair: dict[tuple[int, int, int], Floats] = {}
        for (l, m, k), found in self.charges.items():
            n = len(self.integrals.exponents[m])
            for j, other in enumerate(self.orbitals):
                if other.l == m:
                    first = np.einsum("xbg,b->xg", found.first[:, :n], other.vector)
                    second = (
                        np.einsum("xbg,b->xg", found.second, other.vector) if self.bends else first
                    )
                    self.with_orbital[l, j, k] = (first, second)
        for i, orbital in enumerate(self.orbitals):
            n = len(orbital.vector)
            for j, other in enumerate(self.orbitals):
                for k in range(5):
                    if (orbital.l, other.l, k) in self.charges:
                        first = self.with_orbital[orbital.l, j, k][0]
                        self.of_pair[i, j, k] = orbital.vector @ first[:n]

    def _derive(self) -> None:
        """First and second derivatives of E by the orbitals, over (phi, phi') and (phi'')."""
        self.slopes = [
            2.0 * o.electrons * self._over(self.one[o.l].first, o) for o in self.orbitals
        ]
        self._slope()
        self.plain = [slope.copy() for slope in self.slopes]
        if self.bends:
            self._bend()

    def _slope(self) -> None:
        for i, orbital in enumerate(self.orbitals):
            seen: dict[int, Floats] = {}
            for k, (same, mixed) in self.weights.items():
                for j in range(len(self.orbitals)):
                    pair = (min(i, j), max(i, j))
                    if weight := same.get(pair, 0.0):
                        factor = (4.0 if i == j else 2.0) * weight
                        seen[k] = seen.get(k, 0.0) + factor * self.of_pair[j, j, k]
                    if weight := mixed.get(pair, 0.0):
                        first = self.with_orbital[orbital.l, j, k][0]
                        self.slopes[i] += 2.0 * weight * (first @ self.of_pair[i, j, k])
            for k, field in seen.items():
                self.slopes[i] += self.with_orbital[orbital.l, i, k][0] @ field

    def _bend(self) -> None:
        self.further = [2.0 * o.electrons * self.one[o.l].second @ o.vector for o in self.orbitals]
        self.bent = np.zeros((self.size, self.size))
        for i, orbital in enumerate(self.orbitals):
            own = 2.0 * orbital.electrons * self.one[orbital.l].first
            field: dict[int, Floats] = {}
            for k, (same, mixed) in self.weights.items():
                for j in range(len(self.orbitals)):
                    pair = (min(i, j), max(i, j))
                    if weight := same.get(pair, 0.0):
                        factor = (4.0 if i == j else 2.0) * weight
                        field[k] = field.get(k, 0.0) + factor * self.of_pair[j, j, k]
                    if weight := mixed.get(pair, 0.0):
                        first, second = self.with_orbital[orbital.l, j, k]
                        charge = self.of_pair[i, j, k]
                        self.further[i] += 2.0 * weight * (second @ charge)
                        own += 2.0 * weight * (first @ first.T)
                if weight := same.get((i, i), 0.0):
                    first = self.with_orbital[orbital.l, i, k][0]
                    own += 8.0 * weight * (first @ first.T)
            for k, seen in field.items():
                self.further[i] += self.with_orbital[orbital.l, i, k][1] @ seen
                own += self.charges[orbital.l, orbital.l, k].first @ seen
            self.bent[orbital.slot, orbital.slot] = own
            for j in range(i + 1, len(self.orbitals)):
                block = self._between(i, j)
                self.bent[orbital.slot, self.orbitals[j].slot] = block
                self.bent[self.orbitals[j].slot, orbital.slot] = block.T

    def _between(self, i: int, j: int) -> Floats:
        left, right = self.orbitals[i], self.orbitals[j]
        block = np.zeros((left.slot.stop - left.slot.start, right.slot.stop - right.slot.start))
        for k, (same, mixed) in self.weights.items():
            if weight := same.get((i, j), 0.0):
                one = self.with_orbital[left.l, i, k][0]
                two = self.with_orbital[right.l, j, k][0]
                block += 4.0 * weight * (one @ two.T)
            if weight := mixed.get((i, j), 0.0):
                found: Charges = self.charges[left.l, right.l, k]
                one = self.with_orbital[left.l, j, k][0]
                two = self.with_orbital[right.l, i, k][0]
                block += 2.0 * weight * (found.first @ self.of_pair[i, j, k] + one @ two.T)
        return block

    @staticmethod
    def _over(matrix: Floats, orbital: _Orbital) -> Floats:
        """Matrix elements of phi and phi' with an orbital."""
        seen: Floats = matrix[:, : len(orbital.vector)] @ orbital.vector
        return seen

    def gradient(self, handles: list[Handle]) -> Floats:
        """First derivatives by the numbers, orthonormality kept."""
        self._hold_orthonormal()
        found: Floats = self._moves(handles) @ np.concatenate(self.slopes)
        return found

    def _moves(self, handles: list[Handle]) -> Floats:
        """What each number does to the orbitals, over their phi and phi'."""
        moves = np.zeros((len(handles), self.size))
        of = {l: [o for o in self.orbitals if o.l == l] for l in self.functions}
        for x, handle in enumerate(handles):
            for l, a, columns in handle.parts:
                shift = a + (len(self.integrals.exponents[l]) if handle.exponent else 0)
                for column in columns:
                    weight = self.functions[l][a, column]
                    for o in of[l]:
                        moves[x, o.slot.start + shift] += weight * o.over[column]
        return moves

    def response(self, handles: list[Handle]) -> Response:
        """Derivatives by the numbers, orthonormality kept and orbitals relaxed."""
        self._hold_orthonormal()
        moves = self._moves(handles)
        slope = np.concatenate(self.slopes)
        direct = moves @ self.bent @ moves.T
        self._add_second_order(direct, handles)
        turns, mixed = self._turns(handles, moves)
        hold_x, hold_u = self.holds @ moves.T, self.holds @ turns.T
        count, held = len(turns), len(self.holds)
        inner = np.zeros((count + held,) * 2)
        inner[:count, :count] = turns @ self.bent @ turns.T
        inner[:count, count:] = -hold_u.T
        inner[count:, :count] = -hold_u
        right = np.vstack([mixed.T, -hold_x])
        values, vectors = np.linalg.eigh(inner)
        # Rotations among closed shells change nothing: their eigenvalues vanish.
        kept = np.abs(values) > 1e-9 * np.abs(values).max()
        part = vectors[:, kept].T @ right
        curvature = direct - part.T @ (part / values[kept, None])
        return Response(moves @ slope, 0.5 * (curvature + curvature.T))

    def _hold_orthonormal(self) -> None:
        """Turn the derivatives of E into those of L, and keep those of the constraints."""
        holds = []
        for i, left in enumerate(self.orbitals):
            for j, right in enumerate(self.orbitals):
                if left.l != right.l or j < i:
                    continue
                n = len(left.vector)
                one, two = self.metric[left.l].first, self.metric[left.l].second
                # At the solution both estimates agree.
                e = 0.25 * float(self.plain[i][:n] @ right.vector + self.plain[j][:n] @ left.vector)
                row = np.zeros(self.size)
                row[left.slot] += self._over(one, right)
                row[right.slot] += self._over(one, left)
                holds.append(row)
                for a, b in {(i, j), (j, i)}:
                    first, second = self.orbitals[a], self.orbitals[b]
                    self.slopes[a] = self.slopes[a] - 2.0 * e * self._over(one, second)
                    if not self.bends:
                        continue
                    self.further[a] = self.further[a] - 2.0 * e * (two @ second.vector)
                    self.bent[first.slot, second.slot] -= 2.0 * e * one
        self.holds = np.array(holds)

    def _add_second_order(self, direct: Floats, handles: list[Handle]) -> None:
        """Terms of the functions' own second derivatives."""
        places: dict[tuple[int, int, int], int] = {}
        for x, handle in enumerate(handles):
            if not handle.exponent:
                l, a, (column,) = handle.parts[0]
                places[l, a, column] = x
        for x, handle in enumerate(handles):
            if not handle.exponent:
                continue
            for l, a, columns in handle.parts:
                n = len(self.integrals.exponents[l])
                for o, slope, further in zip(self.orbitals, self.slopes, self.further, strict=True):
                    if o.l != l:
                        continue
                    for column in columns:
                        part = float(self.functions[l][a, column] * o.over[column])
                        direct[x, x] += part * further[a]
                        y = places.get((l, a, column))
                        if y is not None:
                            direct[x, y] += part * slope[n + a]
                            direct[y, x] += part * slope[n + a]

    def _turns(self, handles: list[Handle], moves: Floats) -> tuple[Floats, Floats]:
        """Directions of the orbitals' own coefficients, and their mixed second derivatives."""
        rows, owners = [], []
        for o in self.orbitals:
            n = len(o.vector)
            for column in range(self.functions[o.l].shape[1]):
                row = np.zeros(self.size)
                row[o.slot.start : o.slot.start + n] = self.functions[o.l][:, column]
                rows.append(row)
                owners.append((o.l, column))
        turns = np.array(rows)
        mixed = moves @ self.bent @ turns.T
        index: dict[tuple[int, int], list[int]] = {}
        for at, owner in enumerate(owners):
            index.setdefault(owner, []).append(at)
        for x, handle in enumerate(handles):
            for l, a, columns in handle.parts:
                shift = a + (len(self.integrals.exponents[l]) if handle.exponent else 0)
                slopes = [
                    s[shift] for o, s in zip(self.orbitals, self.slopes, strict=True) if o.l == l
                ]
                for column in columns:
                    for at, slope in zip(index[l, column], slopes, strict=True):
                        mixed[x, at] += self.functions[l][a, column] * slope
        return turns, mixed
