"""Published sets against their parents, and wrong digits in them, on the files of PySCF."""

import random
import re
from pathlib import Path

import pytest

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from overlapse.grammar.layouts import layouts  # noqa: E402
from overlapse.grammar.reading import read, read_text  # noqa: E402
from overlapse.lint.engine import Options, Target, audited  # noqa: E402
from overlapse.lint.neighbours import Beside  # noqa: E402
from overlapse.lint.settings import Settings  # noqa: E402
from overlapse.rules.compare.relation import Relation, relate_documents  # noqa: E402
from overlapse.rules.finding import Finding  # noqa: E402

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"


def lacking(names: list[str], judged: str) -> list[Finding]:
    """What containment finds in one file beside others."""
    options = Options(settings=Settings(), beside=Beside([FOLDER / name for name in names]))
    found = audited(Target(FOLDER / judged, False), options).findings
    return [finding for finding in found if finding.rule == "label.contains"]


POPLE = [
    f"pople-basis/{name}.dat"
    for name in (
        "6-31G 6-31Gs 6-31Gss 6-31+G 6-31+Gs 6-31+Gss 6-31++G 6-31++Gs 6-31++Gss "
        "6-311G 6-311Gs 6-311Gss 6-311+G 6-311+Gs 6-311+Gss 6-311++G 6-311++Gs 6-311++Gss"
    ).split()
]
DUNNING = [
    f"{prefix}cc-pv{x}z.dat" for x in "dtq5" for prefix in ("", "aug-") if x != "5" or not prefix
]
JENSEN = ["pc-1.dat", "pc-2.dat", "aug-pc-1.dat", "aug-pc-2.dat"]
KARLSRUHE = [f"def2-{name}.dat" for name in "svp svpd tzvp tzvpd tzvpp tzvppd qzvp qzvpp".split()]


@pytest.mark.parametrize("family", [POPLE, DUNNING, JENSEN, KARLSRUHE])
def test_decorated_sets_contain_their_parents(family: list[str]) -> None:
    names = [name for name in family if (FOLDER / name).exists()]
    assert len(names) >= len(family) - 2
    for name in names:
        assert not lacking(names, name), name


# Defects that only the parent shows.


def test_manganese_has_lost_its_f_functions() -> None:
    (finding,) = lacking(["def2-qzvp.dat", "def2-qzvpd.dat"], "def2-qzvpd.dat")
    assert (finding.element, finding.measured) == ("Mn", 3)
    assert "3 functions of def2-QZVP, which def2-QZVPD contains: f-1, f-2, f-3" in finding.message


def test_a_minimally_augmented_set_is_made_of_a_smaller_one() -> None:
    (finding,) = lacking(["def2-svp.dat", "ma-def2-svp.dat"], "ma-def2-svp.dat")
    assert finding.element == "H"
    assert "the same holds for Sc, Ti, V" in finding.message


def test_an_exponent_of_iridium_has_another_first_digit() -> None:
    names = ["ccecp-basis/ccECP/ccECP_cc-pVQZ.dat", "ccecp-basis/ccECP/ccECP_aug-cc-pVQZ.dat"]
    (finding,) = [f for f in lacking(names, names[1]) if f.element == "Ir"]
    assert finding.expected == 1.577106
    assert "exponent 0.577106 here, 1.577106 there" in finding.message


# Slips planted in sound sets.

NUMBER = re.compile(r"(?<=\s)-?\d*\.\d+(?:[EeDd][+-]?\d+)?")


def _relations(one: str, other: str) -> list[Relation]:
    left, right = (read_text(text, layout="keyworded") for text in (one, other))
    return [r for _, _, found in relate_documents(left, right) for r in found]


@pytest.mark.parametrize(
    "name", ["cc-pvdz.dat", "def2-tzvp.dat", "sto-3g.dat", "pople-basis/6-31Gs.dat", "pc-2.dat"]
)
def test_the_last_digit_of_a_published_number_is_found_and_placed(name: str) -> None:
    text = (FOLDER / name).read_text()
    places = [
        match
        for match in NUMBER.finditer(text)
        if "#" not in text[text.rfind("\n", 0, match.start()) : match.start()]
        # A lone coefficient, or one that is zero where the primitive stands alone, is no shape.
        and float(match[0].upper().replace("D", "E")) not in (0.0, 1.0)
    ]
    for match in random.Random(17).sample(places, 12):
        mantissa = re.split("[EeDd]", match[0])[0]
        digit = str((int(mantissa[-1]) + 1) % 10)
        word = mantissa[:-1] + digit + match[0][len(mantissa) :]
        changed = text[: match.start()] + word + text[match.end() :]
        (found,) = [r for r in _relations(text, changed) if not r.verdict.startswith("equal t")]
        assert found.verdict == "different", match[0]
        assert found.first is not None and found.first.left is not None
        line = text.count("\n", 0, match.start()) + 1
        column = match.start() - text.rfind("\n", 0, match.start())
        assert (found.first.left.line, found.first.left.column) == (line, column)


@pytest.mark.parametrize("name", sorted(layouts()))
def test_a_published_set_has_equal_numbers_in_every_layout(name: str) -> None:
    document = read(FOLDER / "cc-pvdz.dat")
    again = read_text(layouts()[name].write(document).text, layout=name)
    (pair,) = relate_documents(document, again)
    assert {relation.verdict for relation in pair[2]} <= {"equal numbers", "equal text"}
    assert len(pair[2]) == 35
