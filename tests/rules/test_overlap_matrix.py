"""Layout of functions, memory, screening, sums cut short: what no outside source is needed for."""

import subprocess
import sys
import tracemalloc
from collections.abc import Callable

import numpy as np
import pytest

from overlapse.grammar.model import Block, Shell
from overlapse.rules.physics import blocks
from overlapse.rules.physics.blocks import sparse_overlap
from overlapse.rules.physics.integrals import (
    TooLarge,
    kinetic,
    memory_needed,
    overlap,
)
from overlapse.rules.physics.lattice import (
    lattice_of,
    lattice_overlap,
    lattice_reach,
    monkhorst_pack,
)
from overlapse.rules.physics.placed import NotNormalisable, Placed, lay_out
from overlapse.rules.physics.spectrum import spectrum

ORIGIN = (0.0, 0.0, 0.0)
MIXED = Block(
    8,
    (
        Shell((0, 1), [5.0, 0.8, 0.2], [[0.3, 0.2], [0.6, 0.5], [0.02, 0.4]]),
        Shell((2,), [1.1], [[1.0]]),
        Shell((0,), [90.0, 12.0], [[0.4, 0.0], [0.7, 1.0]]),
    ),
)


def test_the_order_of_functions() -> None:
    found = lay_out([Placed(MIXED, ORIGIN), Placed(MIXED, (0.0, 0.0, 2.0), False)])
    assert found.atom.tolist() == [0] * 11 + [1] * 12
    assert found.shell.tolist()[:11] == [0] * 4 + [1] * 5 + [2, 2]
    assert found.column.tolist()[:11] == [0, 1, 1, 1] + [0] * 5 + [0, 1]
    assert found.l.tolist()[11:] == [0, 1, 1, 1] + [2] * 6 + [0, 0]
    assert found.component.tolist()[:9] == [0, -1, 0, 1, -2, -1, 0, 1, 2]
    assert found.component.tolist()[15:21] == [0, 1, 2, 3, 4, 5]
    # 0.2 has next to no weight in the s function, but shapes the p functions.
    assert found.exponent.tolist()[:4] == [0.8, 0.2, 0.2, 0.2]
    assert found.exponent.tolist()[9:11] == [12.0, 12.0]


def test_components_point_where_they_should() -> None:
    """Only the p function along the axis overlaps with an s: order y, z, x; Cartesian x, y, z."""
    p, s = Block(6, (Shell((1,), [0.8], [[1.0]]),)), Block(1, (Shell((0,), [0.5], [[1.0]]),))
    for spherical, order in ((True, (1, 2, 0)), (False, (0, 1, 2))):
        for axis in range(3):
            place = [0.0, 0.0, 0.0]
            place[order[axis]] = 1.5
            atoms = [Placed(p, ORIGIN, spherical), Placed(s, (place[0], place[1], place[2]))]
            found = overlap(atoms)[3, :3]
            assert found[axis] > 0.3
            assert np.abs(np.delete(found, axis)).max() < 1e-15


def test_a_function_without_a_norm_is_told() -> None:
    block = Block(8, (Shell((0,), [1.0], [[1.0]]), Shell((0,), [2.0], [[0.0]])))
    for made in (lay_out, overlap, kinetic):
        with pytest.raises(NotNormalisable, match="O s-2: column 1"):
            made([Placed(block, ORIGIN)])


def _cloud(count: int) -> list[Placed]:
    dice = np.random.default_rng(2)
    places = dice.uniform(0.0, 3.0 * count ** (1 / 3), (count, 3))
    return [Placed(MIXED, (float(x), float(y), float(z))) for x, y, z in places]


