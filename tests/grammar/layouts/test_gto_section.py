"""Layout `gto-section`: what is read, and where faults are found."""

import broken
import pytest

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text

SOUND = """\
[Header of a larger file]
[Title]
 invented
[Atoms] AU
 C    1   6   0.0  0.0  0.0
 h    2   1   0.0  0.0  2.0
 H2   3   1   0.0  2.0  0.0
[GTO]
  1 0
 s   3 1.00
   0.400000E+02   0.150000D+00
   7.0            .53
   2.1            +0.44
 sp  1
   0.3      1.0      1.0
 d   1 1.00
   0.8      1.0

  2 0
 s   1 1.00
   1.2      1.0

  3 0
 s   1 1.00
   1.2      1.0

[5D]
[MO]
 Ene= 0.5
 1  O.5
 2  0.5 0.5
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "gto-section"
    assert not document.faults
    assert not document.raw_primitives
    carbon, hydrogen = document.blocks
    assert carbon.functions == hydrogen.functions == "spherical"
    assert carbon.names == ("s-1", "sp-1", "d-1")
    assert carbon.shells[0].exponents.tolist() == [40.0, 7.0, 2.1]
    assert carbon.shells[0].coefficients.tolist() == [[0.15], [0.53], [0.44]]
    assert carbon.shells[1].angular == (0, 1)
    assert carbon.shells[0].spelling(0, 0) == "0.150000D+00"
    assert carbon.shells[0].place(2, 0) == (13, 19)
    assert (hydrogen.symbol, hydrogen.line) == ("H", 19)


def test_line_ends_and_letter_case_do_not_matter() -> None:
    plain = read_text(SOUND)
    for other in (SOUND.replace("\n", "\r\n"), SOUND.replace("\n", "\r"), SOUND.upper()):
        again = read_text(other)
        assert {fault.rule for fault in again.faults} <= {"form.ending"}
        assert [b.counts for b in again.blocks] == [b.counts for b in plain.blocks]
        assert again.blocks[0].shells[0].place(2, 0) == (13, 19)


@pytest.mark.parametrize(
    ("flags", "shells", "functions"),
    [
        ("", "d f g", "cartesian"),
        ("[5D]", "d f", "spherical"),
        ("[5D]\n[9G]", "d f g h", "spherical"),
        ("[5D7F]\n[9G]", "d f g", "spherical"),
        ("[5d10f]", "d", "spherical"),
        ("[5D10F]", "f", "cartesian"),
        ("[7F]", "f", "spherical"),
        ("[7F]", "d", "cartesian"),
        ("[5D]", "d g", None),
        ("[6D]\n[10F]", "s d f", "cartesian"),
    ],
)
def test_flags(flags: str, shells: str, functions: str | None) -> None:
    rows = "".join(f" {letter} 1 1.0\n 0.5 1.0\n" for letter in shells.split())
    document = read_text(f"[Atoms] AU\n C 1 6 0 0 0\n{flags}\n[GTO]\n 1 0\n{rows}\n")
    assert [block.functions for block in document.blocks] == [functions]
    assert [fault.severity for fault in document.faults] == ["note"] * (functions is None)


ATOMS = "[Atoms] AU\n C 1 6 0 0 0\n C 2 6 0 0 9\n H 3 1 0 9 0\n C 4 6 0 0 18\n[GTO]\n"
FIRST = " s 1 1.0\n 0.5 1.0\n"
SECOND = " s 1 1.0\n 0.25 1.0\n p 1 1.0\n 0.75 1.0\n"


def test_atoms_with_one_basis_make_one_block() -> None:
    # The same numbers are the same basis, spelled one way or another, for each element.
    other = FIRST.replace("0.5", "5.0E-1")
    document = read_text(f"{ATOMS} 1 0\n{FIRST}\n 2 0\n{other}\n 3 0\n{FIRST}\n 4 0\n{FIRST}\n")
    assert not document.faults
    assert [[block.symbol for block in members.blocks] for members in document.sets] == [["C", "H"]]


def test_many_atoms_with_one_text_are_read_once() -> None:
    # The shortcut for repeated atoms sees the same as the long way, which a fault forces.
    centres = "".join(f" {'CNO'[k % 3]} {k} {6 + k % 3} 0 0 {k}\n" for k in range(1, 31))
    basis = {6: FIRST, 7: SECOND, 8: FIRST.replace("0.5", "0.75")}
    atoms = "".join(f" {k} 0\n{basis[6 + k % 3]}\n" for k in range(1, 31))
    document = read_text(f"[Atoms] AU\n{centres}[GTO]\n{atoms}")
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["N", "O", "C"]
    again = read_text(f"[Atoms] AU\n{centres}[GTO]\n{atoms} 31 0\n{FIRST}\n")
    assert [fault.rule for fault in again.faults] == ["form.element"]
    assert [(b.symbol, b.line) for b in again.blocks] == [
        (b.symbol, b.line) for b in document.blocks
    ]


def test_atoms_of_one_element_may_differ() -> None:
    document = read_text(f"{ATOMS} 1 0\n{FIRST}\n 2 0\n{SECOND}\n 3 0\n{FIRST}\n 4 0\n{SECOND}\n")
    assert [[(b.symbol, b.line) for b in members.blocks] for members in document.sets] == [
        [("C", 7), ("H", 17)],
        [("C", 11)],
    ]
    assert [(fault.rule, fault.severity) for fault in document.faults] == [("form.repeat", "note")]


def test_an_atom_with_a_fault_gives_way_to_a_sound_one() -> None:
    lost = FIRST.replace("1 1.0", "2 1.0").replace("0.5 1.0", "0.5 1.0\n 0.2")
    document = read_text(f"{ATOMS} 1 0\n{lost}\n 2 0\n{FIRST}\n 3 0\n{FIRST}\n 4 0\n{FIRST}\n")
    assert [fault.rule for fault in document.faults] == ["form.count"]
    assert [(block.symbol, block.complete) for block in document.blocks] == [
        ("C", True),
        ("H", True),
    ]


def test_names_and_numbers_of_atoms() -> None:
    # Labels such as CA for a carbon atom are common; a ghost has the number 0.
    centres = "[Atoms]\n CA 1 6 0 0 0\n He 2 0 0 0 9\n Xx 3 0 0 9 0\n[GTO]\n"
    document = read_text(f"{centres} 1 0\n{FIRST}\n 2 0\n{FIRST}\n")
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C", "He"]


RAW = """\
[Atoms] AU
 C 1 6 0 0 0
