"""Bonded pairs of published sets, as bundled with PySCF: sound ones get no warning."""

from pathlib import Path

import pytest

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from overlapse.grammar.reading import read  # noqa: E402
from overlapse.rules.case import Case  # noqa: E402
from overlapse.rules.registry import rules  # noqa: E402

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"
CLEAN = [
    "sto-3g.dat", "pople-basis/6-31Gs.dat", "pople-basis/6-31++Gss.dat", "cc-pvdz.dat",
    "cc-pvtz.dat", "cc-pvqz.dat", "def2-svp.dat", "def2-tzvp.dat", "def2-qzvp.dat", "pc-3.dat",
    "aug-cc-pvdz.dat", "aug-cc-pvtz.dat", "aug-cc-pvqz.dat", "def2-tzvpd.dat", "def2-qzvppd.dat",
]  # fmt: skip
# Measured: titanium beside titanium, boron beside boron, a cube of hydrogen.
NOTED = ["aug-cc-pv5z.dat", "aug-pc-4.dat"]


@pytest.mark.parametrize("name", [*CLEAN, *NOTED])
def test_published_sets(name: str) -> None:
    found = Case(read(FOLDER / name)).judge(rules()["overlap.pair"])
    assert {finding.severity for finding in found} == ({"note"} if name in NOTED else set())
