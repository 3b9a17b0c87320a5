"""What a self-consistent field without removal of functions will meet: safe, strained, or failing.

A unit eigenvector v of S with a small eigenvalue lambda stands for the normalised combination
f = v / sqrt(lambda).  Rounding of two-electron integrals, of relative size eps, is blown up by
lambda**-2 in the repulsion (ff|ff), but the field only notices as far as f is occupied.  If p
electrons are in f, energy and gradient carry a noise (hartree) of about

    E = sum over f of  k eps sqrt(T) (p / lambda)**2,
    G = sum over f of  k eps sqrt(T) p**(3/2) / lambda**2.

T = v' T v / lambda in hartree is the kinetic energy of f, whose root measures how compact f is.  k
is 1 where f vanishes within the functions of each centre by itself (near-twins, whose integrals
share their rounding), 5 where it vanishes between centres.  So the same small eigenvalue can be
harmless (tight twins that hold little, combinations that no occupied orbital has the symmetry of)
or fatal.

The electrons in f are those that the field of `molecule` puts there.  Its occupied spin orbitals i
are found among all combinations above 1e-9, and

    p = sum over i of  <f|i>**2,   below 1e-9, for want of digits,  (F_fi / (F_ff - e_i))**2.

Limits: a field is strained above E = 1.5e-8 and fails above G = 1e-4.  A program asks for an energy
to about 1e-9 hartree and for gradients to about its root, 3e-5, so noise begins to matter there.
The powers of p, lambda and T are those of the formulas (a free fit gives 1.0 and 0.76 in place of
1 and 3/4); k and the two limits were chosen on some 290 fields.

On 56 systems that took no part the class was right for 89 %: for every "safe" and every "fails",
and for half of the "strained", which lie between.  No failure was called safe, there or in the
choice.

An eigenvalue below 1e-10 that is felt by no orbital, by the symmetry of the molecule as a rule, is
called strained all the same: a slight distortion or another filling of the levels undoes that.  One
within rounding of zero always fails.

Where the field is that of the electron gas (many atoms and electrons), p mostly comes out too high,
in diffuse functions by a factor of ten.  It is made first: noise below a tenth of the limit is
looked into no further.  Without a field (too many functions, a core potential) only
lambda is judged: fails below 5e-10, strained below 1e-7.  That is much coarser.

Source: the perturbation formula is that of single excitations, A. Szabo, N. S. Ostlund, Modern
Quantum Chemistry, chapter 6; calibration and judgement: tests/bench/outlook.py and its figures.
"""

from collections.abc import Sequence
from typing import Literal, NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Floats, letter_of
from overlapse.rules.physics.molecule import (
    Field,
    affordable,
    exchange_affordable,
    filled,
    molecular_field,
)
from overlapse.rules.physics.placed import Functions, Placed

Level = Literal["safe", "strained", "fails"]

STRAINED, FAILS = 1.5e-8, 1e-4  # hartree: noise of energy and of gradient, with a field
PLAIN = 0.1  # of the limit: so little noise with the electron gas is looked into no further
GAS = 0.3  # times these limits, where exchange is that of the electron gas
BETWEEN = 5.0  # factor k between centres, where integrals do not share their rounding
SMALL, TINY = 1e-7, 5e-10  # of the smallest eigenvalue, without a field
UNPROTECTED = 1e-10  # eigenvalue below which symmetry alone is no comfort
LOOKED_AT = 1e-6  # eigenvalues below are looked into
LARGE = 700  # functions, from which other algorithms than full diagonalisation are cheaper
DIGITS = 1e-9  # eigenvalue from which a combination can be treated like any other
GAP = 0.1  # hartree: smallest denominator, so that a degeneracy does not blow up the estimate
APART = 10.0  # times the eigenvalue: norm of the parts on single centres, from which it is between


class Outlook(NamedTuple):
    """The outlook, the measure behind it, the limit that it was compared with, and why in words.

    The measure is noise in hartree where a field was made: of the gradient where it fails, else of
    the energy.  Without a field it is the smallest eigenvalue of S, which fails below its limits.
    """

    level: Level
    measure: float
    limit: float
    reason: str


