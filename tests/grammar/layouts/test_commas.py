"""Layout `commas`: what is read, and where faults are found."""

import broken
import pytest
from generated import content, documents
from hypothesis import HealthCheck, given, settings

from overlapse.grammar.layouts.commas import LAYOUT
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_text

SOUND = """\
geometry={
h, o, 0.96
}
basis={
! CARBON (4s,2p) -> [3s,2p]
s, C , 40.0, 7.0D0, .53, 0.3
c, 1.3, 0.15, +0.53, 0.44
c, 1.3, -0.04,-0.11, 0.20
c, 4.4, 1
p,C,3.0,0.5;c,1.2,0.6,0.5;   ! both in one line
d, C , 0.8, 0.2
s, Hg , 1.2
ecp, Hg, 60, 1, 1;
1; 2, 1.0, 0.0;
2; 2, 3.0, 15.0; 0, 4.0, -1.5;
1; 2, 5.0, 0.25;
}
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "commas"
    assert not document.faults
    carbon, mercury = document.blocks
    # Contractions over the same exponents are one shell, others are shells of their own; and so is
    # every exponent that no contraction is given for.
    assert carbon.names == ("s-1", "s-2", "p-1", "d-1", "d-2")
    first, second, p, d, _ = carbon.shells
    assert first.exponents.tolist() == [40.0, 7.0, 0.53]
    assert first.coefficients.tolist() == [[0.15, -0.04], [0.53, -0.11], [0.44, 0.2]]
    assert first.spellings() == (
        ["40.0", "7.0D0", ".53"],
        [["0.15", "-0.04"], ["+0.53", "-0.11"], ["0.44", "0.20"]],
    )
    assert first.place(1) == (6, 14)
    assert first.place(1, 1) == (8, 15)
    assert (second.exponents.tolist(), second.coefficients.tolist()) == ([0.3], [[1.0]])
    assert second.place(0) == (6, 26)
    assert second.place(0, 0) == (9, 9)
    assert p.spellings() == (["3.0", "0.5"], [["0.6"], ["0.5"]])
    assert p.place(1, 0) == (10, 23)
    assert (d.exponents.tolist(), d.coefficients.tolist()) == ([0.8], [[1.0]])
    assert d.place(0) == d.place(0, 0) == (11, 8)
    assert mercury.names == ("s-1",)
    assert (carbon.line, carbon.end, mercury.line) == (6, 11, 12)
    assert document.remarks[0].text == "CARBON (4s,2p) -> [3s,2p]"


def test_a_core_potential() -> None:
    potential = read_text(SOUND).blocks[1].potential
    assert potential is not None
    assert potential.electrons == 60
    assert [(c.l, c.local, c.kind, c.powers) for c in potential.channels] == [
        (1, True, "scalar", (2,)),
        (0, False, "scalar", (2, 0)),
        (1, False, "spin-orbit", (2,)),
    ]
    assert potential.channels[1].exponents.tolist() == [3.0, 4.0]
    assert potential.channels[1].coefficients.tolist() == [15.0, -1.5]


def test_line_ends_and_letter_case_do_not_matter() -> None:
    plain = read_text(SOUND)
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r"), SOUND.upper()):
        again = read_text(other)
        assert again.layout == "commas"
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert content(again) == content(plain)
        assert again.blocks[0].shells[0].place(1, 1) == (8, 15)


LOG = """\
 *** some program, version 12 ***
 1 2 3 4
 s,Be,40.0,7.0,0.3;
 c,1.2,0.6,0.5;
 c,3.3,1.0;

 p,Be,3.0,0.5;
 c,1.2,0.6,0.5;

 NUMBER OF FUNCTIONS, 5
 Energies, in hartree: -14.5, -0.3
 0.1, 0.2
