"""Which functions to leave out of a nearly dependent set.

Pivoted Cholesky decomposition of the overlap matrix of unit diagonal picks, one by one, the
function that adds most to those already picked, and stops where none adds more than a tolerance.
Ties are settled in favour of functions with the smallest sum of off-diagonal elements, so that of
two twins the one that overlaps less with the others stays.

What is left has a smallest eigenvalue of about a tenth of the tolerance.  That is verified, and
where it is smaller still the last picks are given up until it holds.

Source: S. Lehtola, J. Chem. Phys. 151, 241102 (2019); the ordering: S. Lehtola, Phys. Rev. A 101,
032504 (2020).
"""

from collections.abc import Iterator, Sequence
from typing import Literal, NamedTuple

import numpy as np

from overlapse.rules.physics.inertia import Matrix, pivoted
from overlapse.rules.physics.placed import Functions, Ints, Placed
from overlapse.rules.physics.spectrum import largest, smallest

SHARE = 0.1  # of the tolerance: what the smallest eigenvalue of the kept functions is held to


class Drop(NamedTuple):
    """A contracted function that is left out, with all its components.

    atomic_number: of its element.  atom: index of the one atom it is dropped on, None for every
    atom with this block.  like: index of the first atom it is dropped on.  shell, column: as in
    `placed.Functions`.  exponent: bohr**-2, its smallest with weight.
    """

    atomic_number: int
    atom: int | None
    like: int
    shell: int
    column: int
    exponent: float


class Pruning(NamedTuple):
    """What is kept, shape (k,), rising, and what is dropped, in the order of the decisions.

    smallest, condition: smallest eigenvalue and condition number of the kept part.
    """

    kept: Ints
    drops: tuple[Drop, ...]
    smallest: float
    condition: float


def chosen(matrix: Matrix, tolerance: float, among: Ints | None = None) -> Ints:
    """Indices of the functions kept, rising; the smallest eigenvalue of their part of the matrix is
    at least a tenth of ``tolerance``.

    matrix: real symmetric or complex Hermitian, shape (n, n), positive diagonal.  among: choose
    among these functions only, shape (m,).
    """
    scale = 1.0 / np.sqrt(np.real(np.diagonal(matrix)))
    # Large matrices are not copied more often than they have to be: one copy at a time.
    unit = matrix if np.abs(scale - 1.0).max() < 1e-12 else matrix * scale[:, None] * scale
    given = np.arange(len(unit)) if among is None else among
    sums = [np.abs(unit[row, given]).sum() for row in given]
    first = given[np.argsort(sums, kind="stable")]
    order, pivots = pivoted(unit[np.ix_(first, first)], overwrite=True)
    picked = first[order]
    rank = int(np.searchsorted(-pivots, -tolerance))
    if not rank or smallest(unit, picked[:rank]) >= SHARE * tolerance:
        return np.sort(picked[:rank])
    # The smallest eigenvalue never rises when a function joins: halving finds the longest list.
    good, bad = 1, rank
    while bad - good > 1:
        middle = (good + bad + 1) // 2 if bad - good < 8 else bad - max(1, (bad - good) // 8)
        if smallest(unit, picked[:middle]) >= SHARE * tolerance:
            good = middle
        else:
            bad = middle
    return np.sort(picked[:good])


def shells_to_drop(
    matrix: Matrix,
    functions: Functions,
    atoms: Sequence[Placed],
    tolerance: float,
    per: Literal["element", "atom"] = "element",
) -> Pruning:
    """Whole contracted functions to drop, on every atom that carries them or atom by atom.

    The choice of single functions is made, then the contracted function that loses most of its
    components is dropped with all of them, and the choice is made again among what is left, until
    nothing more is chosen.
    """
    owner, sizes = _owners(functions, atoms, per)
    kept = np.arange(len(functions.atom))
    drops: list[Drop] = []
    while len(kept):
        lost = np.setdiff1d(kept, chosen(matrix, tolerance, kept))
        if not len(lost):
            break
        share = np.bincount(owner[lost], minlength=len(sizes)) / sizes
        # Of twins one atom may lose the one and the next the other: only what is lost everywhere
        # goes together, else the first of those that lose most, and the others get a second chance.
        whole = np.flatnonzero(share >= 1.0)
        gone = whole if len(whole) else np.array([int(np.argmax(share))])
        drops += _described(gone[np.argsort(-share[gone], kind="stable")], owner, functions, atoms)
        kept = kept[~np.isin(owner[kept], gone)]
    if per == "element":
        drops = [drop._replace(atom=None) for drop in drops]
    low = smallest(matrix, kept)
    high = largest(matrix if len(kept) == len(matrix) else matrix[np.ix_(kept, kept)])
    return Pruning(kept, tuple(drops), low, high / low if low > 0.0 else float("inf"))


def _owners(functions: Functions, atoms: Sequence[Placed], per: str) -> tuple[Ints, Ints]:
    """For each function the number of what is dropped together, and the sizes of these."""
    who = functions.atom
    if per == "element":
        first: dict[object, int] = {}
        same = [first.setdefault(_content(atom), index) for index, atom in enumerate(atoms)]
        who = np.array(same, dtype=np.intp)[functions.atom]
    table = np.column_stack([who, functions.shell, functions.column])
    _, owner, sizes = np.unique(table, axis=0, return_inverse=True, return_counts=True)
    return owner.reshape(-1), sizes


def _content(atom: Placed) -> object:
    block = atom.block
    return block.atomic_number, tuple(
        (shell.angular, shell.exponents.tobytes(), shell.coefficients.tobytes())
        for shell in block.shells
    )


def _described(
    gone: Ints, owner: Ints, functions: Functions, atoms: Sequence[Placed]
) -> Iterator[Drop]:
    for number in gone:
        at = int(np.argmax(owner == number))
        atom = int(functions.atom[at])
        yield Drop(
            atoms[atom].block.atomic_number,
            atom,
            atom,
            int(functions.shell[at]),
            int(functions.column[at]),
            float(functions.exponent[at]),
        )
