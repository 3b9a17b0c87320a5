"""Core potentials of published sets: sound ones stay silent, slips planted in them are found."""

from pathlib import Path

import pytest

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from overlapse.grammar.reading import read, read_text  # noqa: E402
from overlapse.rules.case import Case  # noqa: E402
from overlapse.rules.finding import Finding  # noqa: E402
from overlapse.rules.labels.cores import family_core  # noqa: E402
from overlapse.rules.labels.valence import covered, innermost, likely_core  # noqa: E402
from overlapse.rules.registry import rules  # noqa: E402

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"
RULES = ["potential.core", "potential.missing", "potential.terms", "potential.channels"]
WITH_POTENTIALS = [
    "lanl2dz", "lanl08", "lanl2tz", "sbkjc", "stuttgart_dz", "stuttgart_rsc", "crenbl", "crenbs",
    "def2-svp", "def2-tzvp", "def2-tzvpp", "def2-qzvp", "def2-qzvpp", "cc-pvdz-pp", "cc-pvtz-pp",
    "cc-pvqz-pp", "cc-pv5z-pp",
]  # fmt: skip
ALL_ELECTRON = ["sto-3g", "pople-basis/6-31G", "cc-pvdz", "cc-pvtz-dk", "dzp", "ano", "sarc-dkh2"]


def _judged(text: str, label: str | None = None) -> list[Finding]:
    case = Case(read_text(text, "x"), label)
    return [finding for name in RULES for finding in case.judge(rules()[name])]


def _text(name: str) -> str:
    return (FOLDER / f"{name}.dat").read_text("latin-1")


@pytest.mark.parametrize("name", WITH_POTENTIALS)
def test_sets_with_their_potentials_stay_silent(name: str) -> None:
    assert not [f for f in _judged(_text(name)) if f.severity != "note"]


@pytest.mark.parametrize(
    ("label", "name"),
    [("LANL2DZ", "lanl2dz"), ("LANL08", "lanl08"), ("def2-SVP", "def2-svp"),
     ("cc-pVTZ-PP", "cc-pvtz-pp"), ("CRENBL", "crenbl"), ("SBKJC", "sbkjc")],
)  # fmt: skip
def test_cores_of_the_families(label: str, name: str) -> None:
    for block in read(FOLDER / f"{name}.dat").blocks:
        known = family_core(label, block.atomic_number)
        if known is not None:
            assert known.electrons == (block.potential.electrons if block.potential else 0)


@pytest.mark.parametrize("name", ALL_ELECTRON)
def test_sets_for_all_electrons_describe_the_1s_shell(name: str) -> None:
    for block in read(FOLDER / f"{name}.dat").blocks:
        if block.atomic_number > 2:
            assert 0.94 < innermost(block) < 1.0 + 1e-9, block.symbol


@pytest.mark.parametrize("name", WITH_POTENTIALS)
def test_valence_sets_do_not(name: str) -> None:
    for block in read(FOLDER / f"{name}.dat").blocks:
        if block.potential is not None and block.potential.electrons > 2:
            assert innermost(block) < 0.92, block.symbol


def test_the_core_that_is_meant_is_told_by_the_functions() -> None:
    right = wrong = 0
    for name in ("lanl2dz", "sbkjc", "crenbs", "stuttgart_rsc", "def2-svp", "cc-pvdz-pp"):
        for block in read(FOLDER / f"{name}.dat").blocks:
            if block.potential is not None and block.shells:
                right += likely_core(block) == block.potential.electrons
                wrong += likely_core(block) != block.potential.electrons
    assert right >= 0.98 * (right + wrong)


def test_a_slater_function_is_covered_by_a_fine_set() -> None:
    carbon = next(b for b in read(FOLDER / "cc-pvqz.dat").blocks if b.symbol == "C")
    assert covered(carbon, (2, 1), 1.6) > 0.999
    assert covered(carbon, (4, 3), 1.6) < 0.98
    assert covered(carbon, (7, 6), 1.6) == 0.0


# Slips planted in a sound file.


def _one(text: str, rule: str, element: str) -> Finding:
    (finding,) = [f for f in _judged(text) if f.severity != "note"]
    assert (finding.rule, finding.element) == (rule, element)
    return finding


@pytest.mark.parametrize(
    ("element", "right", "wrong"),
    [("Na", 10, 24), ("Na", 10, 12), ("Fe", 10, 18), ("Br", 28, 18), ("Rh", 28, 82), ("Na", 10, 9)],
)
def test_a_wrong_number_of_electrons(element: str, right: int, wrong: int) -> None:
    text = _text("lanl2dz")
    line = f"{element} nelec {right}"
    assert line in text
    finding = _one(text.replace(line, f"{element} nelec {wrong}"), "potential.core", element)
    assert finding.measured == wrong
    if wrong < 82:
        assert finding.expected == right