"""


def test_statements_without_braces_in_a_log() -> None:
    document = read_text(LOG)
    assert document.layout == "commas"
    assert not document.faults
    assert document.blocks[0].names == ("s-1", "s-2", "p-1")
    assert document.blocks[0].complete


def test_ten_and_more_exponents() -> None:
    exponents = ", ".join(f"{20 - k}.0" for k in range(12))
    coefficients = ", ".join(["0.1"] * 10)
    document = read_text(f"s, C, {exponents}\nc, 1.10, {coefficients}\nc, 11.12, 0.5, 0.5\n")
    assert not document.faults
    assert [len(shell.exponents) for shell in document.blocks[0].shells] == [10, 2]


def test_two_sections_are_two_sets() -> None:
    one = "basis={{\ns, C, {0}\n}}\n"
    document = read_text(one.format(1.0) + one.format(2.0))
    assert not document.faults
    assert [len(members.blocks) for members in document.sets] == [1, 1]


def test_elements_may_take_turns() -> None:
    document = read_text("s, H, 4.0, 1.0\ns, C, 9.0, 1.0\np, H, 2.0\np, C, 3.0\n")
    assert not document.faults
    assert [(b.symbol, len(b.shells)) for b in document.blocks] == [("H", 3), ("C", 3)]


def test_a_set_from_a_library_is_a_note() -> None:
    for reference in ("spd, C, cc-pvdz; c;", "default=cc-pvdz", "ecp, Hg, SMALLCORE"):
        document = read_text(f"basis={{\n{reference}\ns, H, 1.0\n}}\n")
        assert document.layout == "commas"
        assert [(f.rule, f.severity) for f in document.faults] == [("form.syntax", "note")]


def test_text_between_statements_does_not_move_the_numbers() -> None:
    document = read_text("basis={\ns, C, 4.0, 0.5\nsome words; c, 1.2, 0.6, 0.5\n}\n")
    assert [fault.rule for fault in document.faults] == ["form.syntax"]
    shell = document.blocks[0].shells[0]
    assert shell.spellings() == (["4.0", "0.5"], [["0.6"], ["0.5"]])
    assert shell.place(1, 0) == (3, 26)


@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(document=documents())
def test_write_then_read_gives_the_same(document: Document) -> None:
    again = read_text(LAYOUT.write(document).text, layout="commas")
    assert not again.faults
    assert content(again) == content(document)


def test_what_cannot_be_written_is_said() -> None:
    text = "spherical\n****\nC 0\nSP 1 1.0\n 4.0 1.0 1.0\n****\n"
    said = " ".join(LAYOUT.write(read_text(text, layout="stars")).losses)
    for word in ("shared s and p", "(C)", "spherical"):
        assert word in said


ECP = "ecp, Hg, 60, 1, 0;\n1; 2, 1.0, 0.0;\n2; 2, 3.0, 15.0; 0, 4.0, -1.5;\n"
BROKEN = {
    "a coefficient is lost": ("s, C, 4.0, 0.5\nc, ⟦1.2, 0.6\n", ["form.count"]),
    "a coefficient too many": ("s, C, 4.0, 0.5\nc, ⟦1.2, 0.6, 0.5, 0.1\n", ["form.count"]),
    "a decimal comma": ("s, C, 4.0, 0.5\nc, ⟦1.2, 0,6, 0.5\n", ["form.count"]),
    "an exponent is lost": ("s, C, 4.0, ⟦0.5\nc, 1.3, 0.6, 0.5, 0.1\nc, 1.3, 0.1, 0.2, 0.3\n",
                            ["form.count"]),
    "a range beyond the exponents": ("s, C, 4.0, 0.5\nc, 1.2, 0.6, 0.5\nc, ⟦3.3, 1\n",
                                     ["form.count"]),
    "an absurd range": ("s, C, 4.0, 0.5\nc, ⟦1.999999, 0.6, 0.5\n", ["form.count"]),
    "no exponents": ("⟦s, C\nc, 1.2, 0.6, 0.5\n", ["form.count"]),
    "no range": ("s, C, 4.0, 0.5\nc, ⟦2, 0.6, 0.5\n", ["form.number"]),
    "a comma in the range": ("s, C, 4.0, 0.5\nc, ⟦1,2, 0.6, 0.5\n", ["form.number"]),
    "a range that runs backwards": ("s, C, 4.0, 0.5\nc, ⟦2.1, 0.6, 0.5\n", ["form.number"]),
    "letter O": ("s, C, 4.0, 0.5\nc, 1.2, 0.6, ⟦O.5\n", ["form.number"]),
    "letter l in an exponent": ("s, C, ⟦l4.0, 0.5\nc, 1.2, 0.6, 0.5\n", ["form.number"]),
    "lost exponent letter": ("s, C, 4.0, 0.5\nc, 1.2, 0.6, ⟦1.5-03\n", ["form.number"]),
    "typographic minus": ("s, C, 4.0, 0.5\nc, 1.2, ⟦−0.6, 0.5\n", ["form.number"]),
    "two points": ("s, C, 4.0, ⟦9.5.3\nc, 1.2, 0.6, 0.5\n", ["form.number"]),
    "not a number": ("s, C, 4.0, ⟦abc\nc, 1.2, 0.6, 0.5\n", ["form.number"]),
    "the only exponent": ("s, C, ⟦1x\n", ["form.number"]),
    "on one line": ("s,C,4.0,0.5;c,1.2,0.6,⟦O.5;c,⟦1.1;p,C,0,⟦5-\n",
                    ["form.number", "form.count", "form.number"]),
    "a comma is lost": ("s, C, 4.0 ⟦0.5\nc, 1.2, 0.6, 0.5\n", ["form.syntax"]),
    "a field is empty": ("s, C, 4.0, 0.5\nc, 1.2, ⟦0.6, , 0.5\n", ["form.syntax"]),
    "a comma at the end": ("s, C, 4.0, ⟦0.5,\nc, 1.2, 0.6, 0.5\n", ["form.syntax"]),
    "a comma after the letter is lost": ("⟦s C, 4.0, 0.5\np, C, 1.0\n", ["form.syntax"]),
    "unknown letter": ("⟦x, C, 4.0, 0.5\nc, 1.2, 0.6, 0.5\n", ["form.letter"]),
    "unknown element": ("s, ⟦Cx, 4.0, 0.5\nc, 1.2, 0.6, 0.5\n", ["form.element"]),
    "prose": ("s, C, 4.0, 0.5\nc, 1.2, 0.6, 0.5\n⟦see below\np, C, 1.0\n", ["form.syntax"]),
    "no exponents' statement": ("⟦c, 1.2, 0.6, 0.5\nc, 2.2, 1.0\ns, C, 1.0\n", ["form.syntax"]),
    "bare numbers": ("s, C, 4.0, 0.5\n⟦1.2, 0.6, 0.5\n", ["form.syntax"]),
    "element given twice": ("s, C, 1.0\ns, H, 1.0\n⟦s, C, 1.0\n", ["form.repeat"]),
    "a channel is lost": (ECP.replace("60, 1", "60, ⟦2"), ["form.count"]),
    "a term is lost": (ECP.replace("; 0, 4.0, -1.5", "").replace("2; 2", "⟦2; 2"), ["form.count"]),
    "a term too many": (ECP.replace("2; 2", "⟦1; 2"), ["form.count"]),
    "a count is lost": (ECP.replace("\n1; 2", "\n⟦1; 2").replace("\n2; 2", "\n2"), ["form.count"]),
    "the first count is lost": (ECP.replace("\n1; 2", "\n⟦2"), ["form.count"]),
    "a term's number is lost": (ECP.replace("2, 3.0, 15.0", "⟦2, 3.0"), ["form.count"]),
    "a term's number too many": (ECP.replace("15.0", "15.0, ⟦1.0"), ["form.count"]),
    "a term's slip": (ECP.replace("15.0", "⟦l5.0"), ["form.number"]),
    "the electrons are lost": (ECP.replace("ecp, Hg, 60, 1, 0", "⟦ecp, Hg, 60"), ["form.syntax"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    marked, rules = BROKEN[slip]
    broken.check("commas", f"basis={{\n{marked}}}\n", rules)


def test_a_section_that_is_not_closed() -> None:
    broken.check("commas", "⟦basis={\ns, C, 1.0\n", ["form.syntax"])


def test_a_slip_between_bare_statements() -> None:
    broken.check("commas", "s, C, 1.0\n⟦p. C, 1.0\nd, C, 1.0\n", ["form.syntax"])


def test_as_many_findings_as_faults() -> None:
    chosen = [marked for marked, _ in BROKEN.values() if "s, C, 4.0" in marked]
    rules = [rule for marked, found in BROKEN.values() if marked in chosen for rule in found]
    symbols = "H He Li Be B N O F Ne Na Mg Al Si P S Cl Ar K Ca Sc Ti V Cr Mn Fe Co".split()
    text = "".join(m.replace(" C,", f" {s},") for m, s in zip(chosen, symbols, strict=False))
    broken.check("commas", f"basis={{\n{text}}}\n", rules)
