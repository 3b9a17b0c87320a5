"""Screening of published sets against eigenvalues from an independent integral library, PySCF."""

from pathlib import Path

import numpy as np
import pytest

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from pyscf import gto  # noqa: E402

from overlapse.lint.screening import screen_files  # noqa: E402
from overlapse.rules.measured.probe import Probe  # noqa: E402
from overlapse.rules.measured.probing import Wanted  # noqa: E402

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"
# Geometries of A. Szabo, N. S. Ostlund, Modern Quantum Chemistry, chapter 3, from memory; bohr.
HF = "F 0 0 0; H 0 0 1.733"
WATER = "O 0 0 0; H 1.809 0 0; H -0.45359 1.75121 0"


def _screened(tmp_path: Path, name: str, atoms: str, **options: bool) -> Probe:
    rows = atoms.split("; ")
    path = tmp_path / "molecule.xyz"
    path.write_text(f"{len(rows)}\nbohr\n" + "\n".join(rows) + "\n")
    (probe,) = screen_files([FOLDER / name], path, wanted=Wanted(values=True), **options).probes
    return probe


def _expected(basis: str, atoms: str, cart: bool) -> list[float]:
    molecule = gto.M(atom=atoms, unit="bohr", basis=basis, cart=cart, verbose=0)
    # Its contractions are normalised to the printed digits only; components of Cartesian shells
    # share their radial norm, as ours do.
    matrix = molecule.intor("int1e_ovlp")
    return np.linalg.eigvalsh(matrix).tolist()


@pytest.mark.parametrize("atoms", [HF, WATER])
@pytest.mark.parametrize(
    ("name", "basis", "cart"),
    [
        ("sto-3g.dat", "sto-3g", False),
        ("pople-basis/6-31Gs.dat", "6-31g*", True),
        ("aug-cc-pvdz.dat", "aug-cc-pvdz", False),
        ("def2-tzvpd.dat", "def2-tzvpd", False),
    ],
)
def test_eigenvalues_and_the_kind_that_a_family_is_used_with(
    tmp_path: Path, name: str, basis: str, cart: bool, atoms: str
) -> None:
    probe = _screened(tmp_path, name, atoms)
    assert list(probe.values) == pytest.approx(_expected(basis, atoms, cart), abs=1e-11)
    assert probe.spherical is not cart
    if cart:
        assert probe.counterpart is not None
        spherical = min(_expected(basis, atoms, False))
        assert probe.counterpart.smallest == pytest.approx(spherical, abs=1e-11)


def test_the_kind_can_be_chosen(tmp_path: Path) -> None:
    probe = _screened(tmp_path, "pople-basis/6-31Gs.dat", HF, spherical=True)
    assert list(probe.values) == pytest.approx(_expected("6-31g*", HF, False), abs=1e-11)


def test_benzene_in_a_diffuse_set(tmp_path: Path) -> None:
    turns = [k * np.pi / 3 for k in range(6)]
    rows = [
        f"{s} {r * np.cos(t):.8f} {r * np.sin(t):.8f} 0"
        for s, r in (("C", 2.63), ("H", 4.69))
        for t in turns
    ]
    probe = _screened(tmp_path, "aug-cc-pvdz.dat", "; ".join(rows))
    values = _expected("aug-cc-pvdz", "; ".join(rows), False)
    assert probe.spectrum.below == {
        step: sum(value < step for value in values) for step in probe.spectrum.below
    }
    assert probe.smallest == pytest.approx(values[0], rel=1e-5)
    # What vanishes first are diffuse functions of carbon.
    assert probe.blame[0].kinds[0].function.element == "C"
    assert probe.blame[0].kinds[0].function.exponent < 0.2


def test_blocks_with_core_potentials_bring_their_functions(tmp_path: Path) -> None:
    iodide = "I 0 0 0; H 0 0 3.04"
    probe = _screened(tmp_path, "def2-svp.dat", iodide)
    molecule = gto.M(atom=iodide, unit="bohr", basis="def2-svp", ecp={"I": "def2-svp"}, verbose=0)
    expected = np.linalg.eigvalsh(molecule.intor("int1e_ovlp")).tolist()
    assert list(probe.values) == pytest.approx(expected, abs=1e-11)