@pytest.mark.parametrize("rows", [5, 100, 3000])
def test_blocks_of_any_size_hold_one_matrix(rows: int, monkeypatch: pytest.MonkeyPatch) -> None:
    atoms = [*_cloud(30), Placed(Block(1, (Shell((0,), [1.0], [[1.0]]),)), ORIGIN)]
    atoms.insert(7, Placed(Block(2, ()), (1.0, 0.0, 0.0)))  # a centre without functions
    full = overlap(atoms)
    monkeypatch.setattr(blocks, "ROWS", rows)
    seen: list[float] = []
    found = sparse_overlap(atoms, drop=1e-6, progress=seen.append)
    assert seen[-1] == pytest.approx(1.0)
    dense = found.matrix.dense()
    assert np.array_equal(dense, np.where(np.abs(full) >= 1e-6, dense, 0.0))
    assert dense == pytest.approx(full, abs=1e-6)
    assert found.matrix.nnz == np.count_nonzero(dense)
    assert found.matrix.shape == full.shape
    left_out = np.abs(np.where(dense == 0.0, full, 0.0)).sum(axis=1)
    assert left_out.max() <= found.bound
    some = np.array([0, 3, 12, 110, 200, 330])
    assert np.array_equal(found.matrix.dense(some), dense[np.ix_(some, some)])
    vector = np.random.default_rng(1).normal(size=len(full))
    assert found.matrix @ vector == pytest.approx(dense @ vector, abs=1e-12)


