"""Layout `deck`: what is read, and where faults are found."""

import broken
import pytest
from generated import content, documents
from hypothesis import HealthCheck, assume, given, settings

from overlapse.grammar.layouts.deck import LAYOUT
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_text

SOUND = """\
6 3
0 0 3 2.0 1.0
     40.0      0.15
      7.0D0    .53
      2.1      +0.44
0 1 1 4 1. valence
      0.3      1.0      1.0
0 3 1 0. 1
      0.8      1.0
280 2
input
20. 1 1 0 2 0 0
      3.0      15.0     0
      4.0      -1.5     -2
      5.0      -2.5     -1
      6.0      0.25      0
0 4 1 0.0 2.0
      0.5      1.0
0 5 1 0.0 1.0
      0.6      1.0
99 0
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "deck"
    assert not document.faults
    carbon, mercury = document.blocks
    assert carbon.names == ("s-1", "sp-1", "d-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1]
    assert carbon.shells[0].coefficients.tolist() == [[0.15], [0.53], [0.44]]
    assert carbon.shells[0].spelling(1) == "7.0D0"
    assert carbon.shells[0].place(2, 0) == (5, 16)
    assert carbon.shells[1].coefficients.tolist() == [[1.0, 1.0]]
    assert carbon.complete and mercury.complete
    assert (carbon.line, carbon.end, mercury.line) == (1, 9, 10)
    # A scale factor multiplies exponents by its square.
    assert [shell.exponents.tolist() for shell in mercury.shells] == [[2.0], [0.6]]
    assert mercury.shells[0].spelling(0) == "0.5"


def test_a_core_potential() -> None:
    potential = read_text(SOUND).blocks[1].potential
    assert potential is not None
    assert potential.electrons == 60
    # The text counts powers of r, the model counts them in r**n / r**2; a part without terms
    # between others is kept, for some layouts know a part by its place alone.
    assert [(c.title, c.l, c.local, c.powers) for c in potential.channels] == [
        ("local", 3, True, (2,)),
        ("s", 0, False, (0,)),
        ("p", 1, False, ()),
        ("d", 2, False, (1, 2)),
    ]
    assert potential.channels[3].exponents.tolist() == [5.0, 6.0]
    assert potential.channels[3].coefficients.tolist() == [-2.5, 0.25]


def test_line_ends_and_letter_case_do_not_matter() -> None:
    plain = read_text(SOUND)
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r"), SOUND.upper()):
        again = read_text(other)
        assert again.layout == "deck"
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert content(again) == content(plain)
        assert again.blocks[0].shells[0].place(2, 0) == (5, 16)


RUN_INPUT = """\
invented oxide
LATTICE
0 0 0
225
4.2
2
12 0. 0. 0.
8 0.5 0.5 0.5
END
{}99 0
END
GRID
8 8
SPINS
2
1 1
2 -1
END
"""


def test_a_list_within_a_run_input() -> None:
    shells = "12 1\n0 0 1 2. 1.\n 4.0 1.0\n8 1\n0 0 1 2. 1.\n 5.0 1.0\n"
    document = read_text(RUN_INPUT.format(shells))
    assert document.layout == "deck"
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["Mg", "O"]


def test_built_in_shells_are_a_note_for_each_element() -> None:
    shells = "28 3\n1 0 3 2. 0.\n1 1 3 8. 0.\n1 3 3 8. 0.\n8 2\n1 0 3 2. 0.\n1 1 3 6. 0.\n"
    document = read_text(RUN_INPUT.format(shells))
    assert document.layout == "deck"
    assert [(b.symbol, b.shells, b.complete) for b in document.blocks] == [
        ("Ni", (), False),
        ("O", (), False),
    ]
    assert [(f.severity, document.source.place(f.span[0]).line) for f in document.faults] == [
        ("note", 11),
        ("note", 15),
    ]


def test_built_in_and_explicit_shells_of_one_element() -> None:
    block = read_text("8 3\n1 0 3 2. 0.\n2 1 3 6. 0.\n0 3 1 0. 1.\n 0.8 1.0\n").blocks[0]
    assert block.names == ("d-1",)
    assert not block.complete


def test_a_potential_known_by_name_is_a_note() -> None:
    document = read_text(
        "247 1 \nSMALLCORE\n0 1 1 1. 1.\n 0.6 1.0 1.0\n\nsome reference\n1991 12.\n"
    )
    assert document.layout == "deck"
    assert [fault.severity for fault in document.faults] == ["note"]
    silver = document.blocks[0]
    assert (silver.symbol, silver.complete, silver.potential) == ("Ag", False, None)
    assert silver.names == ("sp-1",)


def test_two_numbers_for_one_element_are_two_sets() -> None:
    one = " 1\n0 0 1 1. 1.\n 0.6 1.0\n"
    document = read_text(f"1{one}101{one}6{one}99 0\n")
    assert not document.faults
    assert [[b.symbol for b in members.blocks] for members in document.sets] == [["H", "C"], ["H"]]


def test_whole_numbers_may_be_rows_or_headings() -> None:
    text = "8 2\n0 0 2 2 1\n 12 3\n 4 2\n0 1 1 6 1\n 1 1 1\n6 1\n0 0 1 2 1\n 9 1\n99 0\n"
    document = read_text(text)
    assert not document.faults
    assert [b.symbol for b in document.blocks] == ["O", "C"]
    assert document.blocks[0].shells[0].exponents.tolist() == [12.0, 4.0]


def test_several_elements_without_an_end_are_a_note() -> None:
    document = read_text("6 1\n0 0 1 2. 1.\n 4.0 1.0\n8 1\n0 0 1 2. 1.\n 5.0 1.0\n")
    assert [fault.severity for fault in document.faults] == ["note"]
    assert len(document.blocks) == 2


@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(document=documents(highest=4))
def test_write_then_read_gives_the_same(document: Document) -> None:
    for block in document.blocks:
        assume(block.potential is None or block.potential.electrons <= block.atomic_number)
    again = read_text(LAYOUT.write(document).text, layout="deck")
    assert not [fault for fault in again.faults if fault.severity != "note"]
    assert content(again) == content(document)


def test_what_cannot_be_written_is_said() -> None:
    text = (
        "spherical\n****\nC 0\nS 1 1.0\n 4.0 1.0\nH 1 1.0\n 0.5 1.0\n****\nFm 0\nS 1 1.0\n 1.0 1.0"
        "\n****\n"
    )
    written = LAYOUT.write(read_text(text, layout="stars"))
    said = " ".join(written.losses)
    for word in ("above g", "(C)", "(Fm)", "spherical", "formal charges"):
        assert word in said
    assert written.text == "6 1\n0 0 1 2.0 1.0\n  4.0   1.0\n99 0\n"


def test_formal_charges_are_those_of_the_neutral_atom() -> None:
    shells = "S 1 1.0\n 9.0 1.0\nS 1 1.0\n 1.0 1.0\nSP 1 1.0\n 0.1 1.0 1.0\nP 1 1.0\n 2.0 1.0\n"
    written = LAYOUT.write(read_text(f"O 0\n{shells}****\n", layout="stars"))
    headings = [line for line in written.text.split("\n") if line.startswith("0 ")]
    assert headings == ["0 0 1 2.0 1.0", "0 0 1 2.0 1.0", "0 1 1 4.0 1.0", "0 2 1 0.0 1.0"]


POTENTIAL = "280 1\nINPUT\n20. 0 1 1 0 0 0\n 3.0 15.0 0\n 4.0 1.5 0\n0 0 1 2. 1.\n 0.5 1.0\n"
BROKEN = {
    "a row is lost": ("6 1\n0 0 ⟦3 2. 1.\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "a row too many": ("6 1\n0 0 ⟦1 2. 1.\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "an absurd count": ("6 1\n0 0 ⟦999999999999999999 2. 1.\n 4.0 0.6\n", ["form.count"]),
    "a count beyond all numbers": (f"6 1\n0 0 ⟦{'9' * 400} 2. 1.\n 4.0 1.0\n", ["form.number"]),
    "no rows": ("6 2\n⟦0 0 3 2. 1.\n0 0 1 2. 1.\n 1.0 1.0\n", ["form.count"]),
    "a coefficient is lost": ("6 1\n0 0 2 2. 1.\n 4.0 0.6\n ⟦0.5\n", ["form.count"]),
    "a number too many": ("6 1\n0 0 2 2. 1.\n 4.0 0.6\n 0.5 0.5 ⟦0.1\n", ["form.count"]),
    "the p column is lost": ("6 1\n0 1 1 2. 1.\n 4.0 ⟦0.6\n", ["form.count"]),
    "letter O": ("6 1\n0 0 2 2. 1.\n 4.0 0.6\n 0.5 ⟦O.5\n", ["form.number"]),
    "letter O leads": ("6 1\n0 0 2 2. 1.\n 4.0 0.6\n ⟦O.5 0.5\n", ["form.number"]),
    "decimal comma": ("6 1\n0 0 2 2. 1.\n 4.0 0.6\n 0.5 ⟦0,5\n", ["form.number"]),
    "lost exponent letter": ("6 1\n0 0 1 2. 1.\n 4.0 ⟦1.5-03\n", ["form.number"]),
    "overflowed field": ("6 1\n0 0 2 2. 1.\n ⟦******** 0.6\n 0.5 0.5\n", ["form.number"]),
    "letter O in the heading": ("6 1\n⟦O 0 1 2. 1.\n 4.0 1.0\n", ["form.number"]),
    "a formal charge that is none": ("6 1\n0 0 1 ⟦2,0 1.\n 4.0 1.0\n", ["form.number"]),
    "a broken count of rows": ("6 1\n0 0 ⟦1.5 2. 1.\n 4.0 1.0\n", ["form.number"]),
    "a shell too few": ("6 ⟦3\n0 0 1 2. 1.\n 4.0 1.0\n0 1 1 2. 1.\n 4.0 1.0 1.0\n", ["form.count"]),
    "a shell too many": ("6 ⟦1\n0 0 1 2. 1.\n 4.0 1.0\n0 1 1 2. 1.\n 4.0 1.0 1.0\n",
                         ["form.count"]),
    "the scale factor is lost": ("6 1\n⟦0 0 1 2.0\n 4.0 1.0\n", ["form.count"]),
    "two numbers are lost": ("6 2\n0 0 1 2. 1.\n 4.0 1.0\n⟦0 0 1\n 0.4 1.0\n", ["form.count"]),
    "unknown shell type": ("6 1\n0 ⟦8 1 2. 1.\n 4.0 1.0\n", ["form.letter"]),
    "unknown kind": ("6 1\n⟦5 0 1 2. 1.\n 4.0 1.0\n", ["form.syntax"]),
    "built in, yet with rows": ("6 1\n⟦1 0 1 2. 1.\n 4.0 1.0\n", ["form.syntax"]),
    "electrons that find no room": ("6 1\n0 0 1 ⟦8. 1.\n 4.0 1.0\n", ["form.number"]),
    "an absurd scale factor": ("6 1\n0 0 1 2. ⟦1.E300\n 4.0 1.0\n", ["form.number"]),
    "no such element": ("⟦200 1\nINPUT\n0. 0 0 0 0 0 0\n0 0 1 2. 1.\n 4.0 1.0\n", ["form.element"]),
    "element given twice": ("6 1\n0 0 1 2. 1.\n 4.0 1.0\n⟦6 1\n0 0 1 2. 1.\n 4.0 1.0\n99 0\n",
                            ["form.repeat"]),
    "the count of shells is lost": ("⟦6\n0 0 1 2. 1.\n 4.0 1.0\n", ["form.count"]),
    "the first heading is lost": ("⟦0 0 1 2. 1.\n 4.0 1.0\n8 1\n0 0 1 2. 1.\n 4.0 1.0\n",
                                  ["form.syntax"]),
    "a heading is lost": ("6 2\n0 0 1 2. 1.\n 4.0 1.0\n0 3 1 2. 1.\n 4.0 1.0\n"
                          "⟦0 0 1 2. 1.\n 5.0 1.0\n99 0\n", ["form.syntax"]),
    "prose in an element": ("6 2\n0 0 1 2. 1.\n 4.0 1.0\n⟦see below\n0 2 1 2. 1.\n 4.0 1.0\n",
                            ["form.syntax"]),
    "prose between elements": ("6 1\n0 0 1 2. 1.\n 4.0 1.0\n⟦oxygen\n8 1\n0 0 1 2. 1.\n 4.0 1.0\n"
                               "99 0\n", ["form.syntax"]),
    "a damaged kind": ("6 2\n0 0 1 2. 1.\n 4.0 1.0\n⟦x 2 1 2. 1.\n 4.0 1.0\n99 0\n",
                       ["form.number"]),
    "a damaged shell heading": ("6 2\n0 0 1 2. 1.\n 4.0 1.0\n⟦shell 2\n 4.0 1.0\n99 0\n",
                                ["form.syntax"]),
    "the end is lost": ("6 1\n0 0 1 2. 1.\n 4.0 1.0\n⟦END\nGRID\n8 8\n", ["form.syntax"]),
    "the end is damaged": ("6 1\n0 0 1 2. 1.\n 4.0 1.0\n⟦99\n", ["form.count"]),
    "a row of the potential is lost": (
        POTENTIAL.replace(" 4.0 1.5 0\n", "").replace(" 0 1 1", " ⟦0 1 1"), ["form.count"]),
    "a row of the potential too many": (POTENTIAL.replace(" 0 1 1", " ⟦0 1 0"), ["form.count"]),
    "a count of the potential is lost": (POTENTIAL.replace("20. 0", "⟦20."), ["form.count"]),
    "the counts are lost": (POTENTIAL.replace("INPUT\n20. 0 1 1 0 0 0", "⟦INPUT"), ["form.count"]),
    "a term's number is lost": (POTENTIAL.replace(" 4.0 1.5 0", " ⟦4.0 1.5"), ["form.count"]),
    "a term's slip": (POTENTIAL.replace("15.0", "⟦l5.0"), ["form.number"]),
    "more charge than the nucleus": (POTENTIAL.replace("20.", "⟦90."), ["form.number"]),
    "a broken charge": (POTENTIAL.replace("20.", "⟦20.5"), ["form.number"]),
    "the potential is lost": (POTENTIAL.replace("280", "⟦280").replace(
        "INPUT\n20. 0 1 1 0 0 0\n 3.0 15.0 0\n 4.0 1.5 0\n", ""), ["form.syntax"]),
    "a potential that is not announced": (POTENTIAL.replace("280", "⟦80"), ["form.syntax"]),
    "rows below a named potential": (POTENTIAL.replace("INPUT", "⟦SMALLCORE"), ["form.syntax"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("deck", *BROKEN[slip])


def test_many_faults_are_as_many_findings() -> None:
    chosen = [slip for slip in BROKEN if BROKEN[slip][0].startswith("6 ")][:19]
    marked = "".join(f"{z}{BROKEN[slip][0][1:]}" for z, slip in enumerate(chosen, 1))
    broken.check("deck", marked, [rule for slip in chosen for rule in BROKEN[slip][1]])
