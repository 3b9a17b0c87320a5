"""What a self-consistent field without removal of functions will meet: safe, strained, or failing.

A unit eigenvector v of S with a small eigenvalue lambda stands for the normalised combination
f = v / sqrt(lambda).  Rounding of two-electron integrals, of relative size eps, is blown up by
lambda**-2 in the repulsion (ff|ff), but the field only notices as far as f is occupied.  If p
electrons are in f, energy and gradient carry a noise of about

    eps sqrt(T) p**2 / lambda**2    and    eps sqrt(T) (p / lambda)**(3/2) / sqrt(lambda),

T = v' T v / lambda being the kinetic energy of f, whose root measures how compact f is.  So the
same small eigenvalue can be harmless (tight twins that hold little, combinations that no occupied
orbital has the symmetry of) or fatal.  In the approximate field of `superposed` the occupied spin
orbitals i are found among all combinations above 1e-9, and

    p = sum over i of  <f|i>**2,   below 1e-9, for want of digits,  (F_fi / (F_ff - e_i))**2.

The measure is a sum over the combinations f of eigenvalues below 1e-6,

    m = sum of  p**(2/3) (T / hartree)**(1/4) / lambda.

The powers are those of a logistic fit to 108 calculations without removal, rounded; they lie a
little below the formula's because the estimate of p has an error of a factor of two or three.

Limits, from the same calculations: no field failed below m = 1.2e5 in any of four ways to do the
arithmetic, and nearly all did above 2e6; between the two the noise of the program decides.  On 113
systems that took no part, "fails" was said just where a field failed for 94 %, the outlook was not
contradicted for 97 %, and no failure was called safe.

An eigenvalue below 2e-9 that is felt by no orbital, by the symmetry of the molecule as a rule, is
called strained all the same: a slight distortion or another filling of the levels undoes that.  One
within rounding of zero always fails.

Without a field (too many functions, a core potential) only lambda is judged: fails below 5e-10,
strained below 1e-7.  That is much coarser.

Source: the perturbation formula is that of single excitations, A. Szabo, N. S. Ostlund, Modern
Quantum Chemistry, chapter 6; calibration and judgement: tests/bench/outlook.py and its figures.
"""

from collections.abc import Sequence
from typing import Literal, NamedTuple

import numpy as np

from overlapse.grammar.model import Floats, letter_of
from overlapse.rules.physics.placed import Functions, Placed
from overlapse.rules.physics.superposed import affordable, in_order, superposed_field

Level = Literal["safe", "strained", "fails"]

STRAINED, FAILS = 8e4, 2e6  # of the measure m, with a field
SMALL, TINY = 1e-7, 5e-10  # of the smallest eigenvalue, without a field
UNPROTECTED = 2e-9  # eigenvalue below which symmetry alone is no comfort
LOOKED_AT = 1e-6  # eigenvalues below are looked into
LARGE = 700  # functions, from which other algorithms than full diagonalisation are cheaper
DIGITS = 1e-9  # eigenvalue from which a combination can be treated like any other
GAP = 0.1  # hartree: smallest denominator, so that a degeneracy does not blow up the estimate


class Outlook(NamedTuple):
    """The outlook, the measure behind it, the limit that it was compared with, and why in words.

    The measure is m where a field was made (it fails above its limits), else the smallest
    eigenvalue of S (it fails below them).
    """

    level: Level
    measure: float
    limit: float
    reason: str


