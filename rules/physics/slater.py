"""Slater functions, and their least-squares expansions in Gaussian functions.

A Slater function of quantum numbers n, l and exponent zeta has the radial part
r**(n-1) exp(-zeta r), a Gaussian primitive r**l exp(-alpha r**2).  With zeta = 1 their overlap is

    <n l|alpha> = N_n N_l(alpha) J_(n+l+1)(alpha),   J_k = integral of r**k exp(-r - alpha r**2),

over r from zero to infinity, where J_0 + 2 alpha J_1 = 1 and
2 alpha J_k + J_(k-1) = (k-1) J_(k-2) (both by parts), and
J_0 = (1/2) sqrt(pi/alpha) exp(x**2) erfc(x) with x = 1 / (2 sqrt(alpha)).  An expansion for one
zeta serves all: exponents scale with zeta**2, coefficients stay.

The best expansion in given primitives has the coefficients c = S**-1 b / sqrt(b S**-1 b) and the
overlap sqrt(b S**-1 b) with the Slater function; their exponents are varied until the sum of these
overlaps over all functions that share them is greatest.

Source: W. J. Hehre, R. F. Stewart, J. A. Pople, J. Chem. Phys. 51, 2657 (1969); R. F. Stewart, J.
Chem. Phys. 52, 431 (1970); the recurrence of J_k is that of the repeated integrals of the error
function, W. Gautschi, Math. Comput. 15, 227 (1961).
"""

import json
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from math import erfc, exp, factorial, pi, sqrt

import numpy as np

from overlapse.grammar.model import Floats, letter_of
from overlapse.rules.physics.onecentre import norms, primitive_overlap

Orbital = tuple[int, int]  # n and l


@dataclass(frozen=True, slots=True, eq=False)
class Expansion:
    """Slater functions of zeta = 1 that share one list of Gaussian primitives.

    exponents: shape (N,), bohr**-2, falling.  coefficients: for each (n, l) shape (N,), over
    normalised primitives, self-overlap one.  overlaps: with the Slater function, for each (n, l).
    """

    exponents: Floats
    coefficients: dict[Orbital, Floats]
    overlaps: dict[Orbital, float]

    @property
    def name(self) -> str:
        """The shell in the usual notation: 1s, 2sp, 3spd."""
        n = next(iter(self.coefficients))[0]
        return f"{n}{''.join(letter_of(l) for _, l in self.coefficients)}"


def moments(exponents: Floats, top: int) -> Floats:
    """The integrals J_0 to J_top for each exponent (bohr**-2), shape (top + 1, len(exponents)).

    Tight exponents by recurrence upwards from the error function; for diffuse ones that loses
    digits, and the ratios J_k / J_(k-1) are found by their continued fraction downwards instead.
    """
    found = np.empty((top + 1, len(exponents)))
    for at, alpha in enumerate(exponents.tolist()):
        x = 0.5 / sqrt(alpha)
        found[:, at] = _upwards(alpha, x, top) if x < 1.0 else _downwards(alpha, x, top)
    return found


def _upwards(alpha: float, x: float, top: int) -> list[float]:
    first = 0.5 * sqrt(pi / alpha) * exp(x * x) * erfc(x)
    found = [first, (1.0 - first) / (2.0 * alpha)]
    for k in range(2, top + 1):
        found.append(((k - 1) * found[k - 2] - found[k - 1]) / (2.0 * alpha))
    return found[: top + 1]


def _downwards(alpha: float, x: float, top: int) -> list[float]:
    # A start so far up leaves a relative error below 1e-16 (measured against quadrature).
    start = top + 2 + int((13.0 / x + 3.0) ** 2)
    ratio = (sqrt(1.0 + 8.0 * alpha * start) - 1.0) / (4.0 * alpha)
    ratios = []
    for k in range(start - 1, 0, -1):
        ratio = k / (1.0 + 2.0 * alpha * ratio)
        if k <= top:
            ratios.append(ratio)
    found = [1.0 / (1.0 + 2.0 * alpha * ratio)]
    for ratio in reversed(ratios):
        found.append(found[-1] * ratio)
    return found


def slater_overlap(orbital: Orbital, exponents: Floats, zeta: float = 1.0) -> Floats:
    """Overlap of a normalised Slater function with normalised primitives of its l.

    exponents: shape (N,), bohr**-2, positive; zeta in bohr**-1.  Shape (N,).
    """
    n, l = orbital
    alpha = exponents / zeta**2
    overlap: Floats = _norm(n) * norms(alpha, l) * moments(alpha, n + l + 1)[-1]
    return overlap


def slater_zetas(subshells: tuple[Orbital, ...], z: int) -> dict[Orbital, float]:
    """Slater exponents of an atom's occupied subshells by Slater's rules, bohr**-1.

    subshells: in the order in which they fill.  J. C. Slater, Phys. Rev. 36, 57 (1930), with n
    itself for the effective quantum number.
    """
    electrons: dict[Orbital, int] = {}
    left = z
    for n, l in subshells:
        electrons[n, l] = min(left, 4 * l + 2)
        left -= electrons[n, l]
    return {
        orbital: max((z - _screened(orbital, electrons)) / orbital[0], 0.3) for orbital in electrons
    }


