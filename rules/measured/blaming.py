"""Who is to blame: what the combinations with small eigenvalues are made of."""

from collections.abc import Sequence

import numpy as np

from overlapse.grammar.model import Block, letter_of
from overlapse.rules.measured.probe import Function, Share, Small
from overlapse.rules.measured.site import Site
from overlapse.rules.physics.inertia import Matrix
from overlapse.rules.physics.placed import Functions, Ints
from overlapse.rules.physics.spectrum import LADDER, SMALL, Spectrum, lowest

_BLAMED = 12  # eigenvalues whose combinations are looked into
_TOLD = 12  # shares that are kept of each
_LEAST = 0.005  # share that is worth telling


def blame(
    matrix: Matrix, functions: Functions, sites: Sequence[Site], found: Spectrum, least: float
) -> tuple[Small, ...]:
    """Shares of the functions in the combinations of the smallest eigenvalues.

    A share is the squared component of the unit eigenvector, summed over a function's components.
    Eigenvalues below ``least`` and below 1e-4 are looked into, the dozen smallest at most; of a
    small matrix the smallest eigenvalue in any case.
    """
    counts = {rung: n for rung, n in found.below.items() if n and rung <= max(least, LADDER[0])}
    few = [rung for rung, n in counts.items() if n <= _BLAMED]
    count: int | None
    if counts:
        limit = max(few) if few else min(counts)
        count = min(counts[limit], _BLAMED)
    elif found.functions <= SMALL:
        limit, count = _above(found.smallest), None
    else:
        return ()
    values, vectors = lowest(matrix, limit, count)
    parts = _Parts(functions, sites)
    return tuple(parts.small(float(values[k]), vectors[:, k]) for k in np.argsort(values)[:_BLAMED])


def _above(smallest: float) -> float:
    """A limit that the smallest eigenvalue is below, and few others."""
    return smallest + max(1e-9 * abs(smallest), 1e-15)


class _Parts:
    """The contracted functions of all atoms: where each begins, and what it is."""

    def __init__(self, functions: Functions, sites: Sequence[Site]) -> None:
        keys = np.column_stack([functions.atom, functions.shell, functions.column])
        new = np.any(np.diff(keys, axis=0) != 0, axis=1)
        self._part: Ints = np.concatenate([[0], np.cumsum(new)]).astype(np.intp)
        firsts = np.flatnonzero(np.diff(self._part, prepend=-1))
        self._atoms = functions.atom[firsts].tolist()
        # Atoms with one block share its functions; each is described once.
        known: dict[tuple[int, int, int], int] = {}
        self._kinds: list[Function] = []
        numbers = []
        for at, (atom, shell, column) in zip(firsts, keys[firsts].tolist(), strict=True):
            key = (id(sites[atom].block), shell, column)
            if key not in known:
                known[key] = len(self._kinds)
                exponent = float(functions.exponent[at])
                self._kinds.append(described(sites[atom], shell, column, exponent))
            numbers.append(known[key])
        self._kind: Ints = np.array(numbers, dtype=np.intp)

    def small(self, value: float, vector: Matrix) -> Small:
        """An eigenvalue with the shares in its vector."""
        weights = np.bincount(self._part, weights=np.abs(vector) ** 2)
        shares = [
            Share(float(weights[k]), self._kinds[self._kind[k]], self._atoms[k] + 1)
            for k in np.argsort(-weights, kind="stable")[:_TOLD]
            if weights[k] >= _LEAST
        ]
        summed = np.bincount(self._kind, weights=weights)
        order = np.argsort(-summed, kind="stable")
        kinds = [
            Share(float(summed[k]), self._kinds[k])
            for rank, k in enumerate(order[:_TOLD])
            if rank == 0 or summed[k] >= _LEAST
        ]
        return Small(value, tuple(shares), tuple(kinds))


def described(site: Site, index: int, column: int, exponent: float) -> Function:
    """A contracted function of an atom: shell ``index`` of its block, and the column in it."""
    shell = site.block.shells[index]
    name = site.block.names[index]
    if shell.columns_per_l > 1:
        name += f"/{column % shell.columns_per_l + 1}"
    return Function(
        site.path,
        shell.line,
        site.block.symbol,
        site.block.names[index],
        name,
        column,
        letter_of(shell.angular[column // shell.columns_per_l]) * (len(shell.angular) > 1),
        exponent,
        _is_outermost(site.block, index, column),
    )


def _is_outermost(block: Block, index: int, column: int) -> bool:
    shell = block.shells[index]
    l = shell.angular[column // shell.columns_per_l]
    own = shell.exponents[shell.coefficients[:, column] != 0.0]
    loosest = min(float(f.exponents.min()) for _, f in block.functions_of(l) if f.exponents.size)
    return own.size == 1 and float(own[0]) <= loosest
