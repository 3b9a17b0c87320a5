"""Overlap, kinetic energy and lattice sums against PySCF's integral library."""

from pathlib import Path

import numpy as np
import pytest

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from oracle import in_its_order, placed, unit_diagonal  # noqa: E402
from pyscf import gto  # noqa: E402
from pyscf.pbc import gto as periodic  # noqa: E402

from overlapse.grammar.reading import read  # noqa: E402
from overlapse.rules.physics.blocks import sparse_overlap  # noqa: E402
from overlapse.rules.physics.integrals import kinetic, overlap  # noqa: E402
from overlapse.rules.physics.lattice import lattice_overlap, monkhorst_pack  # noqa: E402
from overlapse.rules.physics.placed import Placed  # noqa: E402

BASIS = Path(pyscf.__file__).parent / "gto" / "basis"
ELEMENTS = "H He Li B C N O F Ne Na Si P S Cl".split()


def _general(dice: np.random.Generator, top: int) -> list[list[object]]:
    """Shells of every l up to ``top``, of one to three primitives and up to as many columns.

    From g on exponents are those of polarization functions: with tight ones far apart the library
    loses digits (up to 2e-9 at i-i; integrals of 40 digits show ours right to 1e-16 there).
    """
    shells: list[list[object]] = []
    for l in range(top + 1):
        for _ in range(2 if l < 3 else 1):
            count = int(dice.integers(1, 4))
            tightest = 30.0 if l < 4 else 4.0
            exponents = np.exp(dice.uniform(np.log(0.05), np.log(tightest), count))
            table = dice.uniform(-1.0, 1.0, (count, int(dice.integers(1, count + 1))))
            rows = [[float(a), *map(float, row)] for a, row in zip(exponents, table, strict=True)]
            shells.append([l, *rows])
    return shells


@pytest.mark.parametrize("cartesian", [False, True], ids=["spherical", "cartesian"])
@pytest.mark.parametrize("seed", range(20))
def test_random_contractions_at_random_places(seed: int, cartesian: bool) -> None:
    dice = np.random.default_rng(seed)
    top = 3 if seed < 10 else 6
    symbols = [str(s) for s in dice.choice(ELEMENTS, 3 if top == 3 else 2, replace=False)]
    basis = {symbol: _general(dice, top) for symbol in symbols}
    atoms = [(str(s), tuple(dice.uniform(-2.0, 2.0, 3))) for s in (*symbols, symbols[0])]
    molecule = gto.M(atom=atoms, basis=basis, unit="B", cart=cartesian, spin=None, verbose=0)
    ours = placed(molecule)
    for name, made in (("int1e_ovlp", overlap), ("int1e_kin", kinetic)):
        found = in_its_order(made(ours), molecule, ours)
        expected = unit_diagonal(molecule.intor(name), molecule)
        limit = 1e-12 if top == 3 else 1e-10
        assert np.abs(found - expected).max() < limit * max(1.0, np.abs(expected).max())


@pytest.mark.parametrize("name", ["sto-3g", "6-31g*", "def2-tzvpd", "cc-pvtz", "ano"])
def test_a_published_set_through_the_reader(name: str) -> None:
    """The functions of the file as read here against the library's own reading of it."""
    path = BASIS / {"6-31g*": "pople-basis/6-31Gs.dat"}.get(name, f"{name}.dat")
    blocks = {block.symbol: block for block in read(path).blocks}
    dice = np.random.default_rng(5)
    atoms = [(symbol, tuple(dice.uniform(-2.0, 2.0, 3))) for symbol in ("O", "H", "H", "C")]
    molecule = gto.M(atom=atoms, basis=name, unit="B", verbose=0)
    ours = [Placed(blocks[symbol], place) for symbol, place in atoms]
    found = in_its_order(overlap(ours), molecule, ours)
    expected = unit_diagonal(molecule.intor("int1e_ovlp"), molecule)
    assert np.abs(found - expected).max() < 1e-12


def test_sparse_form() -> None:
    chain = [("H", (2.0 * step, 0.3 * (step % 2), 0.0)) for step in range(60)]
    molecule = gto.M(atom=chain, basis="cc-pvdz", unit="B", verbose=0)
    ours = placed(molecule)
    found = sparse_overlap(ours, drop=1e-8)
    full = found.matrix.dense()
    expected = unit_diagonal(molecule.intor("int1e_ovlp"), molecule)
    assert found.matrix.nnz < 0.5 * full.size
    assert np.abs(in_its_order(full, molecule, ours) - expected).max() < 1e-8
    change = np.linalg.eigvalsh(full) - np.linalg.eigvalsh(expected)
    assert np.abs(change).max() <= found.bound < 1e-6


DIAMOND = np.array([[0.0, 1.0, 1.0], [1.0, 0.0, 1.0], [1.0, 1.0, 0.0]]) * 3.37013758
LAYER = np.array([[4.6, 0.0, 0.0], [2.3, 4.0, 0.0], [0.0, 0.0, 30.0]])


@pytest.mark.parametrize(
    ("vectors", "basis", "cartesian", "dimension"),
    [
        (DIAMOND, "def2-svp", False, 3),
        (DIAMOND, "6-31g*", True, 3),
        (DIAMOND * 0.98 + np.diag([0.3, 0.0, -0.2]), "gth-szv", False, 3),
        (LAYER, "gth-szv", False, 2),
    ],
)
def test_lattice_sums(vectors: np.ndarray, basis: str, cartesian: bool, dimension: int) -> None:
    cell = periodic.Cell()
    cell.build(
        atom=[("C", (0.0, 0.0, 0.0)), ("C", (1.6, 1.7, 1.75))],
        a=vectors,
        basis=basis,
        unit="B",
        cart=cartesian,
        dimension=dimension,
        precision=1e-13,
        verbose=0,
    )
    points = monkhorst_pack((2, 2, 1)) if dimension == 2 else monkhorst_pack((2, 2, 3))
    points = np.vstack([points, np.zeros(3), [0.13, -0.4, 0.0]])
    ours = placed(cell)
    flags = [axis < dimension for axis in range(3)]
    found = lattice_overlap(ours, vectors, points, tolerance=1e-12, periodic=flags)
    expected = np.array(cell.pbc_intor("int1e_ovlp", kpts=cell.get_abs_kpts(points)))
    for one, other in zip(found, expected, strict=True):
        scaled = unit_diagonal(other, cell.to_mol())
        assert np.abs(in_its_order(one, cell, ours) - scaled).max() < 1e-9
        assert np.array_equal(one, one.conj().T)
    rough = lattice_overlap(ours, vectors, points, tolerance=1e-6, periodic=flags)
    assert 0.0 < np.abs(rough - found).max() < 1e-6