def test_a_dense_matrix_needs_numpy_alone() -> None:
    code = (
        "import sys\n"
        "from overlapse.rules.physics.integrals import overlap\n"
        "from overlapse.rules.physics.placed import Placed\n"
        "from overlapse.grammar.model import Block, Shell\n"
        "block = Block(1, (Shell((0,), [1.0], [[1.0]]),))\n"
        "print(overlap([Placed(block, (0.0, 0.0, 0.0))]), 'scipy' in sys.modules)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[[1.]] False"


def test_memory_is_judged_before_it_is_used() -> None:
    atoms = _cloud(40)
    needed = memory_needed(len(lay_out(atoms).atom))
    assert overlap(atoms, memory=needed).shape == (440, 440)
    with pytest.raises(
        TooLarge, match=r"440 functions needs .* GiB and .* GiB may be used"
    ) as told:
        overlap(atoms, memory=needed - 1)
    assert (told.value.needed, told.value.allowed) == (needed, needed - 1)
    assert isinstance(told.value, MemoryError)
    with pytest.raises(TooLarge):
        sparse_overlap(atoms, memory=1000)
    with pytest.raises(TooLarge):
        lattice_overlap(atoms, np.eye(3) * 20.0, monkhorst_pack((2, 2, 2)), memory=1000)


def _peak(work: Callable[[], object]) -> int:
    tracemalloc.start()
    work()
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    return peak


def test_no_more_memory_than_promised() -> None:
    atoms = _cloud(220)
    overlap(atoms[:3])  # tables that stay
    size = 8 * (11 * 220) ** 2
    assert _peak(lambda: overlap(atoms)) <= min(2.5 * size, memory_needed(11 * 220))
    matrix = overlap(atoms)
    assert _peak(lambda: spectrum(matrix)) <= 1.5 * size  # beside the matrix itself


def test_progress_rises_to_one() -> None:
    seen: list[float] = []
    atoms = [*_cloud(5), Placed(Block(1, (Shell((0,), [1.0], [[1.0]]),)), ORIGIN)]
    overlap(atoms, progress=seen.append)
    assert seen == sorted(seen)
    assert seen[-1] == pytest.approx(1.0)


def test_many_functions_that_are_not_contracted() -> None:
    """Their table of weights is sparse; a dense one of the same functions gives the same."""
    exponents = 0.02 * 1.5 ** np.arange(34)
    lone = tuple(Shell((0,), [a], [[1.0]]) for a in exponents)
    one = Shell((0,), exponents, np.eye(34))
    places = [ORIGIN, (0.0, 1.0, 2.0)]
    found = overlap([Placed(Block(8, lone), place) for place in places])
    half = overlap([Placed(Block(8, lone[:17]), place) for place in places])
    assert found == pytest.approx(overlap([Placed(Block(8, (one,)), p) for p in places]), abs=1e-15)
    keep = np.r_[0:17, 34:51]
    assert found[np.ix_(keep, keep)] == pytest.approx(half, abs=1e-14)


CELL = np.array([[5.0, 0.0, 0.0], [1.0, 4.5, 0.0], [0.0, 0.7, 6.0]])


def test_a_sum_cut_short_shows_itself() -> None:
    """Converged sums are positive definite; cut at nine bohr these are not."""
    block = Block(12, (Shell((0,), [0.08], [[1.0]]), Shell((1,), [0.09], [[1.0]])))
    atoms = [Placed(block, ORIGIN)]
    points = monkhorst_pack((3, 3, 3))
    whole = lattice_overlap(atoms, CELL, points, tolerance=1e-13)
    short = lattice_overlap(atoms, CELL, points, reach=9.0)
    assert min(np.linalg.eigvalsh(k)[0] for k in whole) > 1e-6
    assert min(np.linalg.eigvalsh(k)[0] for k in short) < 0.0
    reach = lattice_reach(atoms, CELL, tolerance=1e-13)
    again = lattice_overlap(atoms, CELL, points, reach=reach, tolerance=1e-13)
    assert np.array_equal(again, whole)


@pytest.mark.parametrize("tolerance", [1e-3, 1e-6, 1e-9])
@pytest.mark.parametrize("dimension", [1, 2, 3])
def test_lattice_sums_keep_the_error_they_state(tolerance: float, dimension: int) -> None:
    atoms = [Placed(MIXED, ORIGIN), Placed(MIXED, (1.0, 2.0, 3.0), False)]
    flags = [axis < dimension for axis in range(3)]
    points = np.array([[0.0, 0.0, 0.0], [0.2, 0.1, 0.4]])
    exact = lattice_overlap(atoms, CELL, points, tolerance=1e-14, periodic=flags)
    found = lattice_overlap(atoms, CELL, points, tolerance=tolerance, periodic=flags)
    assert np.abs(found - exact).max() < tolerance


def test_sums_of_one_tolerance_do_not_share_their_reach() -> None:
    atoms, points = [Placed(MIXED, ORIGIN)], np.zeros((1, 3))
    small = lattice_reach(atoms, CELL, tolerance=1e-8)
    assert lattice_reach(atoms, CELL * 0.3, tolerance=1e-8) > small
    whole = lattice_overlap(atoms, CELL, points, tolerance=1e-8)
    lone = lattice_overlap(atoms, CELL, points, tolerance=1e-8, reach=1.0)
    assert lone[0].real == pytest.approx(overlap(atoms), abs=1e-8)
    assert np.abs(whole - lone).max() > 0.01


def test_an_atom_may_lie_in_any_cell() -> None:
    """Moving an atom by a lattice vector turns phases, not eigenvalues."""
    points = np.array([[0.0, 0.0, 0.0], [0.2, 0.1, 0.4]])
    first = [Placed(MIXED, ORIGIN), Placed(MIXED, (1.0, 2.0, 3.0))]
    place = np.array([1.0, 2.0, 3.0]) + CELL[0] * 3 - CELL[2]
    second = [first[0], Placed(MIXED, (float(place[0]), float(place[1]), float(place[2])))]
    for one, other in zip(
        lattice_overlap(first, CELL, points), lattice_overlap(second, CELL, points), strict=True
    ):
        assert np.linalg.eigvalsh(one) == pytest.approx(np.linalg.eigvalsh(other), abs=1e-9)


def test_a_supercell_has_the_eigenvalues_of_the_k_points_it_folds() -> None:
    atoms = [Placed(MIXED, ORIGIN)]
    points = np.array([[0.0, 0.0, 0.0], [0.5, 0.0, 0.0]])
    folded = np.sort(
        np.concatenate([np.linalg.eigvalsh(k) for k in lattice_overlap(atoms, CELL, points)])
    )
    twice = CELL * np.array([[2.0], [1.0], [1.0]])
    first = tuple(map(float, CELL[0]))
    (gamma,) = lattice_overlap([*atoms, Placed(MIXED, first)], twice, points[:1])  # type: ignore[arg-type]
    assert np.linalg.eigvalsh(gamma) == pytest.approx(folded, abs=1e-9)


def test_meshes() -> None:
    assert monkhorst_pack((1, 1, 1)).tolist() == [[0.0, 0.0, 0.0]]
    assert monkhorst_pack((2, 1, 1), reduced=False)[:, 0].tolist() == [-0.25, 0.25]
    assert len(monkhorst_pack((4, 4, 4), reduced=False)) == 64
    assert len(monkhorst_pack((4, 4, 4))) == 32
    assert len(monkhorst_pack((3, 3, 3))) == 14


def test_cells_that_are_none() -> None:
    for cell, flags in (
        (np.zeros((3, 3)), (True, True, True)),
        (CELL, (False, False, False)),
        (np.ones((3, 3)), (True, True, True)),
    ):
        with pytest.raises(ValueError, match=r"lattice|cell"):
            lattice_of(cell, flags)
