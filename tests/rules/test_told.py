"""What suspicions tell and whom they spare: numbers and limits are of one kind, and no set is
judged as what it does not claim to be."""

import warnings
from pathlib import Path

from overlapse.grammar.model import BasisSet, Block, Document, Shell
from overlapse.grammar.reading import read_bytes, read_text
from overlapse.grammar.source import Source
from overlapse.lint.demonstration import copy_to
from overlapse.rules.case import Case
from overlapse.rules.registry import rules


def test_a_number_off_its_row_lies_beyond_the_limit_told(tmp_path: Path) -> None:
    copy_to(tmp_path)
    document = read_bytes((tmp_path / "beck" / "alder.basis").read_bytes(), "alder.basis")
    (finding,) = Case(document).judge(rules()["primitive.trend"])
    assert finding.measured == 4.843
    assert isinstance(finding.limit, float) and isinstance(finding.expected, float)
    assert finding.expected < finding.limit < 1.1 * finding.expected < finding.measured


def test_an_odd_gap_lies_beyond_the_limit_told() -> None:
    def block(z: int) -> Block:
        exponents = [0.9 * z**2 * 3.2**-k for k in range(5)]
        if z == 7:
            exponents[-1] /= 40.0
        return Block(z, (Shell((0,), exponents, [[0.4]] * 5),))

    document = Document(Source("N\n"), "stars", (BasisSet(tuple(map(block, range(3, 11)))),))
    (finding,) = Case(document).judge(rules()["primitive.gap"])
    assert isinstance(finding.measured, float) and isinstance(finding.limit, float)
    assert 3.2 < finding.limit < finding.measured


SHELLS = (
    ("S", (72.4, 13.2, 3.6), (0.154, 0.535, 0.445)),
    ("S", (0.9,), (1.0,)),
    ("S", (0.2,), (1.0,)),
    ("P", (0.7,), (1.0,)),
    ("P", (0.18,), (1.0,)),
)


def _set(*elements: tuple[str, float]) -> Document:
    """Elements in shells like carbon's, each scaled by a factor."""
    lines = []
    for symbol, scale in elements:
        lines.append(f"{symbol} 0")
        for letter, exponents, coefficients in SHELLS:
            lines.append(f"{letter} {len(exponents)} 1.00")
            lines += [
                f"  {scale * e:.6f} {c}" for e, c in zip(exponents, coefficients, strict=True)
            ]
        lines.append("****")
    return read_text("\n".join([*lines, ""]), "own.basis")


ROW = (("B", 0.67), ("C", 1.0), ("N", 1.4), ("O", 1.86), ("F", 2.4))


def test_atoms_of_a_fitting_set_are_not_computed() -> None:
    tight = _set(*((symbol, 30.0 * scale) for symbol, scale in ROW))
    assert Case(tight, "def2-SVP", energies=True).judge(rules()["energy.bound"])
    assert not Case(tight, "def2-SVP-RI", energies=True).judge(rules()["energy.bound"])


def test_an_element_given_twice_is_no_failure_of_its_neighbours() -> None:
    document = _set(*ROW, ("N", 1.41))
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        Case(document, energies=True).judge(rules()["energy.stationary"])
