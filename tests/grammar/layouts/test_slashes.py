"""Layout `slashes`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text

SOUND = """\
****************************
* an invented set          *
****************************
#Purpose tests

/C.Inv-1*.Author.4s2p.2s1p.
1999 Reference, 1, 2 * 3
CARBON (4s,2p) -> [2s,1p]
Options
OrbitalEnergies
Cartesian d
EndOptions
********
* more *
********
     6.0   3
* s-type functions
    4    2
         40.0D0  7.
          2.1
           .3
  0.15  0.00
  0.53  0.00
* between the rows
  0.44  +0.00
  0.00  1.00
  2
 -11.3  -0.7
* p-type functions
    2    1
          3.0   0.5
  0.60
  0.50
  1
 -0.4
* d-type functions
    0    0
  0
* f-type functions
    2    2
          0.8
          0.2
  1 0
  0 1

/HG.Inv-1*.Author.1s1p.1s1p.ECP.20el.
Another reference
MERCURY
    20.0   1
    1    1
          1.5
  1.0
    1    1
          0.7
  1.0
PP, Hg, 60, 1 ;
  1 ;
 2,     1.00000000,     0.00000000 ;
  2 ;
 2,     3.0,  15.0 ;
 0,     4.0,  -1.5 ;
Spectral Representation Operator
End of Spectral Representation Operator
"""

CORE = """\
/Na.Inv-2.Author.2s.1s.ECP.1el.
reference
SODIUM
     1.0   0
    2    1
         1.5  0.5
  1.0
  0.5
M1
  1
   2.0
   0.5
M2
  0
COREREP
 1.0
PROJOP
    0
    2    1
   4.0
   7.0
   0.2
   0.1
Spectral Representation Operator
External
End of Spectral Representation Operator
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "slashes"
    assert not document.faults
    carbon, mercury = document.blocks
    assert [members.label for members in document.sets] == ["Inv-1*"]
    assert carbon.names == ("s-1", "p-1", "f-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1, 0.3]
    assert carbon.shells[0].coefficients[:, 0].tolist() == [0.15, 0.53, 0.44, 0.0]
    assert carbon.shells[2].coefficients.tolist() == [[1.0, 0.0], [0.0, 1.0]]
    assert carbon.shells[0].spelling(0) == "40.0D0"
    assert carbon.shells[0].place(2, 1) == (25, 9)
    assert carbon.shells[0].spellings()[1][2] == ["0.44", "+0.00"]
    assert mercury.potential is not None
    assert mercury.potential.electrons == 60
    assert [(c.l, c.local, c.powers) for c in mercury.potential.channels] == [
        (1, True, (2,)),
        (0, False, (2, 0)),
    ]
    assert mercury.potential.channels[1].coefficients.tolist() == [15.0, -1.5]


def test_titles_and_heading_are_kept_as_remarks() -> None:
    remarks = [(remark.line, remark.text) for remark in read_text(SOUND).remarks]
    assert (4, "Purpose tests") in remarks
    assert (6, "(4s2p) -> [2s1p]") in remarks
    assert (7, "1999 Reference, 1, 2 * 3") in remarks
    assert (8, "CARBON (4s,2p) -> [2s,1p]") in remarks
    assert [line for line, _ in remarks] == sorted(line for line, _ in remarks)


def test_line_ends_do_not_matter() -> None:
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r")):
        again = read_text(other)
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert [block.counts for block in again.blocks] == [{0: 2, 1: 1, 3: 2}, {0: 1, 1: 1}]
        assert again.blocks[0].shells[0].place(2, 1) == (25, 9)


def test_exponents_alone_are_uncontracted() -> None:
    text = (
        "/H.heavy.Author.3s.3s.\nreference\nHYDROGEN (3s)\n 1.0 0\n 3 3\n 2.4e7\n 5.0e6\n 1.4e6\n"
    )
    document = read_text(text)
    assert not document.faults
    (shell,) = document.blocks[0].shells
    assert shell.exponents.tolist() == [2.4e7, 5.0e6, 1.4e6]
    assert shell.coefficients.tolist() == [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]]


def test_cartesian_functions_are_known_where_all_are() -> None:
    only = read_text(SOUND.replace("Cartesian d", "Cartesian d f")).blocks[0]
    assert only.functions == "cartesian"
    assert read_text(SOUND).blocks[0].functions is None
    every = read_text(SOUND.replace("Cartesian d", "Cartesian all")).blocks[0]
    assert every.functions == "cartesian"
    some = read_text(SOUND.replace("Cartesian d", "Cartesian f").replace("    0    0\n  0\n",
                     "    1    1\n 0.9\n 1.0\n"))  # fmt: skip
    assert [fault.severity for fault in some.faults] == ["note"]


