"""Layout `stars`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.reading import read_text

SOUND = """\
spherical
! an invented set
****
C     0
S   3   1.00
     40.0      0.15
      7.0D0    .53
      2.1      +0.44
sp  1   1.00
      0.3      1.0      1.0
L=3 1
      0.8      1.0
****
Hg 0
S 1 1.00
 1.2 1.0
****
HG 0
HG-ECP 1 60
p-ul potential
 1
2 1.0 0.0
s-p potential
 2
2 3.0 15.0
0 4.0 -1.5
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "stars"
    assert not document.faults
    carbon, mercury = document.blocks
    assert carbon.functions == "spherical"
    assert carbon.names == ("s-1", "sp-1", "f-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1]
    assert carbon.shells[0].coefficients.tolist() == [[0.15], [0.53], [0.44]]
    assert carbon.shells[0].spelling(1) == "7.0D0"
    assert carbon.shells[0].place(2, 0) == (8, 16)
    assert mercury.potential is not None
    assert mercury.potential.electrons == 60
    assert [(c.l, c.local, c.powers) for c in mercury.potential.channels] == [
        (1, True, (2,)),
        (0, False, (2, 0)),
    ]
    assert [remark.text for remark in document.remarks] == ["an invented set"]


def test_line_ends_and_letter_case_do_not_matter() -> None:
    plain = read_text(SOUND)
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r"), SOUND.lower()):
        again = read_text(other)
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert [b.counts for b in again.blocks] == [b.counts for b in plain.blocks]
        assert again.blocks[0].shells[0].place(2, 0) == (8, 16)


def test_a_scale_factor_multiplies_exponents_by_its_square() -> None:
    document = read_text("H 0\nS 1 2.00\n 0.5 1.0\n****\n")
    assert document.blocks[0].shells[0].exponents.tolist() == [2.0]
    assert document.blocks[0].shells[0].spelling(0) == "0.5"


def test_letters_above_i_follow_the_file() -> None:
    with_j = "C 0\nI 1 1.0\n 1.0 1.0\nJ 1 1.0\n 1.0 1.0\nK 1 1.0\n 1.0 1.0\n****\n"
    assert list(read_text(with_j).blocks[0].counts) == [6, 7, 8]
    without = with_j.replace("J 1 1.0\n 1.0 1.0\n", "")
    assert list(read_text(without).blocks[0].counts) == [6, 7]


def test_an_l_shell_with_two_coefficients_is_s_and_p() -> None:
    document = read_text("C 0\nL 1 1.0\n 1.0 1.0 1.0\n****\n", layout="stars")
    assert document.blocks[0].shells[0].angular == (0, 1)


def test_a_list_of_elements_that_starts_again_is_a_second_set() -> None:
    once = "H 0\nS 1 1.0\n 1.0 1.0\n****\nHe 0\nS 1 1.0\n 2.0 1.0\n****\n"
    document = read_text(once + once.replace("1.0 1.0\n", "3.0 1.0\n"))
    assert [len(members.blocks) for members in document.sets] == [2, 2]
    assert [fault.severity for fault in document.faults] == ["note"]


BROKEN = {
    "a row is lost": ("C 0\nS ⟦3 1.00\n 4.0 0.6\n 0.5 0.5\n****\n", ["form.count"]),
    "a row too many": ("C 0\nS ⟦1 1.00\n 4.0 0.6\n 0.5 0.5\n****\n", ["form.count"]),
    "an absurd count": ("C 0\nS ⟦999999999999 1.00\n 4.0 0.6\n****\n", ["form.count"]),
    "no rows": ("C 0\n⟦S 3 1.00\nS 1 1.00\n 1.0 1.0\n****\n", ["form.count"]),
    "a coefficient is lost": ("C 0\nS 2 1.00\n 4.0 0.6\n ⟦0.5\n****\n", ["form.count"]),
    "a number too many": ("C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.5 ⟦0.1\n****\n", ["form.count"]),
    "the p column is lost": ("C 0\nSP 1 1.00\n 4.0 ⟦0.6\n****\n", ["form.count"]),
    "letter O": ("C 0\nS 2 1.00\n 4.0 0.6\n 0.5 ⟦O.5\n****\n", ["form.number"]),
    "letter O leads": ("C 0\nS 2 1.00\n 4.0 0.6\n ⟦O.5 0.5\n****\n", ["form.number"]),
    "letter l": ("C 0\nS 2 1.00\n 4.0 0.6\n ⟦l.5 0.5\n****\n", ["form.number"]),
    "decimal comma": ("C 0\nS 2 1.00\n 4.0 0.6\n 0.5 ⟦0,5\n****\n", ["form.number"]),
    "lost exponent letter": ("C 0\nS 2 1.00\n 4.0 ⟦1.5-03\n 0.5 0.5\n****\n", ["form.number"]),
    "overflowed field": ("C 0\nS 2 1.00\n ⟦******** 0.6\n 0.5 0.5\n****\n", ["form.number"]),
    "typographic minus": ("C 0\nS 2 1.00\n 4.0 ⟦−0.6\n 0.5 0.5\n****\n", ["form.number"]),
    "two points": ("C 0\nS 2 1.00\n 4.0 0.6\n ⟦9.532.939 0.5\n****\n", ["form.number"]),
    "numbers run together": ("C 0\nS 1 1.00\n 0.5 ⟦0.5-0.5\n****\n", ["form.number"]),
    "too large": ("C 0\nS 1 1.00\n ⟦1.0E+999 1.0\n****\n", ["form.number"]),
    "not finite": ("C 0\nS 1 1.00\n 1.0 ⟦nan\n****\n", ["form.number"]),
    "letter for the point": ("C 0\nS 1 1.00\n ⟦2g5 1.0\n****\n", ["form.number"]),
    "unknown element": ("⟦Cx 0\nS 1 1.00\n 1.0 1.0\n****\n", ["form.element"]),
    "unknown letter": ("C 0\n⟦X 1 1.00\n 1.0 1.0\n****\n", ["form.letter"]),
    "heading without count": ("C 0\n⟦S\n 1.0 1.0\n****\n", ["form.syntax"]),
    "prose in a block": ("C 0\nS 1 1.00\n 1.0 1.0\n⟦see below\n****\n", ["form.syntax"]),
    "rows without heading": ("C 0\n⟦1.0 1.0\nS 1 1.00\n 1.0 1.0\n****\n", ["form.syntax"]),
    "shell before any element": ("⟦S 1 1.00\n 1.0 1.0\n****\nC 0\nS 1 1.0\n 1.0 1.0\n****\n",
                                 ["form.syntax"]),
    "letter O in the heading": ("C ⟦O\nS 1 1.00\n 1.0 1.0\n****\n", ["form.number"]),
    "the heading's 0 is lost": ("⟦C\nS 1 1.00\n 1.0 1.0\n****\n", ["form.syntax"]),
    "element given twice": ("C 0\nS 1 1.00\n 1.0 1.0\n****\n⟦C 0\nS 1 1.00\n 1.0 1.0\n****\n",
                            ["form.repeat"]),
    "a channel is lost": ("HG 0\nHG-ECP ⟦2 60\nd-ul\n 1\n2 1.0 0.0\ns-d\n 1\n2 1.0 1.0\n",
                          ["form.count"]),
    "a channel without rows": ("HG 0\nHG-ECP ⟦1 60\np-ul\n 1\n2 1.0 0.0\n⟦s-p\n",
                               ["form.count", "form.count"]),
    "potential without numbers": ("HG 0\n⟦HG-ECP two 60\nd-ul\n 1\n2 1.0 0.0\n", ["form.syntax"]),
    "a term's number is lost": ("HG 0\nHG-ECP 0 2\ns-ul\n 1\n⟦2 1.0\n", ["form.count"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("stars", *BROKEN[slip])


def test_ten_faults_are_ten_findings() -> None:
    marked = "".join(BROKEN[slip][0] for slip in list(BROKEN)[:19])
    marked = marked.replace("C 0\n", "{} 0\n")
    symbols = "H He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K".split()
    rules = [rule for slip in list(BROKEN)[:19] for rule in BROKEN[slip][1]]
    broken.check("stars", marked.format(*symbols), rules)
