"""Which shells of its atom a block describes, and which it leaves to a core potential."""

import numpy as np

from overlapse.grammar.elements import occupied, replaced_by, subshells, usual_cores
from overlapse.grammar.model import BasisSet, Block
from overlapse.rules.labels.cores import possible_cores
from overlapse.rules.physics.onecentre import primitive_overlap
from overlapse.rules.physics.slater import Orbital, slater_overlap, slater_zetas


def needed(block: Block) -> dict[int, int] | None:
    """Occupied subshells per l that the block must describe, or None for an unusual potential."""
    wanted = dict(occupied(block.atomic_number))
    if block.potential is not None:
        replaced = replaced_by(block.potential.electrons)
        if replaced is None:
            return None
        wanted = {l: max(0, count - replaced.get(l, 0)) for l, count in wanted.items()}
    return wanted


def lacking(block: Block) -> dict[int, int]:
    """Number of missing functions per l against the occupied subshells."""
    wanted = needed(block) or {}
    return {
        l: count - block.counts.get(l, 0)
        for l, count in wanted.items()
        if count > block.counts.get(l, 0)
    }


def fitting_core(block: Block) -> int | None:
    """Electrons of the usual core whose subshells are just those that the block lacks."""
    lack = lacking(block)
    z = block.atomic_number
    for electrons in usual_cores()[1:]:
        replaced = replaced_by(electrons) or {}
        wanted = {l: n - replaced.get(l, 0) for l, n in occupied(z).items()}
        if electrons < z and min(wanted.values()) >= 0 and lack and all(
            block.counts.get(l, 0) >= n for l, n in wanted.items()
        ):  # fmt: skip
            return electrons
    return None


def valence_blocks(members: BasisSet) -> list[Block]:
    """Blocks without a potential that lack just the shells of a core, and mean to.

    Several such blocks mean it, and so does one without any primitive tight enough for a core.
    """
    found = [block for block in members.blocks if _may_be_valence(block) and fitting_core(block)]
    return [block for block in found if len(found) > 2 or _is_soft(block)]


def is_valence_set(members: BasisSet) -> bool:
    """Whether most blocks that lack shells are valence blocks without their potentials."""
    short = [b for b in members.blocks if b.complete and b.shells and lacking(b)]
    return len(valence_blocks(members)) * 2 > len(short)


def _may_be_valence(block: Block) -> bool:
    """Whether a block could be a valence set; fewer than three s primitives are a fragment."""
    if not block.complete or not block.shells or block.potential:
        return False
    return len({a for s in block.shells if 0 in s.angular for a in s.exponents.tolist()}) > 2


def _is_soft(block: Block) -> bool:
    """Whether no s primitive reaches the core: all-electron sets of Li and beyond have one above
    0.68 Z**2 (the smallest found among published sets)."""
    shells = [shell for shell in block.shells if 0 in shell.angular]
    tightest = max((float(shell.exponents.max()) for shell in shells), default=0.0)
    return tightest < 0.6 * block.atomic_number**2


def likely_core(block: Block) -> int | None:
    """Electrons of the usual core that a valence block was most likely made for.

    Among the cores whose loss leaves no more shells than the block has functions: the one whose
    shells it describes least and whose other shells it describes best.  Tight lone functions look
    as if they were made for a smaller core; without them it is right for 19 of 20 blocks.
    """
    z = block.atomic_number
    shares: dict[Orbital, float] = {}
    found = []
    for electrons in possible_cores(z):
        replaced = replaced_by(electrons) or {}
        left = {l: n - replaced.get(l, 0) for l, n in occupied(z).items()}
        if any(block.counts.get(l, 0) < n for l, n in left.items()):
            continue
        shares = shares or described(block)
        mismatch = sum(
            share if n - l <= replaced.get(l, 0) else 1.0 - share
            for (n, l), share in shares.items()
        )
        found.append((mismatch, electrons))
    return min(found)[1] if found else fitting_core(block)


def described(block: Block) -> dict[Orbital, float]:
    """How much of each occupied subshell the functions of a block describe, 0 to 1.

    Slater functions with zeta by Slater's rules stand for the orbitals.
    """
    zetas = slater_zetas(subshells(block.atomic_number), block.atomic_number)
    return {orbital: covered(block, orbital, zeta) for orbital, zeta in zetas.items()}


def innermost(block: Block) -> float:
    """How much of the 1s shell a block describes, 0 to 1; zeta = Z - 0.3 by Slater's rules."""
    return covered(block, (1, 0), block.atomic_number - 0.3)


def covered(block: Block, orbital: Orbital, zeta: float) -> float:
    """Squared length of a Slater function's projection on the block's functions of its l, 0 to 1.

    Formula: v S**-1 v with v the overlaps of the function, S those of the block's functions.
    """
    functions = [
        f for _, f in block.functions_of(orbital[1]) if len(f.exponents) and f.exponents.min() > 0
    ]
    if not functions:
        return 0.0
    exponents = np.array(sorted({e for f in functions for e in f.exponents.tolist()}))
    weights = np.zeros((len(functions), len(exponents)))
    for row, f in enumerate(functions):
        np.add.at(weights[row], np.searchsorted(exponents, f.exponents), f.coefficients)
    with np.errstate(all="ignore"):
        overlap = weights @ primitive_overlap(exponents, exponents, orbital[1]) @ weights.T
        projected = weights @ slater_overlap(orbital, exponents, zeta)
        scale = 1.0 / np.sqrt(np.diagonal(overlap))
        overlap, projected = overlap * scale[:, None] * scale, projected * scale
    if not (np.isfinite(overlap).all() and np.isfinite(projected).all()):
        return 0.0
    values, vectors = np.linalg.eigh(overlap)
    kept = values > 1e-8  # nearly dependent functions add nothing
    return float(((vectors.T @ projected)[kept] ** 2 / values[kept]).sum())