def test_parts_of_potentials_that_are_not_modelled_are_said_once() -> None:
    document = read_text(CORE + "\n" + CORE.replace("/Na", "/K").replace(" 1.0   0", " 9.0   0"))
    assert [(f.rule, f.severity) for f in document.faults] == [("form.syntax", "note")]
    assert "M1, M2, COREREP, PROJOP" in document.faults[0].message
    assert [block.counts for block in document.blocks] == [{0: 1}, {0: 1}]
    potentials = [block.potential for block in document.blocks]
    assert [p.electrons if p else None for p in potentials] == [10, 10]
    assert [p.channels if p else None for p in potentials] == [(), ()]


def test_an_environment_has_no_functions() -> None:
    text = "/Mg.ECP.Author.0s.0s.0e-Emb-MgO.\nreference\nnone\n 2.0 0\n* s-type\n 0 0\nM1\n 0\n"
    document = read_text(text)
    assert [fault.severity for fault in document.faults] == ["note"]
    assert [(block.symbol, block.shells) for block in document.blocks] == [("Mg", ())]


def test_placeholders_are_passed_over() -> None:
    text = "/X.none..0s.0s.\nDummy\nGHOST (0s) -> [0s]\n 0.0 0\n 0 0\n\n" + SOUND
    document = read_text(text)
    assert [fault.severity for fault in document.faults] == ["note"]
    assert [block.symbol for block in document.blocks] == ["C", "Hg"]


def test_an_element_with_other_fields_belongs_to_another_set() -> None:
    document = read_text(SOUND + "\n" + SOUND.replace("Author.4s2p", "Other.4s2p"))
    assert [len(members.blocks) for members in document.sets] == [3, 1]
    assert {fault.rule for fault in document.faults} == {"form.repeat"}  # mercury is the same
    assert {fault.element for fault in document.faults} == {"Hg"}


def test_what_follows_in_a_deck_is_left_alone() -> None:
    deck = "&INPUT\n title\n 1 2\n" + SOUND + "end of basis\n 1.0 2.0\n&NEXT\n 3 4\n"
    assert not read_text(deck).faults


def test_names_and_flags_are_said_where_they_are_lost() -> None:
    text = "spherical\n****\nC 0\nSP 1 1.0\n 1.0 0.5 0.5\n****\n"
    document = read_text(text, layout="stars")
    written = layouts()["slashes"].write(document)
    assert [loss.split(" (")[0] for loss in written.losses] == [
        "exponents that several l share are written for each of them",
        "the layout has no flag for spherical functions",
    ]


