"""Hartree-Fock for one atom, spherical, in the functions that a block gives it.

All electrons of a shell share one radial function ("equivalent orbitals"), orbitals are pure in l,
and the energy is that of the ground term (`configuration`), so it lies above the Hartree-Fock limit
of that term, whatever the functions.  Only the l of occupied shells play a part.

Closed shells see F = h + M d; an open shell of n electrons sees F + X p / n besides (`radial`).
At the minimum no occupied orbital mixes with an empty one, and n_c F_c = n_o F_o between closed
and open.  One matrix per l with these blocks is diagonalised, extrapolated by DIIS.

Source: C. C. J. Roothaan, Rev. Mod. Phys. 32, 179 (1960) (open shells); P. Pulay, Chem. Phys.
Lett. 73, 393 (1980) (DIIS).
"""

from dataclasses import dataclass, field

import numpy as np

from overlapse.grammar.elements import subshells
from overlapse.grammar.model import Floats
from overlapse.rules.physics.configuration import Configuration
from overlapse.rules.physics.radial import Integrals
from overlapse.rules.physics.slater import slater_zetas

# Combinations of functions whose overlap matrix has a smaller eigenvalue are left out: beyond it
# rounding decides the coefficients.
DEPENDENT = 1e-9
_CONVERGED = 1e-8  # largest element of the gradient, hartree per electron
_STUCK = 1e-5  # the same where the energy no longer moves
_SETTLED = 1e-14  # relative movement of an energy that stands still
CYCLES = 80  # iterations at most
_KEPT = 8  # matrices that DIIS combines


@dataclass(frozen=True, eq=False)
class Solution:
    """An atom's orbitals, or how far they got.

    energy: hartree.  converged: whether the gradient vanished.  orbitals: for each l the occupied
    ones over the functions given, shape (ncontr, nshell).  electrons: in each, for each l.  cycles:
    iterations.  gradient: largest element left.
    """

    energy: float
    converged: bool
    orbitals: dict[int, Floats]
    cycles: int
    gradient: float
    levels: dict[int, Floats] = field(default_factory=dict)


def too_few(functions: dict[int, Floats], shells: Configuration) -> int | None:
    """The first l that has fewer functions than occupied shells, or None."""
    for l, held in shells.electrons.items():
        if l not in functions or functions[l].shape[1] < len(held):
            return l
    return None


class Field:
    """Energy and Fock matrices of an atom, over its primitives, from its orbitals."""

    def __init__(self, integrals: Integrals) -> None:
        self.integrals = integrals
        self.shells = integrals.shells
        # The one open shell of each l is its last.
        self.opened = {
            l: held[-1] for l, held in self.shells.electrons.items() if held[-1] < 4 * l + 2
        }

    def __call__(
        self, orbitals: dict[int, Floats]
    ) -> tuple[float, dict[int, Floats], dict[int, Floats]]:
        """Energy, Fock matrices of closed shells for each l, and of open ones for each open l.

        orbitals: over primitives, shape (nprim, nshell) for each l.
        """
        integrals = self.integrals
        densities = {l: (v * np.array(self.shells.electrons[l])) @ v.T for l, v in orbitals.items()}
        packed = integrals.pack(densities)
        seen = integrals.repulsion @ packed
        bare = integrals.bare
        field = integrals.unpack(seen)
        closed = {l: bare[l] + field[l] for l in bare}
        energy = sum(float((densities[l] * bare[l]).sum()) for l in bare)
        energy += 0.5 * float(packed @ seen)
        opened = {l: closed[l] for l in self.opened}
        singles = {l: self._single(l, orbitals[l]) for l in self.opened}
        for (l, m), matrix in integrals.coupling.items():
            energy += float(singles[l] @ matrix @ singles[m])
            for one, seen_by in ((l, matrix @ singles[m]), (m, matrix.T @ singles[l])):
                # dE/dP of one orbital, shared out over its electrons.
                extra = seen_by[integrals.places[one]] / self.opened[one]
                opened[one] = opened[one] + extra
        return energy, closed, opened

    def _single(self, l: int, orbitals: Floats) -> Floats:
        first, second = self.integrals.upper[l]
        last = orbitals[:, -1]
        return last[first] * last[second] * np.where(first == second, 1.0, 2.0)


def first_guess(integrals: Integrals) -> dict[int, Floats]:
    """A field to begin with: each shell's electrons spread as a Gaussian of its Slater radius."""
    z = integrals.shells.charge
    shares = 1.0 - 1.0 / z  # an electron does not see itself
    field = {l: h.copy() for l, h in integrals.bare.items()}
    zetas = slater_zetas(subshells(z), z)
    held: dict[int, list[int]] = {l: list(n) for l, n in integrals.shells.electrons.items()}
    for (n, l), zeta in zetas.items():
        electrons = held[l][n - l - 1]
        width = 6.0 * zeta**2 / ((2 * n + 1) * (2 * n + 2))
        for m, part in integrals.attraction_by(width).items():
            field[m] += shares * electrons * part
    return field


def solve(
    integrals: Integrals,
    functions: dict[int, Floats],
    start: dict[int, Floats] | None = None,
    cycles: int = CYCLES,
) -> Solution:
    """Find the orbitals of an atom in given functions.

    functions: contraction coefficients over the primitives of ``integrals``, for each occupied l
    shape (nprim, ncontr), at least as many as shells (`too_few`).  start: occupied orbitals over
    the functions to begin with.  cycles: iterations at most.  What does not converge comes back so
    marked, with the best orbitals found.  Raises ValueError where an l has too few functions, or
    too few that are independent.
    """
    lacking = too_few(functions, integrals.shells)
    if lacking is not None:
        raise ValueError(f"fewer functions than occupied shells for l = {lacking}")
    with np.errstate(all="ignore"):
        return _Iteration(integrals, functions, cycles).run(start)


