"""Condition of overlap matrices and what to drop, against values computed with another program.

The systems are nearly dependent in different ways: twins on one atom, diffuse functions of many
atoms.  Values: smallest eigenvalues computed with PySCF to two digits.
"""

from math import cos, radians, sin
from pathlib import Path

import numpy as np
import pytest

from overlapse.grammar.model import Block, Floats, Shell
from overlapse.grammar.reading import read
from overlapse.rules.physics import spectrum as condition
from overlapse.rules.physics.blocks import sparse_overlap
from overlapse.rules.physics.integrals import overlap
from overlapse.rules.physics.placed import Placed, lay_out
from overlapse.rules.physics.pruning import chosen, shells_to_drop
from overlapse.rules.physics.spectrum import (
    largest,
    lowest,
    smallest,
    spectrum,
    spectrum_of_sparse,
)

ANGSTROM = 1.0 / 0.529177210903  # CODATA 2018


def _blocks(name: str) -> dict[str, Block]:
    pyscf = pytest.importorskip(
        "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
    )
    path = Path(pyscf.__file__).parent / "gto" / "basis" / name
    return {block.symbol: block for block in read(path).blocks}


def _chain(step: float, count: int = 10) -> list[Placed]:
    """Hydrogen atoms ``step`` angstrom apart in aug-cc-pVDZ."""
    block = _blocks("aug-cc-pvdz.dat")["H"]
    return [Placed(block, (0.0, 0.0, step * ANGSTROM * at)) for at in range(count)]


def _water(name: str, twins: float | None = None) -> list[Placed]:
    blocks = _blocks(name)
    length, half = 0.9572 * ANGSTROM, radians(104.52 / 2)
    places = [("O", 0.0, 0.0), ("H", sin(half), cos(half)), ("H", -sin(half), cos(half))]
    atoms = []
    for symbol, y, z in places:
        block = blocks[symbol]
        if twins is not None:
            more = tuple(Shell((0,), [a], [[1.0]]) for a in (0.3, 0.3 * twins))
            block = Block(block.atomic_number, (*block.shells, *more))
        atoms.append(Placed(block, (0.0, y * length, z * length)))
    return atoms


@pytest.mark.parametrize(("step", "value"), [(1.0, "4.2e-09"), (0.8, "9.3e-11"), (0.6, "5.9e-13")])
def test_chains_of_hydrogen(step: float, value: str) -> None:
    assert f"{spectrum(overlap(_chain(step))).smallest:.1e}" == value


@pytest.mark.parametrize(
    ("twins", "value"),
    [(1.1, 2.2e-6), (1.01, 2.0e-8), (1.001, 1.9e-10), (1.0001, 1.9e-12), (1.00001, 1.9e-14)],
)
def test_water_with_twins(twins: float, value: float) -> None:
    found = spectrum(overlap(_water("def2-svp.dat", twins)))
    # At 1e-14 rounding of the elements shows in the second digit.
    assert found.smallest == pytest.approx(value, rel=0.03 if value > 1e-13 else 0.1)
    assert found.functions == 30


def test_water_in_a_sound_set() -> None:
    found = spectrum(overlap(_water("aug-cc-pvtz.dat")))
    # The geometry of the value is not told: 2 % cover half a picometre.
    assert found.smallest == pytest.approx(3.9e-4, rel=0.02)
    assert not any(found.below.values())


SYSTEMS = {
    "chain 1.0": lambda: _chain(1.0),
    "chain 0.6": lambda: _chain(0.6),
    "twins 1.001": lambda: _water("def2-svp.dat", 1.001),
    "twins 1.00001": lambda: _water("def2-svp.dat", 1.00001),
    "sound": lambda: _water("def2-svp.dat"),
}