[GTO]
 1 0
 s 2 1.0
  4.0  1.1644997
  0.5  0.2448059
 d 1 1.0
  0.8  1.9292014
 d 1 1.0
  0.8  1.1138249
"""


def test_coefficients_that_contain_the_primitives_norms() -> None:
    document = read_text(RAW)
    assert document.raw_primitives
    assert [(fault.rule, fault.severity) for fault in document.faults] == [("form.syntax", "note")]
    assert document.blocks[0].shells[0].coefficients[0, 0] == 1.1644997  # as written
    again = read_text(layouts()["gto-section"].write(document).text)
    assert again.raw_primitives
    assert [s.coefficients.tolist() for s in again.blocks[0].shells] == [
        s.coefficients.tolist() for s in document.blocks[0].shells
    ]


@pytest.mark.parametrize("name", [name for name in layouts() if name != "gto-section"])
def test_other_layouts_are_given_coefficients_over_normalised_primitives(name: str) -> None:
    written = layouts()[name].write(read_text(RAW))
    assert any("raw primitives" in loss for loss in written.losses)
    block = read_text(written.text, layout=name).blocks[0]
    s, xy, xx = (function for _, function in block.contracted)
    assert block.shells[0].spelling(1) == "0.5"
    assert s.coefficients.tolist() == pytest.approx([0.577676, 0.577676], rel=1e-5)
    # The norm of xy or that of xx may have been folded in: the function is the same.
    assert [*xy.coefficients, *xx.coefficients] == pytest.approx([1.0, 1.0])


def test_conversion_leaves_normalised_coefficients_alone() -> None:
    document = read_text(SOUND)
    assert over_normalised(document) is document


HEAD = "[Atoms] AU\n C 1 6 0 0 0\n[GTO]\n"

BROKEN = {
    "a row is lost": (f"{HEAD} 1 0\ns ⟦3 1.00\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "a row too many": (f"{HEAD} 1 0\ns ⟦1 1.00\n 4.0 0.6\n 0.5 0.5\n", ["form.count"]),
    "an absurd count": (f"{HEAD} 1 0\ns ⟦999999999999 1.00\n 4.0 0.6\n", ["form.count"]),
    "no rows": (f"{HEAD} 1 0\n⟦s 3 1.00\ns 1 1.00\n 1.0 1.0\n", ["form.count"]),
    "a coefficient is lost": (f"{HEAD} 1 0\ns 2 1.00\n 4.0 0.6\n ⟦0.5\n", ["form.count"]),
    "a number too many": (f"{HEAD} 1 0\ns 2 1.0\n 4.0 0.6\n 0.5 0.5 ⟦0.1\n", ["form.count"]),
    "the p column is lost": (f"{HEAD} 1 0\nsp 1 1.00\n 4.0 ⟦0.6\n", ["form.count"]),
    "letter O": (f"{HEAD} 1 0\ns 2 1.00\n 4.0 0.6\n 0.5 ⟦O.5\n", ["form.number"]),
    "lost exponent letter": (f"{HEAD} 1 0\ns 1 1.00\n 4.0 ⟦1.5-03\n", ["form.number"]),
    "overflowed field": (f"{HEAD} 1 0\ns 1 1.00\n ⟦******** 0.6\n", ["form.number"]),
    "decimal comma": (f"{HEAD} 1 0\ns 1 1.00\n 4,0 ⟦0,5\n".replace("4,0", "4.0"), ["form.number"]),
    "unknown letter": (f"{HEAD} 1 0\n⟦x 1 1.00\n 1.0 1.0\n", ["form.letter"]),
    "heading without count": (f"{HEAD} 1 0\n⟦s\n 1.0 1.0\n", ["form.syntax"]),
    "prose in a block": (f"{HEAD} 1 0\ns 1 1.00\n 1.0 1.0\n⟦see below\n", ["form.syntax"]),
    "rows without heading": (f"{HEAD} 1 0\n⟦1.0 1.0\ns 1 1.00\n 1.0 1.0\n", ["form.syntax"]),
    "letter O in the heading": (f"{HEAD} ⟦1 O\ns 1 1.00\n 1.0 1.0\n", ["form.number"]),
    "the heading's 0 is lost": (f"{HEAD} ⟦1\ns 1 1.00\n 1.0 1.0\n", ["form.syntax"]),
    "the atom's heading is lost": (f"{HEAD}⟦s 1 1.00\n 1.0 1.0\n\n 1 0\ns 1 1.0\n 1.0 1.0\n",
                                   ["form.syntax"]),
    "an atom that is not listed": (f"{HEAD} 1 0\ns 1 1.00\n 1.0 1.0\n\n ⟦2 0\ns 1 1.0\n 2.0 1.0\n",
                                   ["form.element"]),
    "an atom described twice": (f"{HEAD} 1 0\ns 1 1.00\n 1.0 1.0\n\n ⟦1 0\ns 1 1.00\n 1.0 1.0\n",
                                ["form.repeat"]),
    "an atom that is not described": ("[Atoms]\nC 1 6 0 0 0\nH 2 1 0 0 2\n⟦[GTO]\n 1 0\ns 1 1.0\n"
                                      " 1.0 1.0\n", ["form.count"]),
    "an atom listed twice": ("[Atoms]\nC 1 6 0 0 0\nH ⟦1 1 0 0 2\n[GTO]\n 1 0\ns 1 1.0\n 1.0 1.0\n",
                             ["form.repeat"]),
    "name and number disagree": ("[Atoms]\nC 1 ⟦7 0 0 0\n[GTO]\n 1 0\ns 1 1.0\n 1.0 1.0\n",
                                 ["form.element"]),
    "no element at all": ("[Atoms]\n⟦Qx 1 0 0 0 0\n[GTO]\n 1 0\ns 1 1.0\n 1.0 1.0\n",
                          ["form.element"]),
    "an atom without its number": ("[Atoms]\n C 1 6 0 0 0\n ⟦H 1.0 0.0 0.0 2.0\n[GTO]\n 1 0\n"
                                   "s 1 1.0\n 1.0 1.0\n", ["form.syntax"]),
    "no atoms": ("⟦[GTO]\n 1 0\ns 1 1.0\n 1.0 1.0\n", ["form.syntax"]),
    "one text for two elements": ("[Atoms]\nC 1 6 0 0 0\nN 2 7 0 0 2\n[GTO]\n 1 0\ns ⟦2 1.0\n"
                                  " 1.0 1.0\n\n 2 0\ns ⟦2 1.0\n 1.0 1.0\n", ["form.count"] * 2),
    "a slip that is repeated": ("[Atoms]\nC 1 6 0 0 0\nC 2 6 0 0 2\n[GTO]\n 1 0\ns 1 1.0\n"
                                " 1.0 ⟦1.O\n\n 2 0\ns 1 1.0\n 1.0 ⟦1.O\n", ["form.number"] * 2),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("gto-section", *BROKEN[slip])


def test_ten_faults_are_ten_findings() -> None:
    slips = list(BROKEN)[:17]
    symbols = "H He Li Be B C N O F Ne Na Mg Al Si P S Cl".split()
    centres = "".join(f"{s} {z} {z} 0 0 0\n" for z, s in enumerate(symbols, 1))
    bodies = [BROKEN[slip][0].removeprefix(HEAD) for slip in slips]
    atoms = "".join(body.replace("1", str(z), 1) for z, body in enumerate(bodies, 1))
    rules = [rule for slip in slips for rule in BROKEN[slip][1]]
    broken.check("gto-section", f"[Atoms]\n{centres}[GTO]\n{atoms}", rules)
