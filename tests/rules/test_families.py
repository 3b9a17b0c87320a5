"""Expected compositions against the formulas of the papers, worked out by hand."""

import pytest

from overlapse.grammar.designation import parse_label
from overlapse.grammar.elements import number_of
from overlapse.grammar.model import letter_of
from overlapse.rules.families.candidates import candidates
from overlapse.rules.families.counted import expected, is_on_record, table

# T. H. Dunning 1989 (H, C), D. E. Woon and T. H. Dunning 1993 (Si), N. B. Balabanov and K. A.
# Peterson 2005 (Fe), A. K. Wilson et al. 1999 (Br), F. Weigend and R. Ahlrichs 2005, F. Jensen
# 2001; the references in full stand in the families' data files.
PUBLISHED = [
    ("cc-pVDZ", "H", "2s1p"), ("cc-pVDZ", "C", "3s2p1d"), ("cc-pVTZ", "C", "4s3p2d1f"),
    ("cc-pVQZ", "C", "5s4p3d2f1g"), ("cc-pV5Z", "C", "6s5p4d3f2g1h"),
    ("cc-pVTZ", "Si", "5s4p2d1f"), ("cc-pVTZ", "Fe", "7s6p4d2f1g"), ("cc-pVTZ", "Br", "6s5p3d1f"),
    ("aug-cc-pVTZ", "C", "5s4p3d2f"), ("jul-cc-pVTZ", "H", "3s2p1d"),
    ("jun-cc-pVTZ", "C", "5s4p3d1f"), ("maug-cc-pVTZ", "C", "5s4p2d1f"),
    ("cc-pV(T+d)Z", "S", "5s4p3d1f"), ("cc-pV(T+d)Z", "C", "4s3p2d1f"),
    ("cc-pCVTZ", "C", "6s5p3d1f"), ("cc-pwCVTZ", "C", "6s5p3d1f"),
    ("cc-pVTZ-PP", "I", "5s4p3d1f"), ("def2-SVP", "C", "3s2p1d"), ("def2-SVP", "Fe", "5s3p2d1f"),
    ("def2-TZVP", "C", "5s3p2d1f"), ("def2-TZVPP", "H", "3s2p1d"),
    ("def2-QZVP", "C", "7s4p3d2f1g"), ("def2-SV(P)", "H", "2s"),
    ("ma-def2-TZVP", "O", "6s4p2d1f"), ("pc-1", "C", "3s2p1d"), ("aug-pc-1", "C", "4s3p2d"),
    ("pcseg-2", "C", "4s3p2d1f"), ("LANL2DZ", "Fe", "3s3p2d"), ("ANO-RCC-VTZP", "O", "4s3p2d1f"),
    ("DZ (Dunning)", "C", "4s2p"),
]  # fmt: skip


@pytest.mark.parametrize(("name", "symbol", "composition"), PUBLISHED)
def test_published_compositions(name: str, symbol: str, composition: str) -> None:
    label, z = parse_label(name), number_of(symbol)
    assert label is not None and z is not None
    found = expected(label, z)
    assert found is not None
    assert "".join(f"{n}{letter_of(l)}" for l, n in found.contracted.items()) == composition


def test_irregular_elements_carry_a_reason() -> None:
    for entry in table("consistent")["exceptions"]:
        assert entry["why"]
        for name in entry["sets"]:
            assert str(parse_label(name)) == name


def test_outside_its_range_a_set_is_not_defined() -> None:
    label = parse_label("cc-pVTZ")
    assert label is not None
    assert expected(label, 19) is None
    assert expected(label, 92) is None
    unknown = parse_label("def-TZVP")
    assert unknown is not None and not is_on_record(unknown)


def test_every_table_names_its_source_and_is_reached_by_its_label() -> None:
    names = {str(label) for label in candidates()}
    for file in (
        "karlsruhe",
        "jensen",
        "atomic",
        "older",
        "effective",
        "dyall",
        "fitting",
        "borrowed",
    ):
        data = table(file)
        assert data["what"] and data["source"]
        assert set(data["sets"]) <= names
