"""Layout `sets`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text

SOUND = """\
# an invented set  (3s,2p) -> [1s,1p]
 C1 invented-szv  invented-szv-q4
   2
   1 0 1 3 2 1

      40.0      0.15D0    .10     0.60   # the tight one
       7.0      0.53      0.30    0.40
       2.1     +0.44      5.E-1   0.20
   2 3 3 1 1
       0.8      1.0

HG  invented-szv-q12
  1
  6 0 2 2 1 0 2
  1.5  0.7  0.3  0.1
  0.5  0.4  0.6  0.8
C   invented-dzv
  1
  1 0 0 1 1
  0.3  1.0
END
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "sets"
    assert "C1 invented-szv" in document.reason
    assert not document.faults
    carbon, mercury, again = document.blocks
    assert (carbon.symbol, carbon.label, carbon.line) == ("C", "invented-szv", 2)
    assert carbon.names == ("s-1", "p-1", "f-1")
    s, p, f = carbon.shells
    assert s.exponents.tolist() == p.exponents.tolist() == [40.0, 7.0, 2.1]
    assert s.coefficients.tolist() == [[0.15, 0.1], [0.53, 0.3], [0.44, 0.5]]
    assert p.coefficients.tolist() == [[0.6], [0.4], [0.2]]
    assert f.angular == (3,)
    assert mercury.counts == {0: 1, 2: 2}
    assert mercury.shells[1].coefficients.tolist() == [[0.3, 0.1], [0.6, 0.8]]
    assert [remark.text for remark in document.remarks] == [
        "an invented set  (3s,2p) -> [1s,1p]",
        "the tight one",
    ]
    assert again.label == "invented-dzv"


def test_numbers_have_their_places_in_shared_rows() -> None:
    s, p, _ = read_text(SOUND).blocks[0].shells
    assert (s.spelling(0, 0), s.spelling(2, 1), p.spelling(1, 0)) == ("0.15D0", "5.E-1", "0.40")
    assert s.place(2) == p.place(2) == (8, 8)
    assert s.place(2, 1) == (8, 27)
    assert p.place(2, 0) == (8, 35)
    assert p.spellings() == (["40.0", "7.0", "2.1"], [["0.60"], ["0.40"], ["0.20"]])


def test_names_make_sets() -> None:
    """Names that differ in the electrons kept belong together, one block for each element."""
    first, second = read_text(SOUND).sets
    assert [block.symbol for block in first.blocks] == ["C", "Hg"]
    assert [block.symbol for block in second.blocks] == ["C"]
    text = "".join(
        f"{symbol} name-q{q}\n 1\n 1 0 0 1 1\n 0.{q} 1.0\n"
        for symbol, q in [("Li", 3), ("Li", 1), ("Na", 9), ("Na", 1)]
    )
    document = read_text(text)
    assert not document.faults
    found = [[(b.symbol, b.label) for b in members.blocks] for members in document.sets]
    assert found[0] == [("Li", "name-q3"), ("Na", "name-q9")]
    assert found[1] == [("Li", "name-q1"), ("Na", "name-q1")]


def test_a_composition_among_the_names_is_no_name() -> None:
    document = read_text("H (1s) small small-q1\n 1\n 1 0 0 1 1\n 0.5 1.0\n")
    assert document.blocks[0].label == "small"


def test_line_ends_do_not_matter() -> None:
    for end in ("\r\n", "\r"):
        document = read_text(SOUND.replace("\n", end))
        assert {fault.rule for fault in document.faults} <= {"form.ending"}
        assert document.blocks[0].shells[1].place(2, 0) == (8, 35)


def test_rows_may_be_whole_numbers_or_wrapped() -> None:
    text = "C name\n 1\n 1 0 0 2 4\n 40 1 0 0 0\n 5 0 1 0 1\n"
    whole = read_text(text, layout="sets").blocks[0]
    assert whole.shells[0].coefficients.tolist() == [[1.0, 0, 0, 0], [0, 1.0, 0, 1.0]]
    document = read_text("C name\n 1\n 1 0 1 2 2 2\n 4. .1 .2 .3\n .4\n .5 .6 .7 .8\n .9\n")
    assert not document.faults
    p = document.blocks[0].shells[1]
    assert p.coefficients.tolist() == [[0.3, 0.4], [0.8, 0.9]]
    assert p.place(1, 1) == (7, 2)


def test_an_element_may_have_no_functions() -> None:
    document = read_text("H name\n 1\n 1 0 0 1 1\n 0.5 1.0\nSe name\n 0\n 4 0 0 0 0\n")
    assert [(f.severity, f.element) for f in document.faults] == [("note", "Se")]


