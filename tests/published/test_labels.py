"""Published sets under their own label and under each other's; their known defects."""

from dataclasses import replace
from itertools import product
from pathlib import Path

import pytest

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from overlapse.grammar.model import Document  # noqa: E402
from overlapse.grammar.reading import read  # noqa: E402
from overlapse.lint.engine import Target, audit_file  # noqa: E402
from overlapse.lint.settings import Settings  # noqa: E402
from overlapse.rules.case import Case  # noqa: E402
from overlapse.rules.finding import Finding  # noqa: E402
from overlapse.rules.labels.composition import lengths_of, primitives  # noqa: E402
from overlapse.rules.registry import rules  # noqa: E402

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"
JUDGING = ("label.", "shell.polarization", "shell.diffuse")
H_C_N_O_SI_S_FE = {1, 6, 7, 8, 14, 16, 26}

CLASSES = {
    "minimal": "sto-3g sto-6g",
    "split valence": "pople-basis/3-21G pople-basis/4-31G pople-basis/6-31G pople-basis/6-31Gs "
    "pople-basis/6-31Gss pople-basis/6-31+Gs pople-basis/6-311G pople-basis/6-311++Gs",
    "correlation consistent": "cc-pvdz cc-pvtz cc-pvqz aug-cc-pvdz aug-cc-pvtz cc-pwCVDZ cc-pwCVTZ "
    "aug-cc-pwcvtz",
    "def2": "def2-svp def2-svpd def2-tzvp def2-tzvpp def2-qzvp def2-qzvpp ma-def2-tzvp",
    "polarization consistent": "pc-0 pc-1 pc-2 pcseg-1 pcseg-2 aug-pc-1 aug-pcseg-1",
    "plain names": "tzv qzp dzvp2 adzp atzp roos-dz roos-tz ano",
    "core potentials": "lanl2dz lanl08 lanl2tz stuttgart_dz stuttgart_rsc sbkjc",
}


def _of_seven(name: str) -> Document:
    """A set without its comments and headings, for seven elements."""
    document = read(FOLDER / f"{name}.dat")
    kept = (
        replace(
            members,
            blocks=tuple(b for b in members.blocks if b.atomic_number in H_C_N_O_SI_S_FE),
            label=None,
        )
        for members in document.sets
    )
    return replace(document, sets=tuple(kept), remarks=())


def _loud(document: Document, label: str) -> list[Finding]:
    case = Case(document, label)
    chosen = [rule for name, rule in rules().items() if name.startswith(JUDGING)]
    return [f for rule in chosen for f in case.judge(rule) if f.severity != "note"]


def _contents(document: Document) -> dict[int, object]:
    return {b.atomic_number: (lengths_of(b), primitives(b)[0]) for b in document.blocks}


@pytest.mark.parametrize("kind", CLASSES)
def test_every_wrong_label_of_a_class_is_caught_and_no_right_one(kind: str) -> None:
    names = CLASSES[kind].split()
    documents = {name: _of_seven(name) for name in names}
    contents = {name: _contents(document) for name, document in documents.items()}
    for name, other in product(names, names):
        found = _loud(documents[name], other.rsplit("/")[-1])
        if name == other:
            assert not found, found[0].message
            continue
        common = contents[name].keys() & contents[other].keys()
        if any(contents[name][z] != contents[other][z] for z in common):
            assert found, f"{name} passed as {other}"


def _audited(name: str) -> list[Finding]:
    found = audit_file(Target(FOLDER / name, False), settings=Settings()).findings
    return [f for f in found if f.rule.startswith(JUDGING) and f.severity != "note"]


# Content that contradicts the label, in the files as they are passed on.
DEFECTS = [
    ("ma-def2-svp.dat", "label.family", "H", "ma-def2-SV(P)"),
    ("def2-qzvpd.dat", "shell.polarization", "Mn", "3 f functions are missing"),
    ("def2-qzvppd.dat", "label.family", "Mn", "3 f functions are missing"),
    ("def2-qzvp-ri.dat", "label.family", "Ca", "12 s functions are too many"),
    ("cc-pCV5Z.dat", "label.family", "Ca", "4 d functions are missing"),
    ("pople-basis/3-21++G.dat", "shell.diffuse", "Sc", "they equal 3-21G"),
    ("pople-basis/6-31++G.dat", "shell.diffuse", "Sc", "they equal 6-31G"),
    ("pople-basis/6-31++Gss.dat", "shell.diffuse", "Sc", "they equal 6-31G**"),
    ("pople-basis/6-311++Gss.dat", "shell.diffuse", "Ga", "they equal 6-311G**"),
    ("aug-cc-pwcv5z-dk.dat", "shell.diffuse", "Fe", "1 i function is missing"),
]


@pytest.mark.parametrize(("name", "rule", "element", "words"), DEFECTS)
def test_a_known_defect_is_reported(name: str, rule: str, element: str, words: str) -> None:
    assert [(f.rule, f.element) for f in _audited(name)] == [(rule, element)]
    assert words in _audited(name)[0].message


# Irregular, but as published.
@pytest.mark.parametrize(
    "name",
    [
        "pople-basis/4-31G.dat", "pople-basis/6-311G.dat", "pople-basis/6-31Gs.dat", "def2-svp.dat",
        "def2-tzvp.dat", "cc-pCV6Z.dat", "cc-pwCV5Z.dat", "cc-pwCV5Z-PP.dat", "def2-mtzvp.dat",
        "def2-mtzvpp.dat", "lanl2dz.dat", "aug-pc-0.dat", "cc-pCVDZ.dat", "aug-cc-pVDZ-PP.dat",
    ],
)  # fmt: skip
def test_an_irregular_but_legitimate_set_is_silent(name: str) -> None:
    assert not [f for f in _audited(name) if f.rule != "label.composition"]