def foresee(
    atoms: Sequence[Placed],
    overlap: Floats,
    kinetic: Floats | None,
    functions: Functions | None = None,
    *,
    empty: Sequence[int] = (),
    charge: int = 0,
    unpaired: int | None = None,
    smallest: float | None = None,
    exchange: bool = True,
) -> Outlook:
    """The outlook for placed atoms; a field is made where it is needed and can be afforded.

    overlap, kinetic: their matrices, shape (n, n), hartree.  empty: indices of atoms that only
    carry functions.  charge: of the molecule.  unpaired: electrons, the fewest possible where None.
    smallest: eigenvalue of the overlap, where it is known already.  exchange: as in
    `molecule.molecular_field`.
    """
    if smallest is None:
        smallest = _smallest(overlap)
    nuclei, pair = filled(atoms, empty, charge, unpaired)
    whole = all(atom.block.potential is None for atom in atoms) and sum(pair) > 0
    doubtful = _rounding(overlap) <= smallest < LOOKED_AT
    if kinetic is None or not (doubtful and whole and affordable(atoms, len(overlap))):
        return outlook(overlap, kinetic, functions, smallest=smallest)

    def seen(exchange: bool) -> Outlook:
        field = molecular_field(atoms, nuclei, overlap, kinetic, pair, exchange=exchange)
        return outlook(overlap, kinetic, functions, field=field, smallest=smallest)

    found = seen(exchange=False)
    is_plain = found.level == "safe" and found.measure < PLAIN * found.limit
    if is_plain or not (exchange and exchange_affordable(len(atoms), pair)):
        return found
    return seen(exchange=True)


def outlook(
    overlap: Floats,
    kinetic: Floats | None = None,
    functions: Functions | None = None,
    *,
    field: Field | None = None,
    smallest: float | None = None,
) -> Outlook:
    """The outlook for an overlap matrix, shape (n, n), symmetric with ones on its diagonal.

    kinetic: matrix of the kinetic energy, hartree, and functions: needed where there is a field,
    else only to say in words what kind of combination it is.  smallest: as in `foresee`.
    """
    if smallest is None:
        smallest = _smallest(overlap)
    if smallest < _rounding(overlap):
        what = "S is not positive" if smallest <= 0.0 else "S is singular"
        reason = f"{what} within rounding (smallest eigenvalue {smallest:.1e})"
        return Outlook("fails", smallest, _rounding(overlap), reason)
    if smallest >= LOOKED_AT or kinetic is None or functions is None or field is None:
        return _by_eigenvalue(smallest, overlap, kinetic, functions)
    seen = _seen(overlap, kinetic, functions, field)
    energy, gradient = seen.noise
    scale = 1.0 if field.exact else GAS
    fails = float(gradient.sum()) > scale * FAILS
    worst = int(np.argmax(gradient if fails else energy))
    reason = (
        f"a combination of eigenvalue {seen.values[worst]:.1e} and kinetic energy "
        f"{seen.height[worst]:.2g} hartree, {described(seen.vectors[:, worst], functions)} would "
        f"hold about {seen.held[worst]:.0e} electrons"
    )
    if fails:
        reason = f"noise of about {gradient.sum():.0e} hartree in the gradient; {reason}"
        return Outlook("fails", float(gradient.sum()), scale * FAILS, reason)
    measure, limit = float(energy.sum()), scale * STRAINED
    told = f"noise of about {measure:.0e} hartree in the energy; {reason}"
    if measure > limit:
        return Outlook("strained", measure, limit, told)
    if smallest < UNPROTECTED:
        reason = f"the eigenvalue {smallest:.1e} may yet be felt; {reason}"
        return Outlook("strained", smallest, UNPROTECTED, reason)
    return Outlook("safe", measure, limit, told)


def _rounding(overlap: Floats) -> float:
    """Below this an eigenvalue cannot be told from zero."""
    return float(np.finfo(float).eps * len(overlap) * np.abs(overlap).sum(axis=1).max())


def _smallest(overlap: Floats) -> float:
    if len(overlap) <= LARGE:
        return float(np.linalg.eigvalsh(overlap)[0])
    from overlapse.rules.physics.spectrum import smallest  # brings scipy, slow to import

    return smallest(overlap)


