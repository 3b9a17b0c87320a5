"""Outlooks of small matrices, and of placed atoms whose fate can be told by hand."""

import numpy as np
import pytest

from overlapse.grammar.model import Block, Potential, Shell
from overlapse.rules.physics import outlook as module
from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.molecule import Field, affordable
from overlapse.rules.physics.outlook import Outlook, described, foresee, outlook
from overlapse.rules.physics.placed import Functions, Placed, lay_out


def pair(gap: float) -> np.ndarray:
    """Two functions of overlap 1 - gap: eigenvalues gap and 2 - gap."""
    return np.array([[1.0, 1.0 - gap], [1.0 - gap, 1.0]])


def lone(z: int, *shells: tuple[int, float], at: float = 0.0) -> Placed:
    """An atom on the z axis with uncontracted functions (l, exponent)."""
    made = tuple(Shell((l,), np.array([a]), np.array([[1.0]])) for l, a in shells)
    return Placed(Block(z, made), (0.0, 0.0, at))


def seen(*atoms: Placed, **more: object) -> Outlook:
    return foresee(atoms, overlap(atoms), kinetic(atoms), lay_out(atoms), **more)  # type: ignore[arg-type]


def test_orthonormal_functions_are_safe() -> None:
    found = outlook(np.eye(4))
    assert (found.level, found.measure) == ("safe", 1.0)


@pytest.mark.parametrize(
    ("gap", "level"), [(1e-3, "safe"), (2e-7, "safe"), (5e-8, "strained"), (1e-10, "fails")]
)
def test_without_a_field_the_eigenvalue_decides(gap: float, level: str) -> None:
    found = outlook(pair(gap))
    assert found.level == level
    assert found.measure == pytest.approx(gap, rel=1e-4)
    assert (found.measure < found.limit) == (level != "safe")


@pytest.mark.parametrize("gap", [0.0, -1e-15, -1e-6, 1e-17])
def test_what_is_not_positive_fails(gap: float) -> None:
    found = outlook(pair(gap), pair(0.5))
    assert found.level == "fails"
    assert "within rounding" in found.reason


def test_a_singular_matrix_of_many_functions_is_judged() -> None:
    points = np.linspace(0.0, 1.0, 60)
    crowded = np.exp(-((points[:, None] - points) ** 2))
    assert outlook(crowded, np.eye(60)).level == "fails"


def test_large_matrices_are_judged_without_all_eigenvalues(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "LARGE", 1)
    atom = lone(6, (0, 5.0), (0, 0.5), (0, 0.5001), (0, 0.1))
    s, functions = overlap([atom]), lay_out([atom])
    found = outlook(s, kinetic([atom]), functions)
    assert found.measure == pytest.approx(float(np.linalg.eigvalsh(s)[0]), rel=1e-4)
    assert "on one centre" in found.reason