def test_the_rest_of_an_input_is_left_alone() -> None:
    set_ = "C name\n 1\n 1 0 0 1 1\n 0.5 1.0\n"
    document = read_text(
        f"&TASK\n TITLE one\n 1.0 2.0\n&END\n{set_}END\n&CELL\n 5.0 5.0 5.0\n&END\n"
    )
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C"]


POTENTIALS = {
    "local parts": "H name-q1 name\n 1\n  0.20 2 -4.1 0.7\n 0\nC name-q4\n 2 2\n 0.33 2 -8.8 1.3\n"
    " 1\n 0.30 1 9.6\n",
    "core potentials": "# cores\nsome-name\nRb nelec 28\nRb ul\n2 1.0 0.0\nRb S\n2 5.0 89.5\n",
    "fitted": "&SOME_FIT_POT\nRADIUS 0.4\n2\n0.23 1.45\n0.27 1.09\n&END\n",
}


@pytest.mark.parametrize("kind", POTENTIALS)
def test_a_file_of_pseudopotentials_is_called_so(kind: str) -> None:
    document = read_text(POTENTIALS[kind])
    assert document.layout == "sets"
    assert not document.blocks
    (fault,) = document.faults
    assert (fault.rule, fault.severity) == ("form.syntax", "warning")
    assert "pseudopotentials, not a basis set" in fault.message
    assert fault.remedy


def test_shells_that_share_exponents_are_written_as_one_set() -> None:
    written = layouts()["sets"].write(read_text(SOUND))
    assert "\n  1 0 1 3 2 1\n" in written.text
    assert "5.E-1" in written.text
    assert not written.losses
    # Empty places among the angular momenta part a set in two.
    assert "\n  1 0 0 2 1\n" in written.text and "\n  1 2 2 2 2\n" in written.text


def test_what_the_layout_cannot_say_is_said() -> None:
    document = read_text(
        "spherical\n****\nC 0\nSP 1 1.0\n 0.5 1.0 1.0\n****\nC 0\nC-ECP 0 2\ns-ul\n 1\n2 1.0 1.0\n"
    )
    written = layouts()["sets"].write(document)
    assert "1 0 1 1 1 1" in written.text
    assert any("spherical" in loss for loss in written.losses)
    assert any("potentials" in loss for loss in written.losses)
    twice = "H 0\nS 1 1.0\n 1.0 1.0\n****\nHe 0\nS 1 1.0\n 2.0 1.0\n****\n"
    written = layouts()["sets"].write(read_text(twice + twice.replace("1.0\n*", "0.5\n*")))
    assert any("several sets" in loss for loss in written.losses)