class Field(NamedTuple):
    """Potential-energy matrix, hartree, shape (n, n), and the electrons of either spin."""

    potential: Floats
    electrons: tuple[int, int]


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
) -> Outlook:
    """The outlook for placed atoms; a field is made where it is needed and can be afforded.

    overlap, kinetic: their matrices, shape (n, n), hartree.  empty: indices of atoms that only
    carry functions.  charge: of the molecule.  unpaired: electrons, the fewest possible where None.
    smallest: eigenvalue of the overlap, where it is known already.
    """
    field = None
    if smallest is None:
        smallest = _smallest(overlap)
    nuclei = [0 if k in set(empty) else a.block.atomic_number for k, a in enumerate(atoms)]
    electrons = sum(nuclei) - charge
    whole = all(atom.block.potential is None for atom in atoms) and electrons > 0
    doubtful = _rounding(overlap) <= smallest < LOOKED_AT
    if kinetic is not None and doubtful and whole and affordable(atoms, len(overlap)):
        up = min((electrons + (electrons % 2 if unpaired is None else unpaired)) // 2, electrons)
        pair = (up, electrons - up)
        field = Field(superposed_field(atoms, nuclei, overlap, kinetic, pair), pair)
    return outlook(overlap, kinetic, functions, field=field, smallest=smallest)


def outlook(
    overlap: Floats,
    kinetic: Floats | None = None,
    functions: Functions | None = None,
    *,
    field: Field | None = None,
    smallest: float | None = None,
) -> Outlook:
    """The outlook for an overlap matrix, shape (n, n), symmetric with ones on its diagonal.

    kinetic: matrix of the kinetic energy, hartree; needed where there is a field.  functions: only
    to say in words what kind of combination it is.  smallest: as in `foresee`.
    """
    if smallest is None:
        smallest = _smallest(overlap)
    if smallest < _rounding(overlap):
        what = "S is not positive" if smallest <= 0.0 else "S is singular"
        reason = f"{what} within rounding (smallest eigenvalue {smallest:.1e})"
        return Outlook("fails", smallest, _rounding(overlap), reason)
    if smallest >= LOOKED_AT or kinetic is None or field is None:
        return _by_eigenvalue(smallest, overlap, kinetic, functions)
    values, vectors = np.linalg.eigh(overlap)
    low = int(np.searchsorted(values, LOOKED_AT))
    held, height = _occupations(values, vectors, low, kinetic, field)
    measures = held ** (2 / 3) * height**0.25 / values[:low]
    worst = int(np.argmax(measures))
    measure = float(measures.sum())
    kind = f", {described(vectors[:, worst], functions)}" if functions is not None else ""
    reason = (
        f"a combination of eigenvalue {values[worst]:.1e} and kinetic energy "
        f"{height[worst]:.2g} hartree{kind} would hold about {held[worst]:.0e} electrons"
    )
    if measure > FAILS:
        return Outlook("fails", measure, FAILS, reason)
    if measure > STRAINED:
        return Outlook("strained", measure, STRAINED, reason)
    if smallest < UNPROTECTED:
        reason = f"the eigenvalue {smallest:.1e} may yet be felt; {reason}"
        return Outlook("strained", smallest, UNPROTECTED, reason)
    return Outlook("safe", measure, STRAINED, reason)


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


def _occupations(
    values: Floats, vectors: Floats, low: int, kinetic: Floats, field: Field
) -> tuple[Floats, Floats]:
    """Electrons in each of the ``low`` first combinations, and their kinetic energies, hartree."""
    fock = kinetic + field.potential
    least = int(np.searchsorted(values[:low], DIGITS))
    x = vectors[:, least:] / np.sqrt(values[least:])
    energies, orbitals = in_order(x, kinetic, fock)
    combinations = vectors[:, :low] / np.sqrt(values[:low])
    height = np.einsum("nf,nm,mf->f", combinations, kinetic, combinations)
    outside = combinations[:, :least]
    levels = np.einsum("nf,nm,mf->f", outside, fock, outside)
    gaps = np.maximum(levels[:, None] - energies, GAP)
    shares = np.concatenate(
        [(outside.T @ fock @ x @ orbitals / gaps) ** 2, orbitals[: low - least] ** 2]
    )
    held: Floats = sum(shares[:, :n].sum(axis=1) for n in field.electrons)
    return held, np.maximum(height, 0.0)


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
