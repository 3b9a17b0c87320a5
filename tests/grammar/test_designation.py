"""Labels are taken apart whatever their spelling, and printed back in the usual form."""

import pytest

from overlapse.grammar.designation import label_in_file_name, label_in_words, parse_label

SPELLINGS = {
    "6-31G*": "6-31gs 6-31g_st_ 631g* 631gs",
    "6-31G(d)": "6-31g_d_ 6-31gd 6-31G(d)",
    "6-31G**": "6-31gss 6-31g_st__st_ 631gss",
    "6-31+G*": "6-31pgs 631+g* 6-31+gs",
    "6-31++G(d,p)": "6-31ppg_d_p_ 6-31++G(d,p)",
    "6-311++G(3df,3pd)": "6-311++g3df_3pd 6-311ppg_3df_3pd_ 6311++g(3df,3pd)",
    "6-31G(d,3p)": "6-31G(d,3p)",
    "3-21G*": "3-21gs 3-21G(*) 321g*",
    "STO-3G": "sto-3g sto3g",
    "aug-cc-pVDZ": "AUG-cc-pVDZ augccpvdz AVDZ aVDZ",
    "cc-pV(T+d)Z": "cc-pvt+dz cc-pv_tpd_z ccpv(t+d)z",
    "cc-pVTZ-DK": "ccpvtzdk ccpvtzdkh",
    "jul-cc-pVTZ": "jul-cc-pVTZ heavy-aug-cc-pVTZ",
    "jun-cc-pVDZ": "jun-cc-pvdz aug-cc-pVDZ'",
    "d-aug-cc-pwCVTZ": "d-aug-cc-pwcvtz DAUG-CC-PWCVTZ",
    "aug-cc-pVQZ-PP-OptRI": "aug-cc-pVQZ-PP_OPTRI",
    "cc-pVTZ-RI": "cc-pvtz_mp2fit cc-pvtz-ri",
    "def2-SV(P)": "def2-sv_p_ def2svp_ def2-SV(P)",
    "def2-SVP": "def2svp Def2-SVP",
    "ma-def2-TZVPP": "ma-def2-tzvpp",
    "def2-mTZVPP": "def2-mtzvpp",
    "def2-universal-JFIT": "def2-universal-jfit weigend",
    "x2c-TZVPPall-2c": "x2c-tzvppall-2c",
    "pcseg-1": "pcseg1 pc-seg-1",
    "pc-1": "pc-1 pc1",
    "aug-pcX-4": "AUG-PCX-4",
    "ANO-RCC": "ano-rcc anorcc ano",
    "LANL2DZ": "lanl2dz",
    "MIDI!": "midi! midix",
    "3ZaPa-NR": "3zapa-nr",
    "dyall-v3z": "dyall_v3z dyall.v3z",
}


@pytest.mark.parametrize("usual", SPELLINGS)
def test_every_spelling_is_printed_in_the_usual_form(usual: str) -> None:
    for spelling in SPELLINGS[usual].split():
        label = parse_label(spelling)
        assert str(label) == usual, spelling
        assert parse_label(str(label)) == label


@pytest.mark.parametrize("word", ["6-31G(d')", "hydrogen", "define", "anomaly", "pc", "def2-ecp"])
def test_other_sets_and_other_words_are_not_mistaken(word: str) -> None:
    assert parse_label(word) is None


def test_sets_that_differ_in_little_stay_apart() -> None:
    names = ["def2-SVP", "def2-SV(P)", "def-SVP", "pc-1", "pcseg-1", "cc-pVTZ-PP", "cc-pVTZ-NR-PP"]
    assert len({parse_label(name) for name in names}) == len(names)


@pytest.mark.parametrize("name", ["DZP", "SVP", "TZVP", "Stuttgart", "MIDI"])
def test_a_name_of_several_sets_says_so(name: str) -> None:
    label = parse_label(name)
    assert label is not None
    assert label.family == "ambiguous"
    assert len(label.readings) > 1


def test_the_parts_of_a_label() -> None:
    label = parse_label("aug-cc-pwCV(Q+d)Z-DK")
    assert label is not None
    assert (label.family, label.zeta, label.augmentation) == ("cc-pVXZ", 4, "aug")
    assert (label.core_valence, label.tight, label.relativity) == ("wC", True, "DK")
    assert label.role == "orbital"
    assert str(label.parent) == "cc-pVQZ-DK"
    fitted = parse_label("def2-universal-jkfit")
    assert fitted is not None and fitted.role == "fitting"
    jensen = parse_label("aug-pc-2")
    assert jensen is not None and jensen.zeta == 3


def test_files_are_not_called_by_chance() -> None:
    assert label_in_file_name("aug-cc-pvtz.dat") == "aug-cc-pvtz"
    assert label_in_file_name("mini.txt") is None
    assert label_in_file_name("dz.txt") is None


def test_a_line_of_words_begins_with_a_label() -> None:
    assert label_in_words("DZ (Dunning)  of some date".split()) == "DZ (Dunning)"
    assert label_in_words("LANL2DZ ECP  of some date".split()) == "LANL2DZ ECP"
    assert label_in_words("made by hand".split()) is None