@pytest.mark.parametrize("system", SYSTEMS)
@pytest.mark.parametrize("tolerance", [1e-5, 1e-7, 1e-8])
def test_what_is_kept_is_well_conditioned(system: str, tolerance: float) -> None:
    atoms = SYSTEMS[system]()
    matrix = overlap(atoms)
    kept = chosen(matrix, tolerance)
    values = np.linalg.eigvalsh(matrix[np.ix_(kept, kept)])
    assert values[0] >= 0.1 * tolerance
    assert (np.diff(kept) > 0).all()
    # Interlacing: what is dropped cannot be fewer than the eigenvalues below.
    assert len(matrix) - len(kept) >= (np.linalg.eigvalsh(matrix) < 0.1 * tolerance).sum()
    for per in ("element", "atom"):
        pruned = shells_to_drop(matrix, lay_out(atoms), atoms, tolerance, per)  # type: ignore[arg-type]
        assert pruned.smallest >= 0.1 * tolerance
        assert len(pruned.kept) <= len(kept) or system == "chain 0.6"


def test_twins_are_named() -> None:
    atoms = _water("def2-svp.dat", 1.001)
    matrix = overlap(atoms)
    pruned = shells_to_drop(matrix, lay_out(atoms), atoms, 1e-7)
    assert {drop.atomic_number for drop in pruned.drops} == {1, 8}
    assert len(pruned.drops) == 2
    assert all(drop.atom is None for drop in pruned.drops)
    assert all(drop.exponent in (0.3, 0.3 * 1.001) for drop in pruned.drops)
    assert len(pruned.kept) == 27
    each = shells_to_drop(matrix, lay_out(atoms), atoms, 1e-7, "atom")
    assert sorted(drop.atom for drop in each.drops if drop.atom is not None) == [0, 1, 2]


# Smallest eigenvalues of even-tempered series of s (and d) functions, by numpy from the closed
# formula of the one-centre overlap.
SERIES = [
    (1.4, 5, 1.0e-5, 9.5e-5),
    (1.4, 10, 2.2e-8, 6.1e-7),
    (1.6, 10, 2.5e-6, 5.7e-5),
    (1.8, 15, 1.7e-5, 4.1e-4),
    (2.0, 25, 9.6e-5, 2.0e-3),
    (2.5, 25, 1.9e-3, 2.4e-2),
]


@pytest.mark.parametrize(("ratio", "count", "s", "d"), SERIES)
def test_even_tempered_series(ratio: float, count: int, s: float, d: float) -> None:
    for l, expected in ((0, s), (2, d)):
        shells = tuple(Shell((l,), [0.05 * ratio**k], [[1.0]]) for k in range(count))
        found = spectrum(overlap([Placed(Block(8, shells), (0.0, 0.0, 0.0))]))
        assert f"{found.smallest:.1e}" == f"{expected:.1e}"


def test_the_choice_between_two_functions() -> None:
    """The pivot of the second of two functions is 1 - S**2, S = (2 sqrt(r)/(1 + r))**(3/2).

    Exponents 94.8087 and 92.4575, of a published case of nearly dependent oxygen functions: their
    ratio is 1.025 and 1 - S is 1.2e-4.
    """
    shells = tuple(Shell((0,), [a], [[1.0]]) for a in (94.8087, 92.4575))
    matrix = overlap([Placed(Block(8, shells), (0.0, 0.0, 0.0))])
    ratio = 94.8087 / 92.4575
    overlap_of_both = (2.0 * ratio**0.5 / (1.0 + ratio)) ** 1.5
    pivot = 1.0 - overlap_of_both**2
    assert matrix[0, 1] == pytest.approx(overlap_of_both, abs=1e-15)
    assert len(chosen(matrix, pivot * 1.001)) == 1
    assert len(chosen(matrix, pivot * 0.999)) == 2


# ---- the ways for large matrices, on matrices made to have a spectrum


def _made(lowest_values: list[float], complex_: bool) -> Floats:
    """A matrix with given small eigenvalues, the others between 1e-2 and 5."""
    dice = np.random.default_rng(3)
    shape = (120, 120)
    vectors = dice.normal(size=shape) + (1j * dice.normal(size=shape) if complex_ else 0.0)
    vectors = np.linalg.qr(vectors)[0]
    values = np.concatenate([lowest_values, np.geomspace(1e-2, 5.0, 120 - len(lowest_values))])
    matrix = (vectors * values) @ vectors.conj().T
    result: Floats = 0.5 * (matrix + matrix.conj().T)
    return result