HEAD = "/C.Inv.Author.2s.1s.\nreference\nCARBON\n"
BROKEN = {
    "an exponent is lost": (HEAD + "6.0 0\n⟦3 2\n9.0 3.0\n1.0 0.0\n0.0 1.0\n0.0 1.0\n",
                            ["form.count"]),
    "a row is lost": (HEAD + "6.0 0\n⟦3 2\n9.0 3.0 1.0\n1.0 0.0\n0.0 1.0\n", ["form.count"]),
    "a row too many": (HEAD + "6.0 0\n⟦2 2\n9.0 3.0\n1.0 0.0\n0.0 1.0\n0.5 0.5\n",
                       ["form.count"]),
    "a coefficient is lost": (HEAD + "6.0 0\n2 2\n9.0 3.0\n1.0 0.0\n⟦1.0\n", ["form.count"]),
    "one column lacks a number": (HEAD + "6.0 0\n⟦3 1\n9.0\n3.0\n1.0\n0.1\n0.2\n", ["form.count"]),
    "an absurd count": (HEAD + "6.0 0\n⟦99999999999999999999 1\n9.0\n1.0\n", ["form.count"]),
    "no numbers": (HEAD + "6.0 1\n⟦2 1\n1 1\n9.0\n1.0\n", ["form.count"]),
    "a table is lost": (HEAD + "6.0 ⟦2\n1 1\n9.0\n1.0\n1 1\n9.0\n1.0\n", ["form.count"]),
    "a table too many": (HEAD + "6.0 ⟦0\n1 1\n9.0\n1.0\n1 1\n9.0\n1.0\n", ["form.count"]),
    "a table is lost, as a comment shows": (
        HEAD + "6.0 2\n* s-type functions\n1 1\n9.0\n1.0\n* d-type functions\n⟦1 1\n9.0\n1.0\n",
        ["form.syntax"]),
    "a heading is lost": (
        HEAD + "6.0 2\n* s-type\n1 1\n9.0\n1.0\n* p-type\n⟦9.0\n1.0\n* d-type\n1 1\n9.0\n1.0\n",
        ["form.syntax"]),
    "a heading is lost without a comment": (
        HEAD + "6.0 1\n2 2\n9.0\n4.0\n1.0 0.0\n0.0 1.0\n⟦9.0\n1.0\n", ["form.syntax"]),
    "a lone exponent": (HEAD + "6.0 1\n1 1\n9.0\n1.0\n⟦1 1\n1.0\n", ["form.count"]),
    "a third line of title": (HEAD + "⟦more\n6.0 0\n1 1\n9.0\n1.0\n", ["form.syntax"]),
    "the charge line is lost": ("⟦" + HEAD + "1 1\n9.0\n1.0\n", ["form.syntax"]),
    "the highest l is lost": (HEAD + "⟦6.0\n1 1\n9.0\n1.0\n", ["form.syntax"]),
    "letter O in the charge": (HEAD + "⟦6.O 0\n1 1\n9.0\n1.0\n", ["form.number"]),
    "a charge run together with the highest l": (HEAD + "⟦6.00\n1 1\n9.0\n1.0\n", ["form.syntax"]),
    "another element's charge": (HEAD + "⟦7.0 0\n1 1\n9.0\n1.0\n", ["form.element"]),
    "letter O": (HEAD + "6.0 0\n1 1\n⟦O.9\n1.0\n", ["form.number"]),
    "decimal comma": (HEAD + "6.0 0\n1 1\n9.0\n⟦1,5\n", ["form.number"]),
    "lost exponent letter": (HEAD + "6.0 0\n1 1\n9.0\n⟦1.5-03\n", ["form.number"]),
    "overflowed field": (HEAD + "6.0 0\n1 2\n9.0\n⟦******** 1.0\n", ["form.number"]),
    "two points": (HEAD + "6.0 0\n1 1\n⟦9.532.939\n1.0\n", ["form.number"]),
    "unknown element": ("⟦/Cx.Inv.Author.2s.1s.\nref\ntitle\n6.0 0\n1 1\n9.0\n1.0\n",
                        ["form.element"]),
    "the slash is lost": ("/H.Inv.Author.1s.1s.\nref\ntitle\n1.0 0\n1 1\n9.0\n1.0\n⟦"
                          + HEAD[1:] + "6.0 0\n1 1\n9.0\n1.0\n", ["form.syntax"]),
    "an element's heading is lost": (HEAD + "6.0 0\n1 1\n9.0\n1.0\n⟦reference\nNITROGEN\n7.0 0\n"
                                     "1 1\n9.0\n1.0\n", ["form.syntax"]),
    "an element's heading is lost below a potential": (
        HEAD + "4.0 0\n1 1\n9.0\n1.0\nPP, C, 2, 0 ;\n 1 ;\n2, 1.0, 0.0 ;\n⟦reference\nNITROGEN\n"
        "7.0 0\n1 1\n9.0\n1.0\n", ["form.syntax"]),
    "prose among the rows": (HEAD + "6.0 0\n2 2\n9.0 3.0\n1.0 0.0\n⟦see below\n0.0 1.0\n",
                             ["form.syntax"]),
    "prose between tables": (HEAD + "6.0 1\n1 1\n9.0\n1.0\n⟦see below\n1 1\n9.0\n1.0\n",
                             ["form.syntax"]),
    "options without end": (HEAD + "⟦Options\nOrbitalEnergies\n6.0 0\n1 1\n9.0\n1.0\n1\n-0.5\n",
                            ["form.syntax"]),
    "element given twice": (HEAD + "6.0 0\n1 1\n9.0\n1.0\n⟦" + HEAD + "6.0 0\n1 1\n9.0\n1.0\n",
                            ["form.repeat"]),
    "a channel is lost": (HEAD + "4.0 0\n1 1\n9.0\n1.0\nPP, C, 2, ⟦1 ;\n 1 ;\n2,1.0,0.0 ;\n",
                          ["form.count"]),
    "a term is lost": (HEAD + "4.0 0\n1 1\n9.0\n1.0\nPP, C, 2, 0 ;\n ⟦2 ;\n2, 1.0, 0.0 ;\n",
                       ["form.count"]),
    "a term is misspelt": (HEAD + "4.0 0\n1 1\n9.0\n1.0\nPP, C, 2, 0 ;\n 1 ;\n2,1.0,⟦O.5;\n",
                           ["form.number"]),
    "another core": (HEAD + "4.0 0\n1 1\n9.0\n1.0\nPP, C, ⟦3, 0 ;\n 1 ;\n2, 1.0, 0.0 ;\n",
                     ["form.count"]),
    "another element's potential": (HEAD + "4.0 0\n1 1\n9.0\n1.0\nPP, ⟦N, 2, 0 ;\n 1 ;\n"
                                    "2, 1.0, 0.0 ;\n", ["form.element"]),
    "potential without numbers": (HEAD + "4.0 0\n1 1\n9.0\n1.0\n⟦PP, C ;\n 1 ;\n2, 1.0, 0.0 ;\n",
                                  ["form.syntax"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("slashes", *BROKEN[slip])


def test_many_faults_are_all_found_once() -> None:
    slips = [slip for slip in BROKEN if BROKEN[slip][0].lstrip("⟦").startswith(HEAD)]
    slips.remove("element given twice")
    slips.remove("an element's heading is lost")
    marked = "".join(
        BROKEN[slip][0].replace("/C.Inv.", f"/C.Inv-{at}.") + "\n" for at, slip in enumerate(slips)
    )
    rules = [rule for slip in slips for rule in BROKEN[slip][1]]
    broken.check("slashes", marked, rules)
