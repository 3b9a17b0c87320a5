"""Atoms with their functions, and the one order in which all matrices list them.

Atoms in the order given; within an atom its shells, within a shell its columns (for shells that
share exponents first all s, then all p), within a column its components: m = -l ... l of the real
spherical harmonics, or the Cartesian powers x**i y**j z**k with i falling first, then j.
"""

from collections.abc import Sequence
from math import pi, prod, sqrt
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Block, Floats
from overlapse.rules.physics.harmonics import powers

Ints = npt.NDArray[np.intp]

WEIGHTY = 0.1  # of the largest coefficient: from there a primitive shapes its contraction


class Placed(NamedTuple):
    """One atom with its functions.

    block: its shells, coefficients over normalised primitives.  position: bohr.  spherical: 2l+1
    components of each shell, else the (l+1)(l+2)/2 Cartesian ones.
    """

    block: Block
    position: tuple[float, float, float]
    spherical: bool = True


class Functions(NamedTuple):
    """What each basis function is, in the order of the matrices; all of shape (n,).

    atom: index of the atom.  shell: index in the atom's ``block.shells``.  column: index among the
    shell's coefficient columns.  l: angular momentum.  component: m, from -l to l, or the number of
    the Cartesian component.  exponent: bohr**-2, the smallest with weight in the contraction (a
    normalised coefficient of at least a tenth of the largest).
    """

    atom: Ints
    shell: Ints
    column: Ints
    l: Ints
    component: Ints
    exponent: Floats


class NotNormalisable(ValueError):
    """A function has no finite positive self-overlap, so that no overlap with it has a meaning."""


def components(l: int, spherical: bool) -> int:
    """Number of components of a shell."""
    return 2 * l + 1 if spherical else (l + 1) * (l + 2) // 2


def radial_norms(atoms: Sequence[Placed]) -> Floats:
    """Norms of the functions where the components of a Cartesian shell share one radial function.

    Shape (n,), one for spherical functions.  The matrices of this package give each component a
    norm of its own, one; times these factors for rows and columns they are in the convention in
    which x**i y**j z**k, i + j + k = l > 1, multiplies a radial function whose own norm is one,
    and so has the self-overlap 4 pi (2i-1)!! (2j-1)!! (2k-1)!! / (2l+1)!!.  Eigenvalues of
    Cartesian sets depend on such norms, and with them on the direction of the axes.

    Source: common practice, no source; others give each component a norm of one.
    """
    functions = lay_out(atoms)
    norms = np.ones(len(functions.l))
    for at, (atom, l, component) in enumerate(
        zip(functions.atom, functions.l, functions.component, strict=True)
    ):
        if l > 1 and not atoms[atom].spherical:
            odd = [prod(range(1, 2 * power, 2)) for power in powers(int(l))[component]]
            norms[at] = sqrt(4.0 * pi * prod(odd) / prod(range(1, 2 * int(l) + 2, 2)))
    return norms


def normalised_columns(block: Block, shell: int) -> Floats:
    """Coefficients of a shell, each column scaled to self-overlap one, shape (nprim, ncontr).

    Raises `NotNormalisable` for a column that cannot be.
    """
    found = block.shells[shell]
    columns = found.normalised()
    sound = np.isfinite(columns).all(axis=0)
    if not sound.all() or float(found.exponents.min()) <= 0.0:
        column = int(np.argmin(sound)) + 1
        raise NotNormalisable(
            f"{block.symbol} {block.names[shell]}: column {column} cannot be normalised"
        )
    return columns


def lay_out(atoms: Sequence[Placed]) -> Functions:
    """The functions of all atoms in order.

    Raises `NotNormalisable` where a shell holds a function of no finite positive self-overlap.
    """
    made: dict[tuple[int, bool], list[npt.NDArray[np.float64]]] = {}
    parts = []
    for index, atom in enumerate(atoms):
        key = (id(atom.block), atom.spherical)
        if key not in made:
            made[key] = _rows(atom.block, atom.spherical)
        rows = made[key]
        parts += [np.column_stack([np.full(len(part), float(index)), part]) for part in rows]
    table = np.concatenate(parts) if parts else np.zeros((0, 6))
    whole = table[:, :5].astype(np.intp)
    atom, shell, column, l, component = whole.T.copy()
    return Functions(atom, shell, column, l, component, table[:, 5].copy())


def _rows(block: Block, spherical: bool) -> list[npt.NDArray[np.float64]]:
    parts = []
    for index, shell in enumerate(block.shells):
        columns = np.abs(normalised_columns(block, index))
        for column in range(columns.shape[1]):
            l = shell.angular[column // shell.columns_per_l]
            weighty = columns[:, column] >= WEIGHTY * columns[:, column].max()
            part = np.empty((components(l, spherical), 5))
            part[:, :3] = index, column, l
            part[:, 3] = np.arange(len(part)) - (l if spherical else 0)
            part[:, 4] = shell.exponents[weighty].min()
            parts.append(part)
    return parts