def _screened(orbital: Orbital, electrons: dict[Orbital, int]) -> float:
    n, l = orbital
    total = 0.0
    for (m, k), count in electrons.items():
        if m == n and (k == l or max(k, l) < 2):
            total += (0.3 if n == 1 else 0.35) * (count - (k == l))
        elif l < 2 and m == n - 1:
            total += 0.85 * count
        elif m < n or (m == n and k < l):
            total += count
    return total


def _norm(n: int) -> float:
    return float(2.0 ** (n + 0.5) / sqrt(factorial(2 * n)))


def _best(orbital: Orbital, logs: Floats) -> tuple[float, Floats, Floats]:
    """Greatest overlap with the Slater function for given ln(exponent), shape (N,).

    Returns the overlap, the coefficients, and the derivative of the overlap by each logarithm.
    """
    n, l = orbital
    alpha = np.exp(logs)
    integrals = moments(alpha, n + l + 3)
    scale = _norm(n) * norms(alpha, l)
    b = scale * integrals[n + l + 1]
    slope_b = (0.5 * l + 0.75) * b - alpha * scale * integrals[n + l + 3]
    overlap = primitive_overlap(alpha, alpha, l)
    tilt = (alpha[:, None] - alpha[None, :]) / (alpha[:, None] + alpha[None, :])
    slope_s = -(0.5 * l + 0.75) * tilt * overlap
    u = np.linalg.solve(overlap, b)
    greatest = sqrt(float(u @ b))
    return greatest, u / greatest, u * (slope_b - slope_s @ u) / greatest


# Starts that wander off to useless primitives are cut short at these ln(exponent).
_LOWEST, _HIGHEST = -7.0, 9.0


def _loss(logs: Floats, orbitals: tuple[Orbital, ...]) -> tuple[float, Floats]:
    found = [_best(orbital, np.clip(logs, _LOWEST, _HIGHEST)) for orbital in orbitals]
    return sum(1.0 - f[0] for f in found), -np.sum([f[2] for f in found], axis=0)


def fit(orbitals: tuple[Orbital, ...], count: int, starts: int = 30) -> Expansion:
    """Expand Slater functions in ``count`` Gaussians that they share, by least squares.

    The best of ``starts`` minima from scattered starts; always the same for the same arguments.
    Raises ValueError if no start leads to a minimum with distinct primitives.
    """
    # Slow to import, and needed only to make the table.
    from scipy.optimize import minimize

    random = np.random.default_rng(count)
    best: tuple[float, Floats] | None = None
    for _ in range(starts):
        top, step = random.uniform(-1.0, 1.0 + 0.5 * count), random.uniform(0.4, 1.6)
        guess = top - step * np.arange(count) * random.uniform(0.8, 1.2, count)
        try:
            found = minimize(_loss, guess, args=(orbitals,), jac=True, options={"gtol": 1e-11})
        except (ValueError, np.linalg.LinAlgError):
            continue  # two primitives ran into one
        logs = np.sort(found.x)[::-1]
        distinct = bool((np.diff(logs) < -0.05).all())
        within = bool(logs[-1] > _LOWEST and logs[0] < _HIGHEST)
        settled = float(np.abs(found.jac).max()) < 1e-7
        if distinct and within and settled and (best is None or found.fun < best[0]):
            best = float(found.fun), logs
    if best is None:
        raise ValueError(f"no expansion of {orbitals} in {count} Gaussians was found")
    parts = {orbital: _best(orbital, best[1]) for orbital in orbitals}
    return Expansion(
        np.exp(best[1]),
        {orbital: part[1] for orbital, part in parts.items()},
        {orbital: part[0] for orbital, part in parts.items()},
    )


@cache
def expansions(count: int) -> tuple[Expansion, ...]:
    """The tabulated expansions in ``count`` Gaussians; () beyond the table.

    The table is made by `fit`; its file says how.
    """
    text = files("overlapse.rules.physics").joinpath("expansions.json").read_text("utf-8")
    return tuple(_expansion(entry) for entry in json.loads(text)["expansions"].get(str(count), ()))


def _expansion(entry: dict[str, object]) -> Expansion:
    functions: dict[str, dict[str, list[float]]] = entry["functions"]  # type: ignore[assignment]
    orbitals = {(int(name[0]), "spdf".index(name[1])): part for name, part in functions.items()}
    return Expansion(
        np.array(entry["exponents"]),
        {orbital: np.array(part["coefficients"]) for orbital, part in orbitals.items()},
        {orbital: float(part["overlap"]) for orbital, part in orbitals.items()},  # type: ignore[arg-type]
    )