def test_the_family_tells_the_core() -> None:
    text = _text("cc-pvdz-pp").replace("Cu nelec 10", "Cu nelec 18")
    (finding,) = _judged(text, "cc-pVDZ-PP")
    assert finding.rule == "potential.core" and finding.expected == 10
    assert "the label you gave" in finding.message


def _without(text: str, element: str) -> str:
    """A file without the lines of one element's potential."""
    at = text.upper().index("\nECP")
    lines = text[at:].split("\n")
    kept, skipping = [], False
    for line in lines:
        words = line.split()
        if words and words[0].isalpha() and len(words) > 1:
            skipping = words[0].lower() == element.lower()
        if not skipping or (words and words[0].upper() == "END"):
            kept.append(line)
    return text[:at] + "\n".join(kept)


def test_a_lost_potential() -> None:
    finding = _one(_without(_text("lanl2dz"), "Ag"), "potential.missing", "Ag")
    assert finding.expected == 28
    assert "others" not in finding.message and "have theirs" in finding.message


def test_all_potentials_lost_is_one_note() -> None:
    text = _text("lanl2dz")
    (finding,) = _judged(text[: text.upper().index("\nECP")])
    assert (finding.rule, finding.severity, finding.element) == ("potential.missing", "note", "Na")
    assert "Na 10, Mg 10" in finding.message


def test_functions_for_all_electrons_beside_a_potential() -> None:
    whole, valence = _text("pople-basis/6-31G"), _text("lanl2dz")
    text = whole + valence[valence.upper().index("\nECP") :]
    found = [f for f in _judged(text) if f.rule == "potential.missing"]
    assert found and found[0].severity == "warning"
    assert "a set for all electrons beside a core potential" in found[0].message


def _replaced(element: str, old: str, new: str) -> str:
    text = _text("lanl2dz")
    at = text.index(f"{element} nelec")
    return text[:at] + text[at:].replace(old, new, 1)


def test_a_negative_exponent() -> None:
    block = next(b for b in read(FOLDER / "lanl2dz.dat").blocks if b.symbol == "Fe")
    assert block.potential is not None
    channel = block.potential.channels[0]
    lines = _text("lanl2dz").split("\n")
    row = lines[channel.line].split()
    lines[channel.line] = lines[channel.line].replace(row[1], f"-{row[1]}")
    finding = _one("\n".join(lines), "potential.terms", "Fe")
    assert finding.severity == "error" and finding.measured == -float(row[1])


def test_a_term_pasted_twice() -> None:
    block = next(b for b in read(FOLDER / "lanl2dz.dat").blocks if b.symbol == "Fe")
    assert block.potential is not None
    lines = _text("lanl2dz").split("\n")
    at = block.potential.channels[0].line
    lines.insert(at, lines[at])
    assert "counts double" in _one("\n".join(lines), "potential.terms", "Fe").message


@pytest.mark.parametrize(("letter", "says"), [("S", "lacks the s part"), ("P", "projected on")])
def test_a_lost_channel(letter: str, says: str) -> None:
    block = next(b for b in read(FOLDER / "lanl2dz.dat").blocks if b.symbol == "Fe")
    assert block.potential is not None
    channel = next(c for c in block.potential.channels if not c.local and c.l == "SP".index(letter))
    lines = _text("lanl2dz").split("\n")
    del lines[channel.line - 1 : channel.line + len(channel.powers)]
    finding = _one("\n".join(lines), "potential.channels", "Fe")
    assert says in finding.message


def test_a_local_part_that_is_lost() -> None:
    block = next(b for b in read(FOLDER / "lanl2dz.dat").blocks if b.symbol == "Fe")
    assert block.potential is not None
    (channel,) = [c for c in block.potential.channels if c.local]
    lines = _text("lanl2dz").split("\n")
    del lines[channel.line - 1 : channel.line + len(channel.powers)]
    assert _one("\n".join(lines), "potential.channels", "Fe").severity == "error"


# Known defects of published files.


def test_lanthanides_whose_potentials_are_not_stored() -> None:
    (finding,) = [f for f in _judged(_text("ma-def2-svp")) if f.severity != "note"]
    assert (finding.rule, finding.element) == ("potential.missing", "Ce")
    assert "14 of 86 elements" in finding.message and "Ce 28" in finding.message


def test_potassium_with_terms_given_twice() -> None:
    found = _judged(_text("soecp/ECPDS10MDFSO"))
    assert {(f.rule, f.element) for f in found} == {("potential.terms", "K")}