def three(gap: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """S, T and F of a function at -1 hartree, and of two twins whose difference couples to it."""
    s = np.eye(3)
    s[1:, 1:] = pair(gap)
    turn = np.array([[1.0, 0, 0], [0, 1, 1], [0, -1, 1]]) / np.sqrt([[1.0], [2.0], [2.0]])
    half = np.sqrt([[1.0], [2.0 - gap], [gap]]) * turn  # S = half' half
    inside = np.array([[-1.0, 0.0, 0.004], [0.0, -0.5, 0.0], [0.004, 0.0, 3.0]])
    return s, half.T @ np.diag([1.0, 2.0, 4.0]) @ half, half.T @ inside @ half


def on(*atoms: int) -> Functions:
    """Functions s of exponent one on these atoms."""
    return lay_out([lone(1, *[(0, 1.0)] * atoms.count(k), at=float(k)) for k in set(atoms)])


EPS = np.finfo(float).eps


@pytest.mark.parametrize("gap", [2e-8, 3e-9, 4e-10, 1e-10])
@pytest.mark.parametrize(("atoms", "factor"), [((0, 1, 1), 1.0), ((0, 0, 1), 5.0)])
def test_noise_follows_the_formulas(gap: float, atoms: tuple[int, ...], factor: float) -> None:
    # Below 1e-9 the electrons held are those of perturbation, the same here to a part in 1e4.
    s, t, fock = three(gap)
    found = outlook(s, t, on(*atoms), field=Field((fock, fock), (1, 1)))
    held = 2.0 * (0.004 / 4.0) ** 2  # in a level 4 hartree above
    scale = factor * EPS * np.sqrt(4.0)
    gradient = scale * held**1.5 / gap**2
    if gradient > 1e-4:
        assert found.level == "fails"
        assert found.measure == pytest.approx(gradient, rel=1e-3)
    else:
        energy = scale * (held / gap) ** 2
        assert found.level == ("strained" if energy > 1.5e-8 else "safe")
        assert found.measure == pytest.approx(energy, rel=1e-3)


def test_the_field_of_the_electron_gas_is_held_to_stricter_limits() -> None:
    s, t, fock = three(4e-9)
    exact, gas = (
        outlook(s, t, on(0, 1, 1), field=Field((fock, fock), (1, 1), exact=exact))
        for exact in (True, False)
    )
    assert gas.limit == pytest.approx(0.3 * exact.limit)
    assert gas.measure == pytest.approx(exact.measure)


def test_twins_that_the_electrons_need_fail_and_tight_ones_do_not() -> None:
    shells = ((0, 30.0), (0, 5.0), (0, 1.2), (0, 0.35), (1, 2.0))
    valence = seen(lone(2, *shells, (0, 0.35 * 1.0001)))
    tight = seen(lone(2, *shells, (0, 3e4), (0, 3e4 * 1.0001)))
    assert valence.level == "fails"
    assert "electrons" in valence.reason and "on one centre" in valence.reason
    # The same eigenvalue, of a combination that holds next to nothing.
    assert tight.measure < 0.01 * valence.measure
    assert tight.level != "fails"


def test_exchange_is_made_only_where_the_electron_gas_leaves_a_doubt(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    asked = []
    made = module.molecular_field

    def counted(*given: object, exchange: bool) -> Field:
        asked.append(exchange)
        return made(*given, exchange=exchange)  # type: ignore[arg-type]

    monkeypatch.setattr(module, "molecular_field", counted)
    # Helium does without tight twins; without valence twins it is another atom.
    shells = [(0, 10.0), (0, 2.0), (0, 0.4)]
    assert seen(lone(2, *shells, (0, 3000.0), (0, 3001.0))).level == "safe"
    assert asked == [False]
    assert seen(lone(2, *shells, (0, 0.8), (0, 0.80001))).level == "fails"
    assert asked == [False, False, True]


def test_symmetry_protects_but_is_no_comfort_when_nothing_else_does() -> None:
    # No electron of helium has the symmetry of d functions.
    shells = ((0, 5.0), (0, 1.2), (0, 0.35), (2, 1.0))
    assert seen(lone(2, *shells, (2, 1.0003))).level == "safe"
    found = seen(lone(2, *shells, (2, 1.000001)))
    assert found.level == "strained"
    assert "may yet be felt" in found.reason


def test_a_core_potential_leaves_the_eigenvalue_to_decide() -> None:
    shells = lone(30, (0, 5.0), (0, 0.5), (0, 0.5002)).block.shells
    atom = Placed(Block(30, shells, Potential(10, ())), (0.0, 0.0, 0.0))
    found = seen(atom)
    assert found.measure == pytest.approx(float(np.linalg.eigvalsh(overlap([atom]))[0]), rel=1e-3)


def test_charge_spin_and_empty_centres_change_the_field() -> None:
    atoms = (lone(3, (0, 5.0), (0, 0.9), (0, 0.05), (0, 0.0501)), lone(1, (0, 0.6), at=3.0))
    plain = seen(*atoms)
    others = [seen(*atoms, charge=1), seen(*atoms, unpaired=2), seen(*atoms, empty=[1])]
    assert all(found.measure != plain.measure for found in others)


def test_large_molecules_get_no_field() -> None:
    atoms = [lone(1, (0, 1.0), at=2.0 * k) for k in range(30)]
    assert affordable(atoms[:3], 60)
    assert not affordable(atoms, 600)


def test_combinations_are_described() -> None:
    atoms = (lone(1, (0, 0.02), (1, 50.0)), lone(1, (0, 0.02), (1, 50.0), at=1.0))
    functions = lay_out(atoms)
    one, two = np.zeros(8), np.zeros(8)
    one[1:3] = 0.8, 0.6
    two[[0, 4]] = np.sqrt(0.5), -np.sqrt(0.5)
    assert described(one, functions) == "of tight p functions on one centre (typical exponent 50)"
    assert (
        described(two, functions) == "of diffuse s functions over 2 centres (typical exponent 0.02)"
    )
