"""Layout `at-blocks`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text

SOUND = """\
@BASIS_SET INVENTED_D_  !INVENTED(D)

@ATOMBASIS C
S 3  1
4.0e+01  1.5e-01
7.0D0    .53     !a remark
2.1      +0.44

P 2  2
 3.0  0.6  0.0
 0.5  0.5  1.0
d 1
 0.8  1.0
@END

@atombasis HG
S 1  1
1.2e+00  1.0e+00
@END
0123456789abcdef0123456789abcdef"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "at-blocks"
    assert not document.faults
    carbon, mercury = document.blocks
    assert [members.label for members in document.sets] == ["INVENTED(D)"]
    assert carbon.names == ("s-1", "p-1", "d-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1]
    assert carbon.shells[0].coefficients.tolist() == [[0.15], [0.53], [0.44]]
    assert carbon.shells[1].coefficients.tolist() == [[0.6, 0.0], [0.5, 1.0]]
    assert carbon.shells[0].spelling(1) == "7.0D0"
    assert carbon.shells[0].place(2, 0) == (7, 10)
    assert carbon.shells[1].place(1, 1) == (11, 12)
    assert mercury.counts == {0: 1}
    assert [remark.text for remark in document.remarks] == ["INVENTED(D)", "a remark"]


def test_line_ends_and_letter_case_do_not_matter() -> None:
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r"), SOUND.lower()):
        again = read_text(other)
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert [block.counts for block in again.blocks] == [{0: 1, 1: 2, 2: 1}, {0: 1}]
        assert again.blocks[0].shells[1].place(1, 1) == (11, 12)


def test_blocks_inside_a_larger_deck_are_found() -> None:
    deck = "@JOB\nC 1 0\n 0.0 0.0 1.4\n@END\n" + SOUND + "\n@GRID\n 75 302\n@END\n"
    document = read_text(deck)
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C", "Hg"]


def test_two_named_lists_are_two_sets() -> None:
    document = read_text(SOUND + "\n" + SOUND.replace("INVENTED", "OTHER"))
    assert not document.faults
    assert [members.label for members in document.sets] == ["INVENTED(D)", "OTHER(D)"]


def test_an_unwritable_part_is_said() -> None:
    text = (
        "spherical\n****\nC 0\nSP 1 1.0\n 1.0 0.5 0.5\n****\nC 0\nC-ECP 0 2\ns-ul\n1\n2 1.0 1.0\n"
    )
    written = layouts()["at-blocks"].write(read_text(text, layout="stars"))
    assert [loss.split(" (")[0] for loss in written.losses] == [
        "the layout has no flag for spherical or Cartesian functions",
        "shared s and p exponents are written as an s and a p shell",
        "core potentials are left out",
    ]


BROKEN = {
    "a row is lost": ("@ATOMBASIS C\nS ⟦3  1\n4.0 0.6\n0.5 0.5\n@END\n", ["form.count"]),
    "a row too many": ("@ATOMBASIS C\nS ⟦1  1\n4.0 0.6\n0.5 0.5\n@END\n", ["form.count"]),
    "an absurd count": ("@ATOMBASIS C\nS ⟦99999999999999999999  1\n4.0 0.6\n@END\n",
                        ["form.count"]),
    "no rows": ("@ATOMBASIS C\n⟦S 3  1\nP 1  1\n1.0 1.0\n@END\n", ["form.count"]),
    "a coefficient is lost": ("@ATOMBASIS C\nS 2  1\n4.0 0.6\n⟦0.5\n@END\n", ["form.count"]),
    "a number too many": ("@ATOMBASIS C\nS 2  1\n4.0 0.6\n0.5 0.5 ⟦0.1\n@END\n", ["form.count"]),
    "one row of two columns is short": ("@ATOMBASIS C\nS 2  2\n4.0 0.6 0.1\n0.5 ⟦0.5\n@END\n",
                                        ["form.count"]),
    "a column is lost": ("@ATOMBASIS C\nS 2  ⟦2\n4.0 0.6\n0.5 0.5\n@END\n", ["form.count"]),
    "a column too many": ("@ATOMBASIS C\nS 2  ⟦1\n4.0 0.6 0.1\n0.5 0.5 0.2\n@END\n",
                          ["form.count"]),
    "letter O": ("@ATOMBASIS C\nS 2  1\n4.0 0.6\n0.5 ⟦O.5\n@END\n", ["form.number"]),
    "decimal comma": ("@ATOMBASIS C\nS 1  1\n0.5 ⟦0,5\n@END\n", ["form.number"]),
    "lost exponent letter": ("@ATOMBASIS C\nS 1  1\n0.5 ⟦1.5-03\n@END\n", ["form.number"]),
    "overflowed field": ("@ATOMBASIS C\nS 1  1\n⟦******** 0.6\n@END\n", ["form.number"]),
    "unknown element": ("@ATOMBASIS ⟦Cx\nS 1  1\n1.0 1.0\n@END\n", ["form.element"]),
    "no element": ("⟦@ATOMBASIS\nS 1  1\n1.0 1.0\n@END\n", ["form.element"]),
    "unknown letter": ("@ATOMBASIS C\n⟦X 1  1\n1.0 1.0\n@END\n", ["form.letter"]),
    "heading without count": ("@ATOMBASIS C\n⟦S\n1.0 1.0\n@END\n", ["form.syntax"]),
    "rows without heading": ("@ATOMBASIS C\n⟦1.0 1.0\nS 1  1\n1.0 1.0\n@END\n", ["form.syntax"]),
    "prose in a block": ("@ATOMBASIS C\nS 1  1\n1.0 1.0\n⟦see below\n@END\n", ["form.syntax"]),
    "prose among the rows": ("@ATOMBASIS C\nS 2  1\n1.0 1.0\n⟦see below\n0.5 1.0\n@END\n",
                             ["form.syntax"]),
    "prose below the heading": ("@ATOMBASIS C\nS 1  1\n⟦see below\n1.0 1.0\n@END\n",
                                ["form.syntax"]),
    "numbers run together": ("@ATOMBASIS C\nS 1  1\n⟦5.0e-018.0e-01\n@END\n", ["form.number"]),
    "the end is lost": ("⟦@ATOMBASIS C\nS 1  1\n1.0 1.0\n@ATOMBASIS N\nS 1  1\n1.0 1.0\n@END\n",
                        ["form.syntax"]),
    "the heading is lost": ("@ATOMBASIS C\nS 1  1\n1.0 1.0\n@END\n⟦S 1  1\n2.0 1.0\n"
                            "P 1  1\n2.0 1.0\n@END\n", ["form.syntax"]),
    "the keyword is misspelt": ("@ATOMBASIS C\nS 1  1\n1.0 1.0\n@END\n"
                                "⟦@ATOMBASS N\nS 1  1\n2.0 1.0\n@END\n", ["form.syntax"]),
    "element given twice": ("@ATOMBASIS C\nS 1  1\n1.0 1.0\n@END\n"
                            "⟦@ATOMBASIS C\nS 1  1\n1.0 1.0\n@END\n", ["form.repeat"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("at-blocks", *BROKEN[slip])


def test_many_faults_are_all_found_once() -> None:
    slips = [slip for slip in BROKEN if BROKEN[slip][0].startswith("@ATOMBASIS C\n")][:14]
    marked = "".join(BROKEN[slip][0] for slip in slips)
    marked = marked.replace("@ATOMBASIS C\n", "@ATOMBASIS {}\n")
    symbols = "H He Li Be B C N O F Ne Na Mg Al Si P S".split()
    rules = [rule for slip in slips for rule in BROKEN[slip][1]]
    broken.check("at-blocks", marked.format(*symbols), rules)