BROKEN = {
    "a row is lost": ("C x\n 1\n 1 0 0 ⟦3 1\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "a row too many": ("C x\n 1\n 1 0 0 ⟦1 1\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "an absurd count": ("C x\n 1\n 1 0 0 ⟦999999999999 1\n 4.0 0.6\n", ["form.count"]),
    "no rows": ("C x\n 2\n ⟦1 0 0 3 1\n 1 1 1 1 1\n 4.0 0.6\n", ["form.count"]),
    "a coefficient is lost": ("C x\n 1\n 1 0 0 2 1\n 4.0 0.6\n ⟦0.5\n", ["form.count"]),
    "a number too many": ("C x\n 1\n 1 0 0 2 1\n 4.0 0.6\n 0.5 0.5 ⟦0.1\n", ["form.count"]),
    "contractions of an l are lost": ("C x\n 1\n 1 0 ⟦1 2 2\n 4.0 0.6 1.0\n 0.5 0.5 1.0\n",
                                      ["form.count"]),
    "contractions of an l too many": ("C x\n 1\n 1 0 ⟦0 2 1 1\n 4.0 0.6\n 0.5 0.5\n",
                                      ["form.count"]),
    "columns too many": ("C x\n 1\n 1 0 1 2 ⟦1 1\n 4.0 0.6 1.0 0.1\n 0.5 0.5 1.0 0.2\n",
                         ["form.count"]),
    "columns too few": ("C x\n 1\n 1 0 1 2 ⟦1 1\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "lowest l above the highest": ("C x\n 1\n 1 ⟦2 0 2 1\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "l beyond belief": ("C x\n 1\n 1 90 ⟦90 2 1\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "no contraction": ("C x\n 1\n 1 0 0 1 ⟦0\n 4.0\n", ["form.count"]),
    "a set is lost": ("C x\n ⟦3\n 1 0 0 1 1\n 4.0 1.0\n 1 1 1 1 1\n 4.0 1.0\n", ["form.count"]),
    "a set too many": ("C x\n ⟦1\n 1 0 0 1 1\n 4.0 1.0\n 1 1 1 1 1\n 4.0 1.0\n", ["form.count"]),
    "a heading between two sets is lost": ("C x\n 2\n 1 0 0 ⟦1 1\n 4.0 1.0\n 4.0 1.0\n",
                                           ["form.count"]),
    "the first heading is lost": ("C x\n 2\n ⟦4.0 1.0\n 1 1 1 1 1\n 4.0 1.0\n", ["form.syntax"]),
    "a heading is spoilt": ("C x\n 2\n 1 0 0 1 1\n 4.0 1.0\n⟦set two\n 4.0 1.0\n",
                            ["form.syntax"]),
    "the number of sets is lost": ("⟦C x\n 1 0 0 1 1\n 4.0 1.0\n", ["form.syntax"]),
    "the number of sets is a word": ("C x\n ⟦one\n 1 0 0 1 1\n 4.0 1.0\n", ["form.syntax"]),
    "nothing follows": ("⟦C X-1\nN X-1\n 1\n 1 0 0 1 1\n 4.0 1.0\n", ["form.count"]),
    "nothing follows at the end": ("N x\n 1\n 1 0 0 1 1\n 4.0 1.0\n⟦C X-1\n", ["form.count"]),
    "only the number of sets": ("N x\n 1\n 1 0 0 1 1\n 4.0 1.0\nC x\n ⟦2\n", ["form.count"]),
    "no name": ("⟦C\n 1\n 1 0 0 1 1\n 4.0 1.0\n", ["form.syntax"]),
    "unknown element": ("⟦Cx x\n 1\n 1 0 0 1 1\n 4.0 1.0\n", ["form.element"]),
    "name run together": ("⟦Cx-szv\n 1\n 1 0 0 1 1\n 4.0 1.0\n", ["form.element"]),
    "element's heading is lost": ("N x\n 1\n 1 0 0 1 1\n 4.0 1.0\n ⟦1\n 1 0 0 1 1\n 5.0 1.0\n",
                                  ["form.syntax"]),
    "prose among the sets": ("C x\n 2\n 1 0 0 1 1\n 4.0 1.0\n⟦see below\n 1 1 1 1 1\n 4.0 1.0\n",
                             ["form.syntax"]),
    "stars among the sets": ("C x\n 2\n 1 0 0 1 1\n 4.0 1.0\n⟦****\n 1 1 1 1 1\n 4.0 1.0\n",
                             ["form.syntax"]),
    "element given twice": ("C x\n 1\n 1 0 0 1 1\n 4.0 1.0\n⟦C x\n 1\n 1 0 0 1 1\n 4.0 1.0\n",
                            ["form.repeat"]),
    "letter O": ("C x\n 1\n 1 0 1 2 1 1\n 4.0 0.6 1.0\n 0.5 0.5 ⟦1.O\n", ["form.number"]),
    "letter l in the heading": ("C x\n 1\n ⟦l 0 0 2 1\n 4.0 0.6\n 0.5 0.5\n", ["form.number"]),
    "letter O in the heading": ("C x\n 1\n 1 0 ⟦O 2 1\n 4.0 0.6\n 0.5 0.5\n", ["form.number"]),
    "letters in a shared exponent": ("C x\n 1\n 1 0 1 2 1 1\n 4.0 0.6 1.0\n ⟦O.5 0.5 1.0\n",
                                     ["form.number"]),
    "overflowed field": ("C x\n 1\n 1 0 0 2 1\n 4.0 0.6\n 0.5 ⟦*****\n", ["form.number"]),
    "lost exponent letter": ("C x\n 1\n 1 0 0 2 1\n 4.0 0.6\n 0.5 ⟦5.0-01\n", ["form.number"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("sets", *BROKEN[slip])


def test_many_faults_are_all_found_once() -> None:
    slips = [slip for slip in BROKEN if BROKEN[slip][0].startswith("C x\n")]
    slips.remove("element given twice")
    symbols = "H He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K Ca Sc Ti V Cr Mn Fe Co Ni Cu".split()
    assert 10 < len(slips) <= len(symbols)
    marked = "".join(
        BROKEN[slip][0].replace("C x", f"{symbol} x", 1)
        for slip, symbol in zip(slips, symbols, strict=False)
    )
    broken.check("sets", marked, [rule for slip in slips for rule in BROKEN[slip][1]])


def test_a_bad_number_spoils_only_the_shells_that_use_it() -> None:
    text = "C x\n 1\n 1 0 1 2 1 1\n 4.0 0.6 1.0\n 0.5 0.5 {}\n"
    document = read_text(text.format("*****"))
    (block,) = document.blocks
    assert block.names == ("s-1",)
    assert not block.complete
    assert [(f.rule, f.shell) for f in document.faults] == [("form.number", "p-1")]
