"""What dropped functions are worth, beside Hartree-Fock energies computed with PySCF."""

import numpy as np
import pytest

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from oracle import placed  # noqa: E402
from pyscf import gto, scf  # noqa: E402

from overlapse.rules.physics.integrals import kinetic, overlap  # noqa: E402
from overlapse.rules.physics.placed import lay_out  # noqa: E402
from overlapse.rules.physics.worth import worth_of  # noqa: E402

WATER = "O 0 0 0; H 0 0.757 0.587; H 0 -0.757 0.587"


def _energy(atoms: str, basis: dict[str, list[object]]) -> float:
    molecule = gto.M(atom=atoms, basis=basis, verbose=0)
    return float(scf.RHF(molecule).run(conv_tol=1e-10).e_tot)


@pytest.mark.parametrize(
    ("atoms", "name"),
    [
        (WATER, "6-31++g"),
        (WATER, "aug-cc-pvdz"),
        ("Li 0 0 0; H 0 0 1.6", "6-31++g"),
        ("C 0 0 0; O 0 0 1.13", "aug-cc-pvdz"),
        ("Na 0 0 0; Cl 0 0 2.36", "6-31++g*"),
    ],
)
def test_losses_below_a_millihartree_are_of_the_right_size(atoms: str, name: str) -> None:
    molecule = gto.M(atom=atoms, basis=name, verbose=0)
    ours = placed(molecule)
    matrix = overlap(ours)
    functions = lay_out(ours)
    worth = worth_of(ours, matrix, kinetic(ours))
    assert worth is not None
    whole = _energy(atoms, molecule._basis)
    seen = 0
    for symbol, shells in molecule._basis.items():
        own = np.array([atom.block.symbol == symbol for atom in ours])[functions.atom]
        for index, shell in enumerate(shells):
            if len(shell) > 2:  # not a lone primitive, as diffuse and polarizing ones are
                continue
            kept = np.flatnonzero(~(own & (functions.shell == index)))
            left = {**molecule._basis, symbol: [*shells[:index], *shells[index + 1 :]]}
            lost = _energy(atoms, left) - whole
            if 1e-6 < lost < 1e-3:
                seen += 1
                assert lost / 3.0 < worth.loss(kept) < lost * 10.0, (symbol, shell, lost)
    assert seen >= 2


def test_nothing_is_lost_with_nothing_and_all_with_all() -> None:
    molecule = gto.M(atom=WATER, basis="6-31g", verbose=0)
    ours = placed(molecule)
    matrix = overlap(ours)
    worth = worth_of(ours, matrix, kinetic(ours))
    assert worth is not None
    assert worth.loss(np.arange(13)) == pytest.approx(0.0, abs=1e-12)
    assert worth.loss(np.arange(3)) == np.inf
    assert worth_of(ours, matrix, kinetic(ours), charge=10) is None
