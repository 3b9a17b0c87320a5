"""Layout `datagroup`: what is read, and where faults are found."""

import broken
import pytest
from generated import content, documents
from hypothesis import HealthCheck, given, settings

from overlapse.grammar.layouts.datagroup import LAYOUT
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_text

SOUND = """\
 $OTHER  first=1
   second=2 $END
 $DATA
invented molecule
CNV  2

 C1  6.0  0.0 0.0 0.0
  S   3
    1    40.0    0.15
    2     7.0D0  .53
    3     2.1    +0.44
  L   1
    1     0.3    1.0    1.0
  D   1   2.0   ! sharper
    1     0.2    1.0

 HG  80.0  0.0 0.0 4.0
  S   1
    1     1.2    1.0

 C2  6.0  0.0 0.0 8.0
  S   3
    1    40.0    0.15
    2     7.0    0.53
    3     2.1    0.44
  L   1
    1     0.3    1.0    1.0
  D   1   2.0
    1     0.2    1.0

 $END
 $OTHER
 1  1 1.86482786E-01 2.83671749E-01
 $END
 $ECP
 C1-ECP NONE
 HG-ECP GEN  60  1
  1   ----- p potential -----
    0.5     2    1.0
  2   ----- s-p potential -----
   15.0     2    3.0
   -1.5     0    4.0
 C2-ECP NONE
 $END
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "datagroup"
    assert not document.faults
    carbon, mercury = document.blocks
    assert carbon.names == ("s-1", "sp-1", "d-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1]
    assert carbon.shells[0].coefficients.tolist() == [[0.15], [0.53], [0.44]]
    assert carbon.shells[0].spelling(1) == "7.0D0"
    assert carbon.shells[0].place(2, 0) == (11, 18)
    assert carbon.shells[1].spelling(0, 1) == "1.0"
    assert carbon.shells[1].place(0, 1) == (13, 25)
    # A scale factor multiplies exponents by its square.
    assert carbon.shells[2].exponents.tolist() == [0.8]
    assert carbon.shells[2].spellings() == (["0.8"], [["1.0"]])
    assert (carbon.line, carbon.end, mercury.line) == (7, 15, 17)
    assert [r.text for r in document.remarks] == ["sharper", "invented molecule"]


def test_a_core_potential() -> None:
    carbon, mercury = read_text(SOUND).blocks
    assert carbon.potential is None
    assert mercury.potential is not None
    assert mercury.potential.electrons == 60
    assert [(c.title, c.l, c.local, c.powers) for c in mercury.potential.channels] == [
        ("p potential", 1, True, (2,)),
        ("s-p potential", 0, False, (2, 0)),
    ]
    assert mercury.potential.channels[1].exponents.tolist() == [3.0, 4.0]
    assert mercury.potential.channels[1].coefficients.tolist() == [15.0, -1.5]


def test_a_potential_may_be_repeated_by_its_name_or_found_by_its_place() -> None:
    ecp = SOUND[SOUND.index("  1   ----- p") : SOUND.index(" C2-ECP")]
    text = SOUND.replace(" C2-ECP NONE", " HG-ECP GEN  60  1")
    assert not read_text(text).faults
    text = SOUND.replace("HG-ECP", "1-ECP")
    document = read_text(text)
    assert not document.faults
    assert document.blocks[1].potential is not None
    text = SOUND.replace(" C2-ECP NONE\n", " HG-ECP GEN  60  1\n" + ecp.replace("15.0", "16.0"))
    assert [fault.rule for fault in read_text(text).faults] == ["form.repeat"]


def test_line_ends_and_letter_case_do_not_matter() -> None:
    plain = read_text(SOUND)
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r"), SOUND.lower()):
        again = read_text(other)
        assert again.layout == "datagroup"
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert content(again) == content(plain)
        assert again.blocks[0].shells[0].place(2, 0) == (11, 18)


ATOM = " C   6.0  0.0 0.0 {}.0\n  S   1\n    1   {}   1.0\n\n"
MOLECULE = " $DATA\ntitle\nC1\n{} $END\n"


def test_atoms_that_repeat_their_element_are_one_block() -> None:
    document = read_text(MOLECULE.format(ATOM.format(0, 4.0) + ATOM.format(9, "4.00")))
    assert not document.faults
    assert len(document.blocks) == 1


def test_an_element_with_two_bases_is_a_finding() -> None:
    atoms = [ATOM.format(0, 4.0), ATOM.format(3, 5.0), ATOM.format(6, 5.0)]
    document = read_text(MOLECULE.format("".join(atoms)))
    assert [(f.rule, f.severity) for f in document.faults] == [("form.repeat", "warning")]
    assert document.source.place(document.faults[0].span[0]) == (8, 2)
    assert len(document.blocks) == 2


def test_a_slip_in_one_of_two_atoms_does_not_make_them_differ() -> None:
    atoms = ATOM.format(0, 4.0) + ATOM.format(9, "4.0.0")
    document = read_text(MOLECULE.format(atoms))
    assert [fault.rule for fault in document.faults] == ["form.number"]
    assert [block.complete for block in document.blocks] == [True]


def test_a_card_for_a_built_in_set_is_a_note_for_each_element() -> None:
    card = " O {}  8.0  0.0 0.0 {}.0\n   N31     6\n  D   1\n    1   0.8   1.0\n\n"
    text = MOLECULE.format(
        card.replace(" {}", "", 1).format(0) + card.replace(" {}", "", 1).format(9)
    )
    document = read_text(text)
    assert [(f.rule, f.severity) for f in document.faults] == [("form.syntax", "note")]
    oxygen = document.blocks[0]
    assert (oxygen.names, oxygen.complete) == (("d-1",), False)


def test_a_potential_known_by_name_is_a_note() -> None:
    text = MOLECULE.format(ATOM.format(0, 4.0)) + " $ECP\n C-ECP SMALL\n $END\n"
    document = read_text(text)
    assert [fault.severity for fault in document.faults] == ["note"]
    assert not document.blocks[0].complete


def test_atoms_without_any_basis_are_a_note() -> None:
    document = read_text(MOLECULE.format(" C 6.0 0 0 0\n\n H 1.0 0 0 1.0\n\n"))
    assert [fault.severity for fault in document.faults] == ["note"]


def test_names_are_free_and_ghosts_have_a_negative_charge() -> None:
    atoms = ATOM.replace(" C ", " CA").format(0, 4.0) + ATOM.replace("6.0", "-6.0").format(9, 4.0)
    document = read_text(MOLECULE.format(atoms))
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C"]


def test_letters_above_i_are_a_note() -> None:
    atom = ATOM.format(0, 4.0).replace("S ", "K ")
    document = read_text(MOLECULE.format(atom))
    assert [(f.rule, f.severity) for f in document.faults] == [("form.letter", "note")]
    assert document.blocks[0].shells[0].angular == (7,)


@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(document=documents())
def test_write_then_read_gives_the_same(document: Document) -> None:
    again = read_text(LAYOUT.write(document).text, layout="datagroup")
    assert not again.faults
    assert content(again) == content(document)


def test_what_cannot_be_written_is_said() -> None:
    text = "spherical\n****\nC 0\nS 1 1.0\n 4.0 1.0\nL=7 1 1.0\n 0.5 1.0\n****\n"
    written = LAYOUT.write(read_text(text, layout="stars"))
    said = " ".join(written.losses)
    for word in ("above i", "(C)", "spherical", "places"):
        assert word in said
    assert [len(b.shells) for b in read_text(written.text, layout="datagroup").blocks] == [1]


HEAD = " $DATA\nt\nC1\n C 6.0 0. 0. 0.\n"
ECP = " $ECP\n HG-ECP GEN 60 1\n 1 - p -\n 0.5 2 1.0\n 2 - s-p -\n 15. 2 3.0\n -1. 0 4.0\n $END\n"
BROKEN = {
    "a row is lost": ("S ⟦3\n 1 4.0 0.6\n 2 0.5 0.5\n", ["form.count"]),
    "a row is lost within": ("S ⟦3\n 1 4.0 0.6\n 3 0.5 0.5\n", ["form.count"]),
    "a row too many": ("S ⟦1\n 1 4.0 0.6\n 2 0.5 0.5\n", ["form.count"]),
    "an absurd count": ("S ⟦999999999999999999\n 1 4.0 0.6\n", ["form.count"]),
    "no rows": ("⟦S 3\nS 1\n 1 4.0 1.0\n", ["form.count"]),
    "a coefficient is lost": ("S 2\n 1 4.0 0.6\n 2 ⟦0.5\n", ["form.count"]),
    "a number too many": ("S 2\n 1 4.0 0.6\n 2 0.5 0.5 ⟦0.1\n", ["form.count"]),
    "the p column is lost": ("L 1\n 1 4.0 ⟦0.6\n", ["form.count"]),
    "a row number is lost": ("S 2\n 1 4.0 0.6\n ⟦0.5 0.5\n", ["form.index-column"]),
    "all row numbers are lost": ("S 2\n ⟦4.0 0.6\n 0.5 0.5\n", ["form.index-column"]),
    "a wrong row number": ("S 3\n 1 4.0 0.6\n ⟦5 2.0 0.6\n 3 0.5 0.5\n", ["form.index-column"]),
    "row numbers jump": ("S 2\n 1 4.0 0.6\n ⟦3 0.5 0.5\n", ["form.index-column"]),
    "row numbers begin at 0": ("S 2\n ⟦0 4.0 0.6\n 1 0.5 0.5\n", ["form.index-column"]),
    "letter O": ("S 2\n 1 4.0 0.6\n 2 0.5 ⟦O.5\n", ["form.number"]),
    "decimal comma": ("S 2\n 1 4.0 0.6\n 2 ⟦0,5 0.5\n", ["form.number"]),
    "lost exponent letter": ("S 1\n 1 4.0 ⟦1.5-03\n", ["form.number"]),
    "overflowed field": ("S 1\n 1 ⟦******** 1.0\n", ["form.number"]),
    "typographic minus": ("S 1\n 1 4.0 ⟦−0.6\n", ["form.number"]),
    "count misspelt": ("S ⟦l\n 1 4.0 1.0\n", ["form.number"]),
    "count lost": ("⟦S\n 1 4.0 1.0\n", ["form.count"]),
    "unknown letter": ("⟦X 1\n 1 4.0 1.0\n", ["form.letter"]),
    "rows below a card": ("⟦SQ 1\n 1 4.0 1.0\n", ["form.letter"]),
    "an absurd scale factor": ("S 1 ⟦1.E300\n 1 4.0 1.0\n", ["form.number"]),
    "prose in an atom": ("S 1\n 1 4.0 1.0\n⟦see the first part\n", ["form.syntax"]),
    "rows without heading": ("⟦ 1 4.0 1.0\nS 1\n 1 4.0 1.0\n".replace("⟦ ", " ⟦"), ["form.syntax"]),
    "a blank line within an atom": ("S 1\n 1 4.0 1.0\n\n⟦S 1\n 1 0.4 1.0\n", ["form.syntax"]),
    "a blank line within a shell": ("S 2\n 1 4.0 1.0\n\n ⟦2 0.4 1.0\n", ["form.syntax"]),
}  # fmt: skip
WHOLE = {
    "unknown element": (HEAD.replace("6.0", "⟦206.0") + "S 1\n 1 4.0 1.0\n\n $END\n",
                        ["form.element"]),
    "another element": (HEAD.replace("6.0", "⟦7.0") + "S 1\n 1 4.0 1.0\n\n $END\n",
                        ["form.element"]),
    "a misspelt charge": (HEAD.replace("6.0", "⟦6,0") + "S 1\n 1 4.0 1.0\n\n $END\n",
                          ["form.number"]),
    "the charge is lost": (HEAD.replace("C 6.0", "⟦C") + "S 1\n 1 4.0 1.0\n\n $END\n",
                           ["form.count"]),
    "a misspelt coordinate": (HEAD.replace("6.0 0.", "6.0 ⟦O.") + "S 1\n 1 4.0 1.0\n\n $END\n",
                              ["form.number"]),
    "no blank line between atoms": (
        HEAD + "S 1\n 1 4.0 1.0\n⟦H 1.0 0. 0. 1.\nS 1\n 1 4.0 1.0\n\n $END\n", ["form.syntax"]),
    "an atom without shells": (HEAD.replace("C 6", "⟦C 6") + "\n H 1.0 0. 0. 1.\n S 1\n"
                               " 1 4.0 1.0\n\n $END\n", ["form.count"]),
    "the title is lost": ("⟦$DATA\nC1\n C 6.0 0. 0. 0.\n S 1\n 1 4.0 1.0\n\n $END\n",
                          ["form.syntax"]),
    "the blank line below the symmetry is lost": (
        HEAD.replace("C1\n C", "CNV 2\n ⟦C") + "S 1\n 1 4.0 1.0\n\n $END\n", ["form.syntax"]),
    "the group is not closed": (
        HEAD.replace("$DATA", "⟦$DATA") + "S 1\n 1 4.0 1.0\n\n $OTHER\n 1 1\n", ["form.syntax"]),
    "shells without an atom": (
        " $DATA\nt\nC1\n ⟦S 1\n 1 4.0 1.0\nP 1\n 1 1.0 1.0\n\n" + HEAD[12:]
        + " S 1\n 1 4.0 1.0\n\n $END\n", ["form.syntax"]),
    "a channel is lost": (ECP.replace("60 1", "60 ⟦2"), ["form.count"]),
    "a row of a channel is lost": (ECP.replace(" -1. 0 4.0\n", "").replace(" 2 - s", " ⟦2 - s"),
                                   ["form.count"]),
    "a row of a channel too many": (ECP.replace(" 2 - s", " ⟦1 - s"), ["form.count"]),
    "a channel's title is lost": (
        ECP.replace(" 1 - p -\n 0.5", " ⟦0.5"), ["form.count"]),
    "the title of a later channel is lost": (
        ECP.replace(" 2 - s-p -\n", "").replace(" 1 - p", " ⟦1 - p"), ["form.count"]),
    "a title without a count": (ECP.replace(" 2 - s-p -\n ", " x - s-p -\n ⟦"), ["form.count"]),
    "a term's number is lost": (ECP.replace("15. 2 3.0", "⟦15. 2"), ["form.count"]),
    "a term's slip": (ECP.replace("15.", "⟦l5."), ["form.number"]),
    "the number of electrons is lost": (ECP.replace("HG-ECP GEN 60", "⟦HG-ECP GEN"),
                                        ["form.syntax"]),
    "a potential for no element": (ECP.replace("HG-ECP", "⟦X-ECP"), ["form.element"]),
    "prose in a potential": (ECP.replace(" 2 - s", " ⟦see below\n 2 - s"), ["form.syntax"]),
    "the potential's heading is lost": (ECP.replace(" HG-ECP GEN 60 1\n 1", " ⟦1"),
                                        ["form.syntax"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    marked, rules = BROKEN[slip]
    broken.check("datagroup", f"{HEAD}{marked}\n $END\n", rules)


@pytest.mark.parametrize("slip", WHOLE)
def test_broken_outside_of_shells(slip: str) -> None:
    broken.check("datagroup", *WHOLE[slip])


def test_as_many_findings_as_faults() -> None:
    atoms = "".join(
        f" X{z} {z}.0 0. 0. 0.\n{marked}\n" for z, (marked, _) in enumerate(BROKEN.values(), 1)
    )
    rules = [rule for _, found in BROKEN.values() for rule in found]
    broken.check("datagroup", f" $DATA\nt\nC1\n{atoms} $END\n", rules)