SPECTRA = [
    [2e-9, 3e-8, 5e-7, 2e-6, 3e-5],
    [1e-14, 3e-14, 1e-9, 3e-5],
    [-2e-15, 1e-14, 4e-6],
    [-1e-3, 1e-13, 4e-6],
    [-0.5, -0.1, 4e-7],
    [5e-3],
]


@pytest.mark.parametrize("complex_", [False, True], ids=["real", "complex"])
@pytest.mark.parametrize("values", SPECTRA)
def test_large_matrices(
    values: list[float], complex_: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    matrix = _made(values, complex_)
    exact = np.linalg.eigvalsh(matrix)
    monkeypatch.setattr(condition, "SMALL", 0)
    middling = spectrum(matrix)
    assert (middling.method == "all eigenvalues") == (exact[0] < 1e-4)
    monkeypatch.setattr(condition, "MIDDLE", 0)
    found = spectrum(matrix)
    assert found.below == middling.below
    assert found.smallest == pytest.approx(exact[0], rel=1e-4, abs=3e-15)
    assert found.largest == pytest.approx(exact[-1], rel=1e-6)
    assert found.below == {step: int((exact < step).sum()) for step in condition.LADDER}
    if exact[0] > 1e-12:
        assert found.condition == pytest.approx(exact[-1] / exact[0], rel=1e-4)
    if exact[0] < -1e-12:
        assert found.condition == np.inf
    under, vectors = lowest(matrix, 1e-4)
    assert under == pytest.approx(exact[exact < 1e-4], rel=1e-6, abs=1e-14)
    assert np.abs(matrix @ vectors - vectors * under).max(initial=0.0) < 1e-9


def test_large_overlap_matrices(monkeypatch: pytest.MonkeyPatch) -> None:
    for atoms in (_chain(0.6, 14), _chain(1.0, 14), _water("def2-svp.dat", 1.001)):
        matrix = overlap(atoms)
        exact = np.linalg.eigvalsh(matrix)
        monkeypatch.setattr(condition, "SMALL", 0)
        monkeypatch.setattr(condition, "MIDDLE", 0)
        found = spectrum(matrix)
        assert found.method.startswith("Cholesky")
        assert found.below == {step: int((exact < step).sum()) for step in condition.LADDER}
        assert found.smallest == pytest.approx(exact[0], rel=1e-3, abs=1e-15)
        assert smallest(matrix) == found.smallest
        assert largest(matrix) == found.largest
        monkeypatch.undo()


def test_sparse_matrices_within_memory() -> None:
    atoms = _chain(1.9, 60)
    exponents = lay_out(atoms).exponent
    found = sparse_overlap(atoms)
    exact = np.linalg.eigvalsh(overlap(atoms))
    whole = spectrum_of_sparse(found.matrix, exponents, memory=2**30)
    assert whole.smallest == pytest.approx(exact[0], abs=found.bound + 1e-15)
    part = spectrum_of_sparse(found.matrix, exponents, memory=3_000_000)
    assert exact[0] < part.smallest < 20.0 * exact[0]
    assert part.largest == pytest.approx(exact[-1], rel=1e-5)
    assert "bounds from the 387 most diffuse of 540 functions" in part.method
    for step, count in part.below.items():
        assert count <= (exact < step).sum()


def test_two_atoms_at_one_place() -> None:
    """A ghost on top of its atom: every eigenvalue comes twice as large, and zero as often."""
    atoms = _water("def2-svp.dat")
    matrix = overlap([*atoms, *atoms])
    single = np.linalg.eigvalsh(overlap(atoms))
    values = np.linalg.eigvalsh(matrix)
    assert values[24:] == pytest.approx(2.0 * single, abs=1e-13)
    assert np.abs(values[:24]).max() < 1e-14
    found = spectrum(matrix)
    assert found.below == dict.fromkeys(condition.LADDER, 24)
    assert len(chosen(matrix, 1e-7)) == 24
    sparse = sparse_overlap([*atoms, *atoms], drop=1e-14).matrix.dense()
    assert np.abs(sparse - matrix).max() < 1e-13


def test_no_functions_at_all() -> None:
    found = spectrum(overlap([Placed(Block(1, ()), (0.0, 0.0, 0.0))]))
    assert (found.functions, found.condition) == (0, 1.0)
    assert overlap([]).shape == (0, 0)
