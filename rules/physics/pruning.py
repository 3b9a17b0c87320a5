"""Which functions to leave out of a nearly dependent set.

Pivoted Cholesky decomposition of the overlap matrix of unit diagonal picks, one by one, the
function that adds most to those already picked, and stops where none adds more than a tolerance.
Ties are settled in favour of functions with the smallest sum of off-diagonal elements, so that of
two twins the one that overlaps less with the others stays.

What is left has a smallest eigenvalue of about a tenth of the tolerance.  That is verified, and
where it is smaller still the last picks are given up until it holds.

Where a function can only be dropped on all atoms of an element, many more go than are dependent,
and which of them matters.  Then those that vanishing combinations are made of are tried in turn,
and the one goes that costs least for each dependence it lifts.

Source: S. Lehtola, J. Chem. Phys. 151, 241102 (2019); the ordering: S. Lehtola, Phys. Rev. A 101,
032504 (2020).
"""

from collections.abc import Callable, Iterator, Sequence
from typing import Literal, NamedTuple

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.physics.inertia import Matrix, pivoted
from overlapse.rules.physics.placed import Functions, Ints, Placed
from overlapse.rules.physics.spectrum import SMALL, largest, lowest, smallest

SHARE = 0.1  # of the tolerance: what the smallest eigenvalue of the kept functions is held to
PARTY = 0.02  # share in the vanishing combinations from which a function is tried
TRIED = 10  # functions at most, those with the largest shares
SWAPPED = 40  # functions of single atoms, for which a twin of theirs is tried instead
TWINS = 0.99  # overlap of two functions of one atom from which they are called so


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
    # Large matrices are not copied more often than they have to be: one copy at a time.
    scale = 1.0 / np.sqrt(_norms(matrix))
    given = np.arange(len(matrix)) if among is None else among
    sums = [scale[row] * (np.abs(matrix[row, given]) @ scale[given]) for row in given]
    first = given[np.argsort(sums, kind="stable")]
    unit = matrix[np.ix_(first, first)]
    unit *= scale[first][:, None]
    unit *= scale[first]
    order, pivots = pivoted(unit, overwrite=True)
    del unit
    picked = first[order]
    rank = int(np.searchsorted(-pivots, -tolerance))
    if not rank or smallest(matrix, picked[:rank]) >= SHARE * tolerance:
        return np.sort(picked[:rank])
    # The smallest eigenvalue never rises when a function joins: halving finds the longest list.
    good, bad = 1, rank
    while bad - good > 1:
        middle = (good + bad + 1) // 2 if bad - good < 8 else bad - max(1, (bad - good) // 8)
        if smallest(matrix, picked[:middle]) >= SHARE * tolerance:
            good = middle
        else:
            bad = middle
    return np.sort(picked[:good])


def _norms(matrix: Matrix) -> Floats:
    """Squared norms of the functions; one where there is nothing but rounding.

    That happens in crystals: where neighbours cancel, a function of no norm is the first to go.
    """
    norms: Floats = np.real(np.diagonal(matrix)).astype(float)
    noise = len(norms) * float(np.finfo(float).eps) * norms.max(initial=0.0)
    return np.where(norms > noise, norms, 1.0)


def shells_to_drop(
    matrix: Matrix,
    functions: Functions,
    atoms: Sequence[Placed],
    tolerance: float,
    per: Literal["element", "atom"] = "element",
    cost: Callable[[Ints], float] | None = None,
) -> Pruning:
    """Whole contracted functions to drop, on every atom that carries them or atom by atom.

    The choice of single functions is made, then the contracted function that loses most of its
    components is dropped with all of them, and the choice is made again among what is left, until
    nothing more is chosen.  cost: of keeping only some functions, given by their indices; what goes
    from all atoms of an element is then chosen by it.
    """
    owner, sizes = _owners(functions, atoms, per)
    kept = np.arange(len(functions.atom))
    drops: list[Drop] = []
    while len(kept):
        lost = np.setdiff1d(kept, chosen(matrix, tolerance, kept))
        if not len(lost):
            break
        if cost is not None and per == "element":
            cheapest = _cheapest(matrix, kept, len(lost), owner, tolerance, cost)
            if cheapest is not None:
                gone = np.array([cheapest])
                drops += _described(gone, owner, functions, atoms)
                kept = kept[owner[kept] != cheapest]
                continue
        share = np.bincount(owner[lost], minlength=len(sizes)) / sizes
        # Of twins one atom may lose the one and the next the other: only what is lost everywhere
        # goes together, else the first of those that lose most, and the others get a second chance.
        whole = np.flatnonzero(share >= 1.0)
        gone = whole if len(whole) else np.array([int(np.argmax(share))])
        drops += _described(gone[np.argsort(-share[gone], kind="stable")], owner, functions, atoms)
        kept = kept[~np.isin(owner[kept], gone)]
    if per == "atom" and len(matrix) <= SMALL:
        kept, drops = _alike(matrix, kept, drops, functions, tolerance)
    if per == "element":
        drops = [drop._replace(atom=None) for drop in drops]
    low = smallest(matrix, kept)
    high = largest(matrix if len(kept) == len(matrix) else matrix[np.ix_(kept, kept)])
    return Pruning(kept, tuple(drops), low, high / low if low > 0.0 else float("inf"))


def _cheapest(
    matrix: Matrix,
    kept: Ints,
    lost: int,
    owner: Ints,
    tolerance: float,
    cost: Callable[[Ints], float],
) -> int | None:
    """What is dropped together at the least cost for each function that need not be lost then.

    None where nothing that can be tried lifts any of the ``lost`` dependences.
    """
    _, vectors = lowest(matrix[np.ix_(kept, kept)], tolerance)
    weights = np.bincount(owner[kept], (np.abs(vectors) ** 2).sum(axis=1))
    tried = [k for k in np.argsort(-weights, kind="stable")[:TRIED].tolist() if weights[k] > PARTY]
    found: tuple[float, int] | None = None
    for number in tried:
        rest = kept[owner[kept] != number]
        lifted = lost - (len(rest) - len(chosen(matrix, tolerance, rest))) if len(rest) else 0
        if lifted > 0:
            price = cost(rest) / lifted
            if found is None or price < found[0]:
                found = price, number
    return None if found is None else found[1]


def _alike(
    matrix: Matrix, kept: Ints, drops: list[Drop], functions: Functions, tolerance: float
) -> tuple[Ints, list[Drop]]:
    """The same with the last of near-twins dropped, where that does as well.

    Which of two goes is a matter of chance otherwise, on every atom and in every frame anew.
    """
    found, norms = list(drops), _norms(matrix)
    for place, drop in enumerate(drops[:SWAPPED]):
        own = np.flatnonzero(functions.atom == drop.like)
        gone = own[(functions.shell[own] == drop.shell) & (functions.column[own] == drop.column)]
        first = int(gone[0])
        size = np.sqrt(norms[own] * norms[first])
        near = own[(np.abs(matrix[first, own]) > TWINS * size) & np.isin(own, kept)]
        if not len(near) or near[-1] < first:
            continue
        twin = own[
            (functions.shell[own] == functions.shell[near[-1]])
            & (functions.column[own] == functions.column[near[-1]])
        ]
        rest = np.union1d(np.setdiff1d(kept, twin), gone)
        if len(twin) == len(gone) and len(chosen(matrix, tolerance, rest)) == len(rest):
            last = int(near[-1])
            found[place] = drop._replace(
                shell=int(functions.shell[last]),
                column=int(functions.column[last]),
                exponent=float(functions.exponent[last]),
            )
            kept = rest
    return kept, found


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
