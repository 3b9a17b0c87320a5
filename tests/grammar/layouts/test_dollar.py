"""Layout `dollar`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.reading import read_text

SOUND = """\
$title
somebody's own input
$basis
*
c hill
# c  (4s1p) / [2s1p]   {31/1}
*
   3  s
  40.0   0.15
   7.0D0 .53
   2.1   +0.44
   1  s
   0.3   1.0
   1  p
   0.4   1.0
*
hg hill
*
   1  s
   1.2   1.0
*
$ecp
*
hg hill-ecp
*
  ncore = 60   lmax = 1
p
   1.0  2  3.0
s-p
   5.0  2  1.0
  -1.0  0  2.0
*
$jbas
*
c dale
*
   1 s
   0.9  1.0
*
$end
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "dollar"
    assert not document.faults
    orbital, fitting = document.sets
    assert (orbital.label, orbital.role) == ("hill", "orbital")
    assert (fitting.label, fitting.role) == ("dale", "fitting")
    carbon, mercury = orbital.blocks
    assert carbon.names == ("s-1", "s-2", "p-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1]
    assert carbon.shells[0].spelling(1) == "7.0D0"
    assert carbon.shells[0].place(2, 0) == (11, 10)
    assert mercury.potential is not None
    assert mercury.potential.electrons == 60
    assert [(c.l, c.local, c.powers) for c in mercury.potential.channels] == [
        (1, True, (2,)),
        (0, False, (2, 0)),
    ]
    assert mercury.potential.channels[0].exponents.tolist() == [3.0]
    assert mercury.potential.channels[0].coefficients.tolist() == [1.0]


def test_letter_case_does_not_matter() -> None:
    upper = read_text(SOUND.upper())
    assert not upper.faults
    assert [block.symbol for block in upper.blocks] == ["C", "Hg", "C"]


OPEN, CLOSE = "$basis\n*\nc x\n*\n", "*\n$end\n"
BROKEN = {
    "a row is lost": (f"{OPEN}⟦3 s\n 4.0 0.6\n 0.5 0.5\n{CLOSE}", ["form.count"]),
    "a row too many": (f"{OPEN}⟦1 s\n 4.0 0.6\n 0.5 0.5\n{CLOSE}", ["form.count"]),
    "no rows": (f"{OPEN}⟦2 s\n1 s\n 0.5 1.0\n{CLOSE}", ["form.count"]),
    "a coefficient is lost": (f"{OPEN}2 s\n 4.0 0.6\n ⟦0.5\n{CLOSE}", ["form.count"]),
    "a number too many": (f"{OPEN}2 s\n 4.0 0.6\n 0.5 0.5 ⟦0.1\n{CLOSE}", ["form.count"]),
    "letter O": (f"{OPEN}1 s\n 0.5 ⟦O.5\n{CLOSE}", ["form.number"]),
    "letter O leads": (f"{OPEN}1 s\n ⟦O.5 0.5\n{CLOSE}", ["form.number"]),
    "lost exponent letter": (f"{OPEN}1 s\n 0.5 ⟦1.5-03\n{CLOSE}", ["form.number"]),
    "overflowed field": (f"{OPEN}1 s\n 0.5 ⟦*****\n{CLOSE}", ["form.number"]),
    "unknown element": ("$basis\n*\n⟦cx x\n*\n1 s\n 0.5 1.0\n*\n$end\n", ["form.element"]),
    "unknown letter": (f"{OPEN}1 ⟦x\n 0.5 1.0\n{CLOSE}", ["form.letter"]),
    "rows without heading": (f"{OPEN}⟦0.5 1.0\n1 s\n 0.5 1.0\n{CLOSE}", ["form.syntax"]),
    "the star after the heading is lost": ("$basis\n*\n⟦c x\n1 s\n 0.5 1.0\n*\n$end\n",
                                           ["form.syntax"]),
    "the element's heading is lost": ("$basis\n*\n⟦1 s\n 0.5 1.0\n*\n$end\n", ["form.syntax"]),
    "section not closed": ("⟦$basis\n*\nc x\n*\n1 s\n 0.5 1.0\n*\n", ["form.syntax"]),
    "element given twice": (f"{OPEN}1 s\n 0.5 1.0\n*\n⟦c x\n*\n1 s\n 0.5 1.0\n{CLOSE}",
                            ["form.repeat"]),
    "core is no number": ("$ecp\n*\nhg x\n*\n⟦ncore = two\ns\n 1.0 2 3.0\n*\n$end\n",
                          ["form.syntax", ]),
    "a channel is lost": ("$ecp\n*\nhg x\n*\n⟦ncore = 60 lmax = 2\nd\n 1.0 2 3.0\n*\n$end\n",
                          ["form.count"]),
    "a term's number is lost": ("$ecp\n*\nhg x\n*\nncore = 60 lmax = 0\ns\n⟦1.0 2\n*\n$end\n",
                                ["form.count"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("dollar", *BROKEN[slip])