class _Iteration:
    def __init__(self, integrals: Integrals, functions: dict[int, Floats], cycles: int) -> None:
        self.integrals = integrals
        self.cycles = cycles
        self.shells = integrals.shells
        self.field = Field(integrals)
        self.functions = {l: functions[l] for l in self.shells.electrons}
        self.bases: dict[int, Floats] = {}  # orthonormal combinations, over the functions
        for l, c in self.functions.items():
            overlap = c.T @ integrals.overlap[l] @ c
            scale = 1.0 / np.sqrt(np.diagonal(overlap))
            if not np.isfinite(scale).all():
                raise ValueError(f"a function of l = {l} cannot be normalised")
            values, vectors = np.linalg.eigh(overlap * scale[:, None] * scale)
            kept = values > DEPENDENT
            if kept.sum() < len(self.shells.electrons[l]):
                raise ValueError(f"too few independent functions for l = {l}")
            self.bases[l] = scale[:, None] * vectors[:, kept] / np.sqrt(values[kept])
        # Orthonormal combinations over the primitives.
        self.over = {l: self.functions[l] @ self.bases[l] for l in self.bases}

    def _turned(self, matrices: dict[int, Floats]) -> dict[int, Floats]:
        return {l: self.over[l].T @ matrices[l] @ self.over[l] for l in matrices}

    def _begin(self, start: dict[int, Floats] | None) -> dict[int, Floats]:
        if start is None:
            guess = self._turned(first_guess(self.integrals))
            return {l: np.linalg.eigh(g)[1] for l, g in guess.items()}
        begun = {}
        for l, c in self.functions.items():
            inside = self.over[l].T @ self.integrals.overlap[l] @ (c @ start[l])
            full, _, _ = np.linalg.svd(inside, full_matrices=True)
            orthogonal, _ = np.linalg.qr(np.hstack([inside, full[:, inside.shape[1] :]]))
            begun[l] = orthogonal
        return begun

    def run(self, start: dict[int, Floats] | None) -> Solution:
        vectors = self._begin(start)
        history: list[tuple[dict[int, Floats], Floats]] = []
        best = Solution(np.inf, False, {}, 0, np.inf)
        before = [np.inf, np.inf]
        for cycle in range(1, self.cycles + 1):
            occupied = {l: v[:, : len(self.shells.electrons[l])] for l, v in vectors.items()}
            energy, closed, opened = self.field({l: self.over[l] @ v for l, v in occupied.items()})
            if not np.isfinite(energy):
                break
            effective, error = self._effective(vectors, closed, opened)
            size = float(np.abs(error).max()) if error.size else 0.0
            # Among very tight functions rounding keeps the gradient from falling as far.
            stuck = max(abs(energy - e) for e in before) < _SETTLED * abs(energy)
            done = size < _CONVERGED or (stuck and size < _STUCK)
            before = [before[1], energy]
            if size < best.gradient or done:
                orbitals = {l: self.bases[l] @ v for l, v in occupied.items()}
                best = Solution(energy, done, orbitals, cycle, size)
            if done:
                break
            history.append((effective, error))
            del history[:-_KEPT]
            mixed = _extrapolated(history)
            try:
                solved = {l: np.linalg.eigh(m) for l, m in mixed.items()}
            except np.linalg.LinAlgError:
                break
            vectors = {l: found[1] for l, found in solved.items()}
        if not best.orbitals:
            raise ValueError("the numbers are out of range for an energy")
        return best

    def _effective(
        self,
        vectors: dict[int, Floats],
        closed: dict[int, Floats],
        opened: dict[int, Floats],
    ) -> tuple[dict[int, Floats], Floats]:
        """The matrix to diagonalise for each l, and all elements that should vanish."""
        over_closed, over_open = self._turned(closed), self._turned(opened)
        matrices, errors = {}, []
        for l, v in vectors.items():
            held = self.shells.electrons[l]
            count = len(held)
            f = v.T @ over_closed[l] @ v
            if l in over_open:
                g = v.T @ over_open[l] @ v
                last = count - 1
                between = (held[0] * f[:last, last] - held[last] * g[:last, last]) / (
                    held[0] - held[last]
                ) if last else f[:last, last]  # fmt: skip
                f[:last, last] = f[last, :last] = between
                f[last, last:] = f[last:, last] = g[last, last:]
                error = np.zeros_like(f)
                error[:last, last], error[last, :last] = between, -between
            else:
                error = np.zeros_like(f)
            error[:count, count:] = f[:count, count:]
            error[count:, :count] = -f[count:, :count]
            matrices[l] = v @ f @ v.T
            errors.append((v @ error @ v.T).ravel())
        return matrices, np.concatenate(errors)


def _extrapolated(
    history: list[tuple[dict[int, Floats], Floats]],
) -> dict[int, Floats]:
    """The combination of matrices whose errors cancel best."""
    count = len(history)
    newest = history[-1][0]
    if count < 2:
        return newest
    errors = np.array([error for _, error in history])
    gram = errors @ errors.T
    system = np.zeros((count + 1, count + 1))
    system[:count, :count] = gram / max(float(np.diagonal(gram).max()), 1e-300)
    system[count, :count] = system[:count, count] = 1.0
    right = np.zeros(count + 1)
    right[count] = 1.0
    try:
        weights = np.linalg.lstsq(system, right, rcond=1e-14)[0][:count]
    except np.linalg.LinAlgError:
        return newest
    if not np.isfinite(weights).all():
        return newest
    return {l: np.tensordot(weights, np.array([m[l] for m, _ in history]), axes=1) for l in newest}