def _vector(overlap: Floats, smallest: float) -> Floats:
    """A unit eigenvector of the smallest eigenvalue, shape (n,)."""
    if len(overlap) <= LARGE:
        return np.asarray(np.linalg.eigh(overlap)[1][:, 0])
    from overlapse.rules.physics.spectrum import lowest

    _, vectors = lowest(overlap, max(2.0 * smallest, smallest + _rounding(overlap)))
    return np.asarray(vectors[:, 0])


def _by_eigenvalue(
    smallest: float, overlap: Floats, kinetic: Floats | None, functions: Functions | None
) -> Outlook:
    reason = f"smallest eigenvalue {smallest:.1e}"
    if smallest < LOOKED_AT and (kinetic is not None or functions is not None):
        vector = _vector(overlap, smallest)
        if kinetic is not None:
            height = float(vector @ kinetic @ vector) / smallest
            reason += f", kinetic energy of the combination {height:.2g} hartree"
        if functions is not None:
            reason += f", {described(vector, functions)}"
    if smallest < TINY:
        return Outlook("fails", smallest, TINY, reason)
    if smallest < SMALL:
        return Outlook("strained", smallest, SMALL, reason)
    return Outlook("safe", smallest, SMALL, reason)


class _Seen(NamedTuple):
    """Combinations of small eigenvalues: vectors (n, low), electrons held, kinetic energies.

    between: whether they vanish between centres.  Energies in hartree.
    """

    values: Floats
    vectors: Floats
    between: npt.NDArray[np.bool_]
    held: Floats
    height: Floats

    @property
    def noise(self) -> tuple[Floats, Floats]:
        """Noise that each brings into energy and gradient, hartree."""
        factor = np.where(self.between, BETWEEN, 1.0)
        scale = factor * np.finfo(float).eps * np.sqrt(self.height)
        return scale * (self.held / self.values) ** 2, scale * self.held**1.5 / self.values**2


def _seen(overlap: Floats, kinetic: Floats, functions: Functions, field: Field) -> _Seen:
    values, vectors = np.linalg.eigh(overlap)
    low = int(np.searchsorted(values, LOOKED_AT))
    least = int(np.searchsorted(values[:low], DIGITS))
    x = vectors[:, least:] / np.sqrt(values[least:])
    values, vectors = values[:low], vectors[:, :low]
    combinations = vectors / np.sqrt(values)
    height = np.einsum("nf,nm,mf->f", combinations, kinetic, combinations)
    outside = combinations[:, :least]
    held = np.zeros(low)
    for spin, (fock, count) in enumerate(zip(field.focks, field.electrons, strict=True)):
        energies, orbitals = field.orbitals(spin, x, kinetic)
        energies, orbitals = energies[:count], orbitals[:, :count]
        levels = np.einsum("nf,nm,mf->f", outside, fock, outside)
        gaps = np.maximum(levels[:, None] - energies, GAP)
        mixed = outside.T @ fock @ (x @ orbitals) / gaps
        held += (np.concatenate([mixed, orbitals[: low - least]]) ** 2).sum(axis=1)
    centre = np.asarray(functions.atom)
    alone = np.where(centre[:, None] == centre, overlap, 0.0)
    between = np.einsum("nf,nm,mf->f", vectors, alone, vectors) > APART * values
    return _Seen(values, vectors, between, held, np.maximum(height, 0.0))


DIFFUSE, TIGHT = 0.1, 30.0  # bohr**-2: below and above, exponents are called so
CARRIES = 0.05  # of the squared coefficients: an atom or an l with less is not named


def described(vector: Floats, functions: Functions) -> str:
    """The kind of a combination in words: on how many centres, of which shells, how diffuse.

    vector: unit eigenvector of S, shape (n,).
    """
    weight = vector**2 / (vector @ vector)
    centres = np.bincount(functions.atom, weight)
    letters = np.bincount(functions.l, weight)
    exponent = float(np.exp(weight @ np.log(functions.exponent)))
    count = int((centres >= CARRIES).sum())
    where = "on one centre" if count == 1 else f"over {count} centres"
    which = " and ".join(letter_of(l) for l in range(len(letters)) if letters[l] >= CARRIES)
    how = "diffuse " if exponent < DIFFUSE else "tight " if exponent > TIGHT else ""
    return f"of {how}{which} functions {where} (typical exponent {exponent:.2g})"
