"""Layout `matrix`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text

SOUND = f"""\
! an invented set
{"C:INVENTED-5*":<80}
3.1 a title that begins with a number (3s,1p) -> [2s,1p]

  3
    0    0    1
    2    1    1
    3    1    1

     40.0    7.0D0
      .21E1

  0.15   0.0   ! wraps above
* a comment among the rows
  0.53
  0.0
 +0.44   1.0

      3.0

  1.0

      0.9

  1.0

HG:INVENTED-5*
title

1
0
1
1
 5.0
 1.0
*
HG:INVENTED-5*
# where the core comes from
*
   NCORE = 60 LMAX = 1
p
  0.0         2  1.0
s-p
  15.0        2  3.0
  -1.5        0  4.0
*
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "matrix"
    assert "C:INVENTED-5*" in document.reason
    assert not document.faults
    carbon, mercury = document.blocks
    assert (carbon.symbol, carbon.label, carbon.line) == ("C", "INVENTED-5*", 2)
    assert carbon.names == ("s-1", "s-2", "p-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1]
    assert carbon.shells[0].coefficients.tolist() == [[0.15, 0.0], [0.53, 0.0], [0.44, 1.0]]
    assert carbon.shells[1].exponents.tolist() == [3.0]
    assert carbon.shells[0].spellings()[0] == ["40.0", "7.0D0", ".21E1"]
    assert carbon.shells[0].spelling(2, 0) == "+0.44"
    assert carbon.shells[0].place(1) == (10, 14)
    assert carbon.shells[0].place(1, 1) == (16, 3)
    assert carbon.shells[2].place(0, 0) == (25, 3)
    assert mercury.potential is not None
    assert mercury.potential.electrons == 60
    assert [(c.l, c.local, c.powers) for c in mercury.potential.channels] == [
        (1, True, (2,)),
        (0, False, (2, 0)),
    ]
    assert [remark.text for remark in document.remarks][:4] == [
        "an invented set",
        "3.1 a title that begins with a number (3s,1p) -> [2s,1p]",
        "wraps above",
        "a comment among the rows",
    ]


def test_blank_lines_and_line_ends_do_not_matter() -> None:
    plain = read_text(SOUND)
    dense = "\n".join(line for line in SOUND.split("\n") if line.strip())
    for other in (SOUND.replace("\n", "\r\n"), SOUND.lower(), dense):
        document = read_text(other)
        assert not document.faults
        for block, before in zip(document.blocks, plain.blocks, strict=True):
            for shell, old in zip(block.shells, before.shells, strict=True):
                assert shell.exponents.tolist() == old.exponents.tolist()
                assert shell.coefficients.tolist() == old.coefficients.tolist()


def test_numbers_may_run_on_over_lines() -> None:
    document = read_text("C1:x\n\n 2 0 1\n 1 2 2 1\n\n4. .5 .6 .7 3. .1\n.2\n", layout="matrix")
    assert not document.faults
    s, p = document.blocks[0].shells
    assert (s.exponents.tolist(), s.coefficients.tolist()) == ([4.0, 0.5], [[0.6], [0.7]])
    assert (p.exponents.tolist(), p.coefficients.tolist()) == ([3.0], [[0.1, 0.2]])
    assert p.place(0) == (6, 13)
    assert p.place(0, 1) == (7, 1)


def test_names_make_sets() -> None:
    one = "{}:{}\nt\n\n 1\n 0\n 1\n 1\n\n 0.5\n\n 1.0\n\n"
    text = one.format("H", "a") + one.format("H", "b") + one.format("HE", "a")
    document = read_text(text)
    assert not document.faults
    assert [[b.symbol for b in members.blocks] for members in document.sets] == [["H", "He"], ["H"]]
    assert [members.label for members in document.sets] == ["a", "b"]


def test_core_potentials_alone_are_called_so() -> None:
    document = read_text("*\nHG:x\n# from there\n*\n NCORE = 60 LMAX = 0\ns\n 1.0 2 3.0\n*\n")
    assert document.layout == "matrix"
    assert document.blocks[0].potential is not None
    (fault,) = document.faults
    assert (fault.rule, fault.severity) == ("form.syntax", "note")
    assert "core potentials alone" in fault.message


def test_the_rest_of_an_input_is_left_alone() -> None:
    set_ = "C:x\nt\n\n 1\n 0\n 1\n 1\n\n 0.5\n\n 1.0\n"
    document = read_text(f"task: energy\n 1.0 2.0\n{set_}geometry\n 1.0 2.0 3.0\n")
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C"]


def test_what_the_layout_cannot_say_is_said() -> None:
    document = read_text(
        "spherical\n****\nC 0\nSP 1 1.0\n 0.5 1.0 1.0\n****\nC 0\nC-ECP 0 2\ns-ul\n 1\n2 1.0 1.0\n"
    )
    written = layouts()["matrix"].write(document)
    for word in ("spherical", "shared", "potentials"):
        assert any(word in loss for loss in written.losses)
    again = read_text(written.text)
    assert again.blocks[0].counts == {0: 1, 1: 1}
    assert again.blocks[0].potential is not None


def element(numbers: str, lists: str = " 2\n 0 1\n 2 1\n 3 1\n", name: str = "C:x") -> str:
    return f"{name}\nt\n\n{lists}\n{numbers}"


NUMBERS = " 4.0 2.0\n 1.0\n\n .1 .2\n .3 .4\n .5 .6\n\n 3.0\n\n 1.0\n"

BROKEN = {
    "an exponent is lost": (element(NUMBERS.replace(" 4.0 2.0", " ⟦4.0")), ["form.count"]),
    "a coefficient is lost": (element(NUMBERS.replace(".3 .4", "⟦.3")), ["form.count"]),
    "a number too many": (element(NUMBERS.replace(".3 .4", ".3 .4 ⟦.7")), ["form.count"]),
    "a row is lost": (element(NUMBERS.replace(" .1 .2\n .3", " ⟦.3")), ["form.count"]),
    "a row too many": (element(NUMBERS.replace(" .1", " ⟦.0 .0\n .1")), ["form.count"]),
    "primitives miscounted": (element(NUMBERS, " 2\n 0 1\n 2 1\n ⟦4 1\n"), ["form.count"]),
    "contractions miscounted": (element(NUMBERS, " 2\n 0 1\n ⟦3 1\n 3 1\n"), ["form.count"]),
    "an absurd count": (element(NUMBERS, " 2\n 0 1\n 2 1\n ⟦999999999999 1\n"), ["form.count"]),
    "matrices miscounted": (element(NUMBERS, " ⟦3\n 0 1\n 2 1\n 3 1\n"), ["form.count"]),
    "matrices not counted": (element(NUMBERS, " ⟦0 1\n 2 1\n 3 1\n"), ["form.count"]),
    "no matrix": (element("", " ⟦0\n"), ["form.count"]),
    "a list is short": (element(NUMBERS, " 2\n 0 1\n ⟦2\n 3 1\n"), ["form.count"]),
    "a list is long": (element(NUMBERS, " 2\n ⟦0 1 2\n 2 1\n 3 1\n"), ["form.count"]),
    "a list is lost": (element(NUMBERS, " ⟦2\n 0 1\n 3 1\n"), ["form.count"]),
    "no lists": (element(NUMBERS, "", "⟦C:x"), ["form.count"]),
    "nothing follows": ("⟦C:x\n" + element(NUMBERS, name="N:x"), ["form.count"]),
    "no numbers": (element("\n", " 2\n 0 1\n 2 1\n ⟦3 1\n"), ["form.count"]),
    "contractions of nothing": (element(NUMBERS, " 2\n 0 1\n 2 ⟦0\n 3 1\n"), ["form.count"]),
    "l beyond belief": (element(NUMBERS, " 2\n 0 ⟦91\n 2 1\n 3 1\n"), ["form.letter"]),
    "letter O in a list": (element(NUMBERS, " 2\n ⟦O 1\n 2 1\n 3 1\n"), ["form.number"]),
    "numbers left over": (element(NUMBERS + "\n ⟦1.0\n"), ["form.count"]),
    "a line runs on": (element(NUMBERS.replace("\n\n", "\n").replace(" 1.0\n .1 .2", "⟦1.0 .1\n .2")
                               .replace(" .6", "")), ["form.count"]),
    "the end is lost": (element(" 4.0 2.0\n 1.0\n .1 .2\n ⟦.3 .4\n"), ["form.count"]),
    "unknown element": (element(NUMBERS, name="⟦Cx:x"), ["form.element"]),
    "prose among the numbers": (element(NUMBERS.replace("\n\n .1", "\n⟦see below\n .1")),
                                ["form.syntax"]),
    "element given twice": (element(NUMBERS) + element(NUMBERS, name="⟦C:x"), ["form.repeat"]),
    "letter O": (element(NUMBERS.replace(".3 .4", ".3 ⟦.O")), ["form.number"]),
    "letter l leads": (element(NUMBERS.replace(" .3", " ⟦l.3")), ["form.number"]),
    "overflowed field": (element(NUMBERS.replace(" .3 .4", " ⟦**** .4")), ["form.number"]),
    "lost exponent letter": (element(NUMBERS.replace(".3 .4", ".3 ⟦.4-03")), ["form.number"]),
    "a channel is lost": ("HG:x\n ⟦NCORE = 60 LMAX = 1\np\n 1.0 2 3.0\n", ["form.count"]),
    "a core without numbers": ("HG:x\n ⟦NCORE = many\ns\n 1.0 2 3.0\n", ["form.syntax"]),
    "a term's number is lost": ("HG:x\n NCORE = 2 LMAX = 0\ns\n ⟦1.0 2\n", ["form.count"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("matrix", *BROKEN[slip])


def test_many_faults_are_all_found_once() -> None:
    slips = [slip for slip in BROKEN if BROKEN[slip][0].startswith("C:x\n")]
    slips.remove("element given twice")
    symbols = "H He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K Ca Sc Ti V Cr Mn Fe Co Ni Cu".split()
    assert 10 < len(slips) <= len(symbols)
    marked = "".join(
        BROKEN[slip][0].replace("C:x", f"{symbol}:x", 1)
        for slip, symbol in zip(slips, symbols, strict=False)
    )
    broken.check("matrix", marked, [rule for slip in slips for rule in BROKEN[slip][1]])
