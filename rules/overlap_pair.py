"""Overlap of bonded pairs: what a file alone tells of molecules."""

from collections.abc import Iterator
from itertools import combinations
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import BasisSet, Block, Severity
from overlapse.rules.case import Case, gathered, is_orbital
from overlapse.rules.finding import Finding
from overlapse.rules.physics.pairs import (
    alike_bounds,
    cube_bounds,
    lone,
    mixed_bounds,
    one_centre,
)
from overlapse.rules.physics.radii import covalent_radius
from overlapse.rules.registry import rule

_LOOSE = 0.8  # bohr**-2: tighter functions hardly reach a neighbour
_LEAST = 1e-8  # bohr**-2: what is looser than that is a slip, and leaves the range of numbers
_HIGHEST = 2  # f functions and above hardly change the bound
_LIKELY = 300.0  # times the limit: only atoms whose own pair comes that close meet the others
_OWN = 0.05  # of what the atoms have by themselves: the neighbour must matter
_MET = 12  # such atoms at most, those of the closest pairs


class _Atom(NamedTuple):
    """An element with its lone loose functions (l, exponent), and their shells in the block."""

    block: Block
    functions: tuple[tuple[int, float], ...]
    shells: tuple[int, ...]
    radius: float


class _Worst(NamedTuple):
    """An atom, the partner with which it comes closest to dependence, and the bounds.

    own: on one centre, of the two.  pair: with the partner.  cube: of eight like it.
    """

    atom: _Atom
    partner: _Atom
    own: float
    pair: float
    cube: float


@rule("overlap.pair")
def pair(case: Case, *, strained: float = 1e-7, tight: float = 1e-6) -> Iterator[Finding]:
    """Two bonded atoms, or a compact cluster, alone make the functions nearly linearly dependent.

    Each element is set beside itself, and where that comes close beside the others, at the sum of
    the covalent radii; and on the corners of a cube.  Only lone diffuse functions that point along
    the bond are looked at (in the cube, s functions): the overlap matrix of any molecule with such
    a bond contains theirs, so no such molecule can have a larger smallest eigenvalue.  A set that
    passes may still fail: the screening of a real geometry tells.

    Formula: smallest eigenvalue of S over normalised primitives of m = 0 on two centres; the
    interlacing of eigenvalues of principal submatrices (Cauchy) makes it an upper bound.

    Source: R. A. Horn, C. R. Johnson, Matrix Analysis, Cambridge University Press 1985, section
    4.3; radii: B. Cordero et al., Dalton Trans. 2008, 2832 (from memory).

    Limits: strained: warning below it for a pair.  tight: note below it for a pair or the cube.

    Remedy: leave out one of the functions named, or screen the molecules that are meant
    (overlapse screen) and drop what is named there.

    Bad::

        C 0
        S 3 1.00
          40.0 0.1
          6.0 0.4
          1.5 0.6
        S 1 1.00
          0.1 1.0
        S 1 1.00
          0.04 1.0
        S 1 1.00
          0.016 1.0
        P 1 1.00
          0.1 1.0
        P 1 1.00
          0.04 1.0
        P 1 1.00
          0.016 1.0
        D 1 1.00
          0.1 1.0
        D 1 1.00
          0.04 1.0
        D 1 1.00
          0.016 1.0
        ****

    Good::

        C 0
        S 3 1.00
          40.0 0.1
          6.0 0.4
          1.5 0.6
        S 1 1.00
          0.17 1.0
        P 1 1.00
          0.16 1.0
        ****
    """
    for members in case.sets:
        found = []
        for worst in _worst(members, tight):
            bound = min(worst.pair, worst.cube)
            if bound > _OWN * worst.own:
                continue  # what one centre shows by itself has a rule of its own
            # Eight like atoms so close are rare, two are not.
            if worst.pair < strained <= worst.own and is_orbital(members):
                found.append(_finding(case, worst, "warning", strained))
            elif bound < tight <= worst.own:
                found.append(_finding(case, worst, "note", tight))
        yield from gathered(found)


def _finding(case: Case, worst: _Worst, severity: Severity, limit: float) -> Finding:
    atom, partner = worst.atom, worst.partner
    by_cube = worst.cube < worst.pair and severity == "note"
    distance = 2.0 * atom.radius if by_cube else atom.radius + partner.radius
    what = (
        f"a cube of eight {atom.block.symbol} atoms with edges of {distance:.2f} bohr"
        if by_cube
        else f"{atom.block.symbol} and {partner.block.symbol} at {distance:.2f} bohr"
    )
    bound = worst.cube if by_cube else worst.pair
    exponents = [exponent for _, exponent in atom.functions]
    return case.at_shell(
        atom.block,
        atom.shells[exponents.index(min(exponents))],
        severity,
        f"{what}, their lone diffuse functions alone: smallest eigenvalue {bound:.1e}; no molecule "
        "with such neighbours can do better",
        measured=bound,
        limit=limit,
        witnesses=(
            f"on one centre these {len(exponents)} functions have {worst.own:.1e}, a rigorous "
            "upper bound of any molecule",
        ),
        remedy="leave out one of the diffuse functions, or screen the molecules that are meant: "
        "overlapse screen",
    )


def _worst(members: BasisSet, tight: float) -> Iterator[_Worst]:
    """Each element with the partner with which it comes closest to dependence."""
    atoms = list(_atoms(members))
    if not atoms:
        return
    radii = np.array([atom.radius for atom in atoms])
    table = lone([atom.functions for atom in atoms])
    alike = alike_bounds(table, 2.0 * radii)
    best = {k: (bound, k) for k, bound in enumerate(alike.tolist())}
    order = np.argsort(alike, kind="stable").tolist()
    near = [k for k in order if alike[k] < _LIKELY * tight][:_MET]
    met = list(combinations(near, 2))
    if met:
        ones, twos = map(list, zip(*met, strict=True))
        distances = radii[ones] + radii[twos]
        bounds = mixed_bounds(table.of(ones), table.of(twos), distances)
        for (i, j), bound in zip(met, bounds.tolist(), strict=True):
            best[i] = min(best[i], (bound, j))
            best[j] = min(best[j], (bound, i))
    cubes = cube_bounds(table, 2.0 * radii)
    own = np.linalg.eigvalsh(one_centre(table))[:, 0]
    for k, atom in enumerate(atoms):
        bound, other = best[k]
        yield _Worst(atom, atoms[other], float(min(own[k], own[other])), bound, float(cubes[k]))


def _atoms(members: BasisSet) -> Iterator[_Atom]:
    for block in members.blocks:
        radius = covalent_radius(block.atomic_number)
        seen: dict[tuple[int, float], int] = {}
        for index, function in block.contracted:
            if len(function.exponents) == 1 and function.l <= _HIGHEST:
                exponent = float(function.exponents[0])
                if _LEAST < exponent < _LOOSE:
                    # A function that is given twice has a rule of its own.
                    seen.setdefault((function.l, exponent), index)
        if radius is not None and seen:
            yield _Atom(block, tuple(seen), tuple(seen.values()), radius)
