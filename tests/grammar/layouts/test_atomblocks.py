"""Layout `atomblocks`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text

SOUND = """\
$ Basis = invented
$
************************************************
a 6
$ CARBON    (4s,2p) -> [2s,1p]
$ CARBON    (1p)
$ s-type functions
    4    2    0
     40.0      0.15
     0.00
      7.0D0     .53
     0.00   $ a remark
      2.1      +0.44
     0.00

      0.3      0.00   1.00
$ p-type functions
    2    1    0
      3.0   0.60
      0.5   0.50
$ d-type functions
    0    0    0
$ f-type functions
    2    0    0
      0.8
      0.2
A  80
    1    0
      1.5   1.0
$ p-type functions
    3    2    ! the exponents first
      9.0   3.0   1.0
      1     0
      0     1
      0     1
a8
    1    1    0
      2.5   1.0
$
a  80
$
    1   60
           1
 2      1.000000000000      0.000000000000
           2
 2      3.0       15.0
 0      4         -1.5
$ END
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "atomblocks"
    assert not document.faults
    carbon, mercury, oxygen = document.blocks
    assert (carbon.symbol, mercury.symbol, oxygen.symbol) == ("C", "Hg", "O")
    assert carbon.names == ("s-1", "p-1", "f-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1, 0.3]
    assert carbon.shells[0].coefficients[:, 0].tolist() == [0.15, 0.53, 0.44, 0.0]
    assert carbon.shells[0].coefficients[:, 1].tolist() == [0.0, 0.0, 0.0, 1.0]
    assert carbon.shells[2].coefficients.tolist() == [[1.0, 0.0], [0.0, 1.0]]
    assert carbon.shells[0].spelling(1) == "7.0D0"
    assert carbon.shells[0].place(3, 1) == (16, 23)
    assert carbon.shells[0].spellings()[1][0] == ["0.15", "0.00"]
    assert "(4s,2p) -> [2s,1p]" in [remark.text[-18:] for remark in document.remarks]


def test_exponents_may_stand_alone_or_first() -> None:
    mercury = read_text(SOUND).blocks[1]
    assert mercury.shells[0].exponents.tolist() == [1.5]
    assert mercury.shells[0].coefficients.tolist() == [[1.0]]
    assert mercury.shells[1].exponents.tolist() == [9.0, 3.0, 1.0]
    assert mercury.shells[1].coefficients.tolist() == [[1.0, 0.0], [0.0, 1.0], [0.0, 1.0]]
    assert mercury.shells[1].place(2) == (32, 19)
    assert mercury.shells[1].place(1, 1) == (34, 13)


def test_a_potential_joins_its_element() -> None:
    potential = read_text(SOUND).blocks[1].potential
    assert potential is not None
    assert potential.electrons == 60
    assert [(c.l, c.local, c.powers) for c in potential.channels] == [
        (1, True, (2,)),
        (0, False, (2, 0)),
    ]
    assert potential.channels[1].coefficients.tolist() == [15.0, -1.5]


def test_a_file_of_potentials_alone_is_named_so() -> None:
    document = read_text(SOUND[SOUND.index("a  80\n$\n") :])
    assert document.layout == "atomblocks"
    assert "core potentials" in document.reason
    assert not document.faults
    assert [(block.symbol, block.shells) for block in document.blocks] == [("Hg", ())]


def test_line_ends_and_letter_case_do_not_matter() -> None:
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r"), SOUND.upper()):
        again = read_text(other)
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert again.blocks[0].counts == {0: 2, 1: 1, 3: 2}
        assert again.blocks[0].shells[0].place(3, 1) == (16, 23)


@pytest.mark.parametrize(
    ("table", "exponents", "column"),
    [
        ("9.0 0.1\n3.0 0.2\n1.0 0.3\n", [9.0, 3.0, 1.0], [0.1, 0.2, 0.3]),
        ("9.0 3.0 1.0\n0.1 0.2 0.3\n", [9.0, 3.0, 1.0], [0.1, 0.2, 0.3]),
        ("9.0 3.0\n1.0 0.1\n-0.2 0.3\n", [9.0, 3.0, 1.0], [0.1, -0.2, 0.3]),
        ("9.0 -0.1\n3.0 0.2\n1.0 0.3\n", [9.0, 3.0, 1.0], [-0.1, 0.2, 0.3]),
    ],
)  # fmt: skip
def test_two_numbers_in_the_heading_leave_the_order_open(
    table: str, exponents: list[float], column: list[float]
) -> None:
    document = read_text(f"a 6\n 3 1\n{table}")
    assert not document.faults
    (shell,) = document.blocks[0].shells
    assert shell.exponents.tolist() == exponents
    assert shell.coefficients[:, 0].tolist() == column


def test_numbers_run_together_by_fixed_columns_are_parted() -> None:
    once = "a 6\n 2 2 0\n 4.0 6.9313415862-2.009993865\n 0.5 0.5 1.0D-1\n"
    document = read_text(once)
    assert [(f.rule, f.severity) for f in document.faults] == [("form.number", "warning")]
    assert document.faults[0].expected == "6.9313415862 -2.009993865"
    (shell,) = document.blocks[0].shells
    assert shell.coefficients.tolist() == [[6.9313415862, -2.009993865], [0.5, 0.1]]
    assert shell.place(0, 1) == (3, 18)
    habit = read_text(once.replace("0.5 0.5 1.0D-1", "0.5-0.5-1.0D-1").replace("4.0 6", "4.0+6"))
    assert [(f.rule, f.severity) for f in habit.faults] == [("form.number", "warning")] * 2
    habit = read_text(habit.source.text + "a 7\n 1 1 0\n 3.0+1.0\n")
    assert [(f.rule, f.severity) for f in habit.faults] == [("form.number", "note")]


def test_a_one_behind_each_uncontracted_exponent_is_no_fault() -> None:
    document = read_text("a 6\n 2 0 0\n 4.0 1.0\n 0.5 1.0\n")
    assert not document.faults
    assert document.blocks[0].shells[0].coefficients.tolist() == [[1.0, 0.0], [0.0, 1.0]]
    assert document.blocks[0].shells[0].place(1) == (4, 2)


def test_a_wrong_comment_does_not_move_a_table() -> None:
    text = BROKEN["a comment of another l"][0].replace(broken.MARK, "")
    assert read_text(text, layout="atomblocks").blocks[0].names == ("s-1", "p-1", "d-1")


def test_very_many_uncontracted_exponents_are_shells_of_their_own() -> None:
    exponents = [3000.0 - at for at in range(1500)]
    document = read_text("a 6\n 1500 0 0\n" + "\n".join(map(str, exponents)) + "\n")
    assert not document.faults
    assert [shell.exponents.tolist() for shell in document.blocks[0].shells] == [
        [exponent] for exponent in exponents
    ]
    assert document.blocks[0].shells[5].spelling(0) == "2995.0"
    assert document.blocks[0].shells[5].place(0, 0) == (8, 1)


def test_pasted_lines_and_what_follows_in_a_deck_are_passed_over() -> None:
    deck = "BASIS\n/C.name.4s.1s.\nfrom a journal\na 6\nby somebody\n 1 1 0\n 4.0 1.0\n"
    deck += "GRID OF POINTS AND WEIGHTS\n 1.0 2.0 3.0\n 75 302\n"
    document = read_text(deck)
    assert [fault.severity for fault in document.faults] == ["note"]
    assert [block.counts for block in document.blocks] == [{0: 1}]


def test_shells_that_share_exponents_become_one_table() -> None:
    text = (
        "C 0\nS 3 1.0\n 9.0 0.1\n 3.0 0.2\n 1.0 0.3\nS 1 1.0\n 1.0 1.0\nS 1 1.0\n 5.0 1.0\n****\n"
    )
    written = layouts()["atomblocks"].write(read_text(text, layout="stars"))
    assert "    4    3    0\n" in written.text
    assert written.losses == ("the shells of one angular momentum become one table (C)",)
    (shell,) = read_text(written.text).blocks[0].shells
    assert shell.exponents.tolist() == [9.0, 5.0, 3.0, 1.0]


BROKEN = {
    "a row is lost": ("a 6\n ⟦3 1 0\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "a row too many": ("a 6\n ⟦1 1 0\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "an absurd count": ("a 6\n ⟦99999999999999999999 1 0\n 4.0 0.6\n", ["form.count"]),
    "no rows": ("a 6\n ⟦3 1 0\n 1 1 0\n 1.0 1.0\n", ["form.count"]),
    "a coefficient is lost": ("a 6\n 3 1 0\n 4.0 0.6\n ⟦1.0\n 0.5 0.1\n", ["form.count"]),
    "a number too many": ("a 6\n 2 1 0\n 4.0 0.6\n 0.5 0.5 ⟦0.1\n", ["form.count"]),
    "a column is lost": ("a 6\n 2 ⟦2 0\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "a column too many": ("a 6\n 2 ⟦1 0\n 4.0 0.6 0.1\n 0.5 0.5 0.2\n", ["form.count"]),
    "a wrapped row is short": ("a 6\n 2 4 0\n 4.0 0.6 0.1\n 0.2 0.3\n 0.5 0.5 0.1\n ⟦0.2\n",
                               ["form.count"]),
    "a line of a wrapped row is lost": (
        "a 6\n 3 4 0\n 4.0 0.6 0.1 0.1\n 0.3\n 0.5 0.5 0.1 0.1\n ⟦0.4 0.5 0.1 0.1\n 0.1\n",
        ["form.count"]),
    "a number too many in a wrapped row": (
        "a 6\n 3 4 0\n 4.0 0.6 0.1 ⟦0.1\n 0.2 0.3\n 0.5 0.5 0.1\n 0.2 0.2\n"
        " 0.4 0.5 0.1\n 0.1 0.2\n",
        ["form.count"]),
    "a heading is lost without a comment": (
        "a 6\n 2 2 0\n 9.0 1.0 0.0\n 4.0 0.0 1.0\n ⟦1.0 1.0\n 0.5 0.5\n 1 1 0\n 0.5 1.0\n",
        ["form.syntax"]),
    "a list lacks an exponent": ("a 6\n 2 2\n 8.0 4.0\n 1.0 0.0\n 0.0 1.0\n ⟦3 2\n 9.0 3.0\n"
                                 " 1.0 0.0\n 0.0 1.0\n 0.0 1.0\n", ["form.count"]),
    "a list lacks a row": ("a 6\n 2 2\n 8.0 4.0\n 1.0 0.0\n 0.0 1.0\n ⟦3 2\n 9.0 3.0 1.0\n"
                           " 1.0 0.0\n 0.0 1.0\n", ["form.count"]),
    "letter O": ("a 6\n 2 1 0\n 4.0 0.6\n 0.5 ⟦O.5\n", ["form.number"]),
    "letter O in the heading": ("a 6\n 2 ⟦1O 0\n 4.0 1 2 3 4 5 6 7 8 9 10\n"
                                " 0.5 1 2 3 4 5 6 7 8 9 10\n", ["form.number"]),
    "decimal comma": ("a 6\n 1 1 0\n 0.5 ⟦0,5\n", ["form.number"]),
    "lost exponent letter": ("a 6\n 1 1 0\n 0.5 ⟦1.5-03\n", ["form.number"]),
    "overflowed field": ("a 6\n 2 1 0\n 4.0 0.6\n ⟦******** 0.6\n", ["form.number"]),
    "numbers that cannot be parted": ("a 6\n 1 2 0\n 1.0 ⟦9.53220000.93980000\n",
                                      ["form.number"]),
    "no such element": ("⟦a 119\n 1 1 0\n 1.0 1.0\n", ["form.element"]),
    "no atomic number": ("⟦a\n 1 1 0\n 1.0 1.0\n", ["form.element"]),
    "a symbol for the number": ("⟦a C\n 1 1 0\n 1.0 1.0\n", ["form.element"]),
    "another letter": ("a 6\n 1 1 0\n 1.0 1.0\n⟦b 7\n 1 1 0\n 1.0 1.0\n", ["form.syntax"]),
    "a heading is lost": ("a 6\n$ s-type\n 1 1 0\n 9.0 1.0\n$ p-type\n ⟦1.0 1.0\n$ d-type\n"
                          " 1 1 0\n 0.5 1.0\n", ["form.syntax"]),
    "a table is lost": ("a 6\n$ s-type\n 1 1 0\n 9.0 1.0\n$ d-type\n ⟦1 1 0\n 1.0 1.0\n",
                        ["form.syntax"]),
    "an element's heading is lost": ("a 6\n$ s-type\n 1 1 0\n 9.0 1.0\n$ s-type\n ⟦1 1 0\n"
                                     " 1.0 1.0\n$ p-type\n 1 1 0\n 2.0 1.0\n", ["form.syntax"]),
    "a table twice": ("a 6\n$ s-type\n 1 1 0\n 9.0 1.0\n$ p-type\n 1 1 0\n 1.0 1.0\n$ p-type\n"
                      " ⟦1 1 0\n 1.0 1.0\n", ["form.syntax"]),
    "a comment of another l": ("a 6\n$ s-type\n 1 1 0\n 9.0 1.0\n$ d-type\n ⟦1 1 0\n 1.0 1.0\n"
                               "$ d-type\n 1 1 0\n 1.0 1.0\n", ["form.syntax"]),
    "a table twice and more": (
        "a 6\n$ s-type\n 1 1 0\n 9.0 1.0\n$ p-type\n 1 1 0\n 9.0 1.0\n$ p-type\n ⟦1 1 0\n"
        " 9.0 1.0\n$ d-type\n 1 1 0\n 1.0 1.0\n", ["form.syntax"]),
    "half a heading": ("a 6\n ⟦2\n 1.0 1.0\n 0.5 1.0\n", ["form.syntax"]),
    "a damaged heading": ("a 6\n 1 1 0\n 9.0 1.0\n⟦x 1 0\n 1.0 1.0\n", ["form.syntax"]),
    "rows without heading": ("a 6\n ⟦1.0 1.0\n 1 1 0\n 1.0 1.0\n", ["form.syntax"]),
    "prose among the rows": ("a 6\n 2 1 0\n 1.0 1.0\n⟦see below\n 0.5 1.0\n", ["form.syntax"]),
    "prose below the heading": ("a 6\n 1 1 0\n⟦see below\n 0.5 1.0\n", ["form.syntax"]),
    "a row that is none": ("a 6\n 3 1 0\n 1.0 1.0\n ⟦?.8 1.0\n 0.5 1.0\n", ["form.number"]),
    "element given twice": ("a 6\n 1 1 0\n 1.0 1.0\n⟦a 6\n 1 1 0\n 1.0 1.0\n", ["form.repeat"]),
    "a channel is lost": ("a 80\n ⟦2 60\n 1\n 2 1.0 0.0\n 1\n 2 3.0 1.0\n", ["form.count"]),
    "a term is lost": ("a 80\n 0 60\n ⟦2\n 2 1.0 0.0\n", ["form.count"]),
    "a channel's count is lost": ("a 80\n 1 60\n ⟦1\n 2 1.0 0.0\n 2 3.0 1.0\n", ["form.count"]),
    "a term's number is lost": ("a 80\n 0 60\n 2\n 2 1.0 0.0\n ⟦2 3.0\n", ["form.count"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("atomblocks", *BROKEN[slip])


def test_many_faults_are_all_found_once() -> None:
    slips = [slip for slip in BROKEN if BROKEN[slip][0].startswith("a 6\n")]
    slips = [slip for slip in slips if slip not in ("another letter", "element given twice")]
    marked = "".join(
        BROKEN[slip][0].replace("a 6\n", f"a {z}\n") for z, slip in enumerate(slips, 1)
    )
    rules = [rule for slip in slips for rule in BROKEN[slip][1]]
    broken.check("atomblocks", marked, rules)
