"""Contractions as orbitals: their overlaps along a row, and the coefficient that spoils them."""

import numpy as np
import pytest

from overlapse.grammar.model import BasisSet, Block, Document, Floats, Shell
from overlapse.grammar.source import Source
from overlapse.rules.case import Case
from overlapse.rules.registry import rules
from overlapse.rules.rowwise.overlaps import odd_overlaps

EXPONENTS = 0.12 * 3.1 ** np.arange(7)[::-1]


def _orbitals(z: float, screening: float) -> tuple[Floats, Floats]:
    """Exponents and the two lowest s orbitals of one electron in a screened field of a nucleus.

    V = -Z/r with a Gaussian screening; integrals over normalised s Gaussians in closed form, A.
    Szabo, N. S. Ostlund, Modern Quantum Chemistry, appendix A.  numpy's eigenvectors.
    """
    a = EXPONENTS * (z / 6.0) ** 2
    total = a[:, None] + a[None, :]
    overlap = (2.0 * np.sqrt(a[:, None] * a[None, :]) / total) ** 1.5
    kinetic = 3.0 * a[:, None] * a[None, :] / total * overlap
    nuclear = -2.0 * z * np.sqrt(total / np.pi) * overlap
    cloud = screening * overlap * (total / (total + 0.4 * z)) ** 1.5
    root = np.linalg.inv(np.linalg.cholesky(overlap))
    _, vectors = np.linalg.eigh(root @ (kinetic + nuclear + cloud) @ root.T)
    return a, np.asarray(root.T @ vectors[:, :2])


def _set(factor: float = 1.0, row: int = 3, column: int = 0, scale: float = 1.0) -> BasisSet:
    blocks = []
    for z in range(5, 11):
        exponents, orbitals = _orbitals(z, 0.8 * z)
        table = np.round(scale * orbitals * np.sign(orbitals[4]), 6)
        if z == 7:
            table[row, column] *= factor
        blocks.append(Block(z, (Shell((0,), exponents, table),)))
    return BasisSet(tuple(blocks), "made")


def test_orbitals_are_orthonormal_and_silent() -> None:
    assert not odd_overlaps(_set(), 12.0)


@pytest.mark.parametrize("column", [0, 1])
@pytest.mark.parametrize("row", [2, 3, 4])
@pytest.mark.parametrize("factor", [1.1, 0.97, 1.01])
def test_a_changed_coefficient_is_named_with_its_value(
    factor: float, row: int, column: int
) -> None:
    sound = _set().blocks[2].shells[0].coefficients
    (odd,) = odd_overlaps(_set(factor, row, column), 12.0)
    assert odd.block.symbol == "N"
    assert odd.is_alone
    assert (odd.row, odd.column) == (row, column)
    assert odd.expected == pytest.approx(sound[row, column], rel=2e-3)


def test_two_numbers_together_are_not_named() -> None:
    # Half of a column scaled is no single slip: no one number puts norm and overlap in order.
    members = _set()
    table = members.blocks[2].shells[0].coefficients.copy()
    table[:4, 0] *= 1.2
    shell = Shell((0,), members.blocks[2].shells[0].exponents, table)
    blocks = list(members.blocks)
    blocks[2] = Block(7, (shell,))
    assert not [odd for odd in odd_overlaps(BasisSet(tuple(blocks)), 12.0) if odd.is_alone]


def test_the_rule_tells_overlap_and_value() -> None:
    # Printed by another factor throughout, so that norms say nothing.
    case = Case(Document(Source(""), "stars", (_set(1.03, scale=0.7),)))
    (finding,) = case.judge(rules()["contraction.trend"])
    assert (finding.element, finding.shell) == ("N", "s-1")
    sound = _set(scale=0.7).blocks[2].shells[0].coefficients[3, 0]
    assert finding.expected == pytest.approx(sound, rel=0.01)
    assert "overlap" in finding.message + " ".join(finding.witnesses)
