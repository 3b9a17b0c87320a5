"""Ground-state configurations of atoms, and how their open shells couple.

The energy of a configuration in a spherical field, with all electrons of a shell in one radial
function, is

    E = sum_i n_i h_i + sum_(i<=j) sum_k [a_ij(k) R_k(ii, jj) + b_ij(k) R_k(ij, ij)],

R_k(ab, cd) the Slater integral of the charge distributions ab and cd.  If each electron saw the
spherical average of all others, with as many of either spin, then

    a_ij(0) = n_i n_j / (1 + d_ij),   b_ij(k) = -1/2 n_i n_j w_k(l_i, l_j) / (1 + d_ij),

w_k the square of the 3j symbol (l k l'; 0 0 0).  That counts an electron of an open shell against
itself.  The average of the configuration does not, and the ground term lies lower still:

    open shell:  F_0 [n**2 / (4 (2l+1)) - n/2] + F_k w_k [n**2/4 - n(n-1)/2 (2l+1)/(4l+1)],
                 and the multiples of F_k in `atoms.json`;
    s1 beside an open shell of parallel spins:  -n/2 w_k G_k.

Source: J. C. Slater, Quantum Theory of Atomic Structure, McGraw-Hill 1960; C. Froese Fischer, The
Hartree-Fock Method for Atoms, Wiley 1977.
"""

import json
import re
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any, Literal

# "term": the energy of the ground LS term; "fraction": each orbital of an open shell holds the
# same fraction of an electron and spins are averaged, which is how programs start their atoms.
Coupling = Literal["term", "fraction"]

# Squares of the 3j symbols (l k l'; 0 0 0), l <= l'.
SQUARES: dict[tuple[int, int], dict[int, float]] = {
    (0, 0): {0: 1.0},
    (0, 1): {1: 1 / 3},
    (0, 2): {2: 1 / 5},
    (1, 1): {0: 1 / 3, 2: 2 / 15},
    (1, 2): {1: 2 / 15, 3: 3 / 35},
    (2, 2): {0: 1 / 5, 2: 2 / 35, 4: 2 / 35},
}
_CORES = {"[He]": "1s2", "[Ne]": "1s2 2s2 2p6", "[Ar]": "1s2 2s2 2p6 3s2 3p6"}


@dataclass(frozen=True)
class Configuration:
    """The shells of an atom.

    charge: nuclear charge Z.  electrons: for each l the electrons of its shells, inner first.
    same: for each open l the corrections {k: multiple of F_k} against evenly spread electrons.
    mixed: for each pair of open l the corrections {k: multiple of G_k}.  text, term: as in the
    table.  limit: energy of the Hartree-Fock limit of the term, hartree.
    """

    charge: int
    electrons: dict[int, tuple[int, ...]]
    same: dict[int, dict[int, float]]
    mixed: dict[tuple[int, int], dict[int, float]]
    text: str
    term: str
    limit: float


@cache
def _table() -> Any:
    return json.loads(files("overlapse.rules.physics").joinpath("atoms.json").read_text("utf-8"))


def known(z: int) -> bool:
    """Whether the ground state of an element is on record: H to Kr."""
    return str(z) in _table()["atoms"]


@cache
def configuration(z: int, coupling: Coupling = "term") -> Configuration:
    """The ground configuration of a neutral atom, H to Kr.  Raises KeyError beyond."""
    return _made(z, _table()["atoms"][str(z)], coupling)


@cache
def filled(z: int) -> Configuration | None:
    """The configuration with two electrons in 4s, of atoms that have one of them in 3d instead.

    Sets are often made for it, as it is that of the neighbours.
    """
    entry = _table()["filled"].get(str(z))
    return None if entry is None else _made(z, entry, "term")


def _made(z: int, entry: Any, coupling: Coupling) -> Configuration:
    text, term = entry["configuration"], entry["term"]
    shells: dict[int, list[int]] = {}
    opened: dict[int, int] = {}
    for core, long in _CORES.items():
        text = text.replace(core, long)
    for letter, count in re.findall(r"\d([spd])(\d+)", text):
        l, n = "spd".index(letter), int(count)
        shells.setdefault(l, []).append(n)
        if n < 4 * l + 2:
            opened[l] = n
    same: dict[int, dict[int, float]] = {}
    mixed: dict[tuple[int, int], dict[int, float]] = {}
    if coupling == "term":
        same = {l: _correction(l, n, term) for l, n in opened.items()}
        if len(opened) > 1:
            (low, _), (high, n) = sorted(opened.items())  # s1 and a half-filled shell: chromium
            mixed[low, high] = {k: -0.5 * n * w for k, w in SQUARES[low, high].items()}
    electrons = {l: tuple(n) for l, n in sorted(shells.items())}
    return Configuration(
        z, electrons, same, mixed, entry["configuration"], entry["term"], entry["limit"]
    )


def _correction(l: int, n: int, term: str) -> dict[int, float]:
    """Multiples of F_k by which the term differs from evenly spread electrons."""
    found = {}
    for k, w in SQUARES[l, l].items():
        if k == 0:
            found[0] = n * n / (4.0 * (2 * l + 1)) - 0.5 * n
        else:
            found[k] = w * (0.25 * n * n - 0.5 * n * (n - 1) * (2 * l + 1) / (4 * l + 1))
    deviations: dict[str, list[int]] = _table()["terms"].get(f"{'spd'[l]}{n} {term}", {})
    for order, (above, below) in deviations.items():
        found[int(order)] += above / below
    return found


def pair_weights(shells: Configuration) -> tuple[list[tuple[int, int]], dict[int, Any]]:
    """Orbitals as (l, ordinal), and for each k the weights (a, b) of all pairs of orbitals.

    a and b are dictionaries {(i, j): weight}, i <= j, of R_k(ii, jj) and R_k(ij, ij); for i = j
    both are the same integral and stand in a.
    """
    orbitals = [(l, at) for l, held in shells.electrons.items() for at in range(len(held))]
    held = [shells.electrons[l][at] for l, at in orbitals]
    weights: dict[int, Any] = {k: ({}, {}) for k in range(5)}
    for i, (l, _) in enumerate(orbitals):
        for j in range(i, len(orbitals)):
            m = orbitals[j][0]
            product = held[i] * held[j] / (2.0 if i == j else 1.0)
            weights[0][0][i, j] = product
            both_open = held[i] < 4 * l + 2 and held[j] < 4 * m + 2
            for k, w in SQUARES[l, m].items():
                value = -0.5 * product * w
                if i == j and both_open:
                    value += shells.same.get(l, {}).get(k, 0.0)
                elif both_open:
                    value += shells.mixed.get((l, m), {}).get(k, 0.0)
                target = weights[k][0] if i == j else weights[k][1]
                target[i, j] = target.get((i, j), 0.0) + value
    return orbitals, weights
