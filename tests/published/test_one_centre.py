"""One-centre overlaps of all l up to 6 against PySCF's integral library."""

import numpy as np
import pytest

from overlapse.grammar.model import Shell
from overlapse.rules.physics.onecentre import contracted_overlap, primitive_overlap

gto = pytest.importorskip(
    "pyscf.gto", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)

EXPONENTS = np.array([170.0, 41.0, 9.3, 2.6, 0.71, 0.18, 0.045])


@pytest.mark.parametrize("l", range(7))
def test_primitives(l: int) -> None:
    basis = [[l, [float(a), 1.0]] for a in EXPONENTS]
    molecule = gto.M(atom="Ne 0 0 0", basis={"Ne": basis}, verbose=0)
    full = molecule.intor("int1e_ovlp_sph")
    components = 2 * l + 1
    expected = full[::components, ::components]
    assert primitive_overlap(EXPONENTS, EXPONENTS, l) == pytest.approx(expected, abs=1e-12)


@pytest.mark.parametrize("l", range(7))
def test_contractions(l: int) -> None:
    table = np.array([[0.2, 0.0], [0.5, -0.3], [0.6, 0.4], [0.1, 0.9]])
    shell = Shell((l,), EXPONENTS[1:5], table)
    basis = [[l, *(map(float, (a, *row)) for a, row in zip(EXPONENTS[1:5], table, strict=True))]]
    basis = [[l, *[list(row) for row in basis[0][1:]]]]
    molecule = gto.M(atom="Ne 0 0 0", basis={"Ne": basis}, verbose=0)
    full = molecule.intor("int1e_ovlp_sph")
    # Functions of one contraction follow one another, 2 l + 1 components each.
    expected = full[:: 2 * l + 1, :: 2 * l + 1]
    found = contracted_overlap(list(shell.functions()))
    assert found == pytest.approx(expected, abs=1e-12)
