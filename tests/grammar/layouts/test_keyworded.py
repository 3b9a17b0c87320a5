"""Layout `keyworded`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.reading import read_text

SOUND = """\
# an invented set
basis "C_hill" SPHERICAL
#BASIS SET: (4s,2p) -> [3s,1p]
C    S
     40.0D0    0.15    -0.04
      7.0      .53     -0.11
      2.1      +0.44    0.20   # the loosest
C    SP
      0.3     1.0      1.0
end
basis "Hg_hill"
Hg s
  1.2 1.0
END
ecp
Hg nelec 60
Hg ul
2 1.0 0.0
Hg S
2 3.0 15.0 -2.0
0 4.0 -1.5 1.0
end
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "keyworded"
    assert not document.faults
    (members,) = document.sets
    assert members.label == "hill"
    carbon, mercury = document.blocks
    assert (carbon.functions, mercury.functions) == ("spherical", None)
    assert carbon.names == ("s-1", "sp-1")
    first = carbon.shells[0]
    assert first.coefficients.tolist() == [[0.15, -0.04], [0.53, -0.11], [0.44, 0.2]]
    assert first.spelling(0) == "40.0D0"
    assert first.spelling(2, 0) == "+0.44"
    assert first.place(2, 1) == (7, 25)
    assert mercury.potential is not None
    assert mercury.potential.electrons == 60
    assert [(c.l, c.local, c.kind) for c in mercury.potential.channels] == [
        (1, True, "scalar"),
        (0, False, "scalar"),
        (0, False, "spin-orbit"),
    ]
    assert mercury.potential.channels[2].coefficients.tolist() == [-2.0, 1.0]


def test_shells_without_any_section() -> None:
    document = read_text("C S\n 4.0 0.6\n 0.5 0.5\nN s\n 6.0 1.0\n")
    assert document.layout == "keyworded"
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C", "N"]


def test_one_section_for_the_whole_set() -> None:
    document = read_text('BASIS "ao basis" PRINT\nC S\n 4.0 1.0\nN S\n 6.0 1.0\nEND\n')
    (members,) = document.sets
    assert (members.label, members.role) == (None, "orbital")


def test_sections_of_different_names_are_different_sets() -> None:
    text = "".join(f'basis "{name}"\nC S\n 4.0 1.0\nend\n' for name in ("C_hill", "C_dale"))
    assert [members.label for members in read_text(text).sets] == ["hill", "dale"]


def test_a_reference_to_other_data_is_a_note() -> None:
    text = 'basis "C_hill"\nC S\n 4.0 1.0\nASSOCIATED_ECP "dale"\nN library "dale"\nend\n'
    faults = read_text(text).faults
    assert [(fault.rule, fault.severity) for fault in faults] == [("form.syntax", "note")] * 2


OPEN, CLOSE = 'basis "x"\n', "end\n"
BROKEN = {
    "no rows": (f"{OPEN}⟦C S\nC P\n 1.0 1.0\n{CLOSE}", ["form.count"]),
    "a coefficient is lost": (f"{OPEN}C S\n 4.0 0.6\n ⟦0.5\n 0.1 0.2\n{CLOSE}", ["form.count"]),
    "a number too many": (f"{OPEN}C S\n 4.0 0.6\n 0.5 0.5 ⟦0.1\n 0.1 0.2\n{CLOSE}", ["form.count"]),
    "the p column is lost": (f"{OPEN}C SP\n 4.0 ⟦0.6\n{CLOSE}", ["form.count"]),
    "exponents alone": (f"{OPEN}C S\n ⟦4.0\n 0.5\n{CLOSE}", ["form.count"]),
    "letter O": (f"{OPEN}C S\n 4.0 ⟦O.6\n 0.5 0.5\n{CLOSE}", ["form.number"]),
    "letter O leads": (f"{OPEN}C S\n 4.0 0.6\n ⟦O.5 0.5\n{CLOSE}", ["form.number"]),
    "letter l": (f"{OPEN}C S\n 4.0 0.6\n ⟦l.5 0.5\n{CLOSE}", ["form.number"]),
    "decimal comma": (f"{OPEN}C S\n 4.0 0.6\n ⟦0,5 0.5\n{CLOSE}", ["form.number"]),
    "lost exponent letter": (f"{OPEN}C S\n 4.0 ⟦1.5-03\n 0.5 0.5\n{CLOSE}", ["form.number"]),
    "overflowed field": (f"{OPEN}C S\n ⟦******* 0.6\n 0.5 0.5\n{CLOSE}", ["form.number"]),
    "text after the numbers": (f"⟦{OPEN}C S\n 4.0 0.6\n 0.5 ⟦0.5END\n",
                               ["form.syntax", "form.number"]),
    "unknown element": (f"{OPEN}⟦Cx S\n 4.0 1.0\n{CLOSE}", ["form.element"]),
    "unknown letter": (f"{OPEN}C ⟦X\n 4.0 1.0\n{CLOSE}", ["form.letter"]),
    "prose in a section": (f"{OPEN}C S\n 4.0 1.0\n⟦see below for more\n{CLOSE}", ["form.syntax"]),
    "rows without heading": (f"{OPEN}⟦4.0 1.0\nC S\n 4.0 1.0\n{CLOSE}", ["form.syntax"]),
    "section not closed": ('⟦basis "x"\nC S\n 4.0 1.0\nbasis "y"\nC S\n 4.0 1.0\nend\n',
                           ["form.syntax"]),
    "element given twice": (f"{OPEN}C S\n 1.0 1.0\nN S\n 1.0 1.0\n⟦C S\n 2.0 1.0\n{CLOSE}",
                            ["form.repeat"]),
    "electrons are no number": ("ecp\nHg nelec ⟦6O\nHg ul\n2 1.0 0.0\nend\n", ["form.number"]),
    "electrons are missing": ("ecp\n⟦Hg ul\n2 1.0 0.0\nend\n", ["form.syntax"]),
    "a term's number is lost": ("ecp\nHg nelec 60\nHg ul\n⟦2 1.0\nend\n", ["form.count"]),
    "a potential outside its section": ("⟦Hg nelec 60\nC S\n 1.0 1.0\n", ["form.syntax"]),
    "a potential in a basis section": (f"{OPEN}C S\n 1.0 1.0\n⟦C nelec 2\n{CLOSE}",
                                       ["form.syntax"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("keyworded", *BROKEN[slip])


def test_many_faults_are_as_many_findings() -> None:
    chosen = [slip for slip in BROKEN if BROKEN[slip][0].startswith(OPEN)][:14]
    symbols = iter("H He Li Be B C N O F Ne Na Mg Al Si P S".split())
    marked = ""
    for slip in chosen:
        symbol = next(symbols)
        piece = BROKEN[slip][0].replace(OPEN, "").replace(CLOSE, "")
        marked += (
            piece.replace("C S", f"{symbol} S")
            .replace("C P", f"{symbol} P")
            .replace("C SP", f"{symbol} SP")
            .replace("C ⟦X", f"{symbol} ⟦X")
        )
    rules = [rule for slip in chosen for rule in BROKEN[slip][1]]
    broken.check("keyworded", OPEN + marked + CLOSE, rules)
