"""Layout `schema`: what is read, and where faults are found."""

import json
import re

import broken
import numpy as np
import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import Document
from overlapse.grammar.numbers import plain
from overlapse.grammar.pieces.apart import as_json
from overlapse.grammar.pieces.atonce import document_of
from overlapse.grammar.reading import read_text
from overlapse.grammar.source import Source

SOUND = """\
{
  "schema_name": "qcschema_basis",
  "schema_version": 1,
  "name": "invented",
  "description": "an invented set (3s,1p) -> [2s,1p]",
  "center_data": {
    "C": {
      "electron_shells": [
        {
          "harmonic_type": "spherical",
          "angular_momentum": [0],
          "exponents": [40.0, 7.0e0, 2.1],
          "coefficients": [[0.15, 0.53, 0.44], [0, -0.5, 1.0]]
        },
        {
          "angular_momentum": [0, 1],
          "coefficients": [["1.0"], [".5D0"]],
          "exponents": ["0.3"],
          "harmonic_type": "spherical"
        },
        {
          "harmonic_type": "spherical",
          "angular_momentum": [1, 2, 3],
          "exponents": [0.8],
          "coefficients": [[1.0], [2.0], [3.0]]
        }
      ]
    },
    "bs_hg": {
      "electron_shells": [
        {"function_type": "gto_cartesian", "angular_momentum": [2],
         "exponents": [1.2], "coefficients": [[1.0]]}
      ],
      "ecp_electrons": 60,
      "ecp_potentials": [
        {"ecp_type": "scalar", "angular_momentum": [0], "r_exponents": [2, 0],
         "gaussian_exponents": [3.0, "4.0"], "coefficients": [[15.0, -1.5]]},
        {"ecp_type": "scalar", "angular_momentum": [1], "r_exponents": [2],
         "gaussian_exponents": [1.0], "coefficients": [[0.0]]},
        {"ecp_type": "spinorbit", "angular_momentum": [1], "r_exponents": [2],
         "gaussian_exponents": [1.5], "coefficients": [[0.25]]}
      ]
    }
  },
  "atom_map": ["C", "bs_hg", "C"],
  "nbf": 48
}
"""


def test_a_sound_file() -> None:
    document = read_text(SOUND)
    assert document.layout == "schema"
    assert not document.faults
    assert document.sets[0].label == "invented"
    carbon, mercury = document.blocks
    assert (carbon.functions, mercury.functions) == ("spherical", "cartesian")
    assert (carbon.line, carbon.end) == (7, 28)
    assert carbon.names == ("s-1", "sp-1", "p-1", "d-1", "f-1")
    s, sp, p, d, _ = carbon.shells
    assert s.exponents.tolist() == [40.0, 7.0, 2.1]
    assert s.coefficients.tolist() == [[0.15, 0.0], [0.53, -0.5], [0.44, 1.0]]
    assert s.place(2, 0) == (13, 41)
    assert s.spelling(1) == "7.0e0"
    assert (sp.spelling(0), sp.spelling(0, 1)) == ("0.3", ".5D0")
    assert (sp.place(0), sp.place(0, 1)) == ((18, 26), (17, 39))
    assert (p.spelling(0, 0), d.spelling(0, 0)) == ("1.0", "2.0")
    assert document.remarks[0] == ("an invented set (3s,1p) -> [2s,1p]", 5)


def test_a_potential() -> None:
    potential = read_text(SOUND).blocks[1].potential
    assert potential is not None
    assert (potential.electrons, potential.line) == (60, 34)
    assert [(c.l, c.local, c.kind, c.powers, c.exponents.tolist()) for c in potential.channels] == [
        (0, False, "scalar", (2, 0), [3.0, 4.0]),
        (1, True, "scalar", (2,), [1.0]),
        (1, False, "spin-orbit", (2,), [1.5]),
    ]


@pytest.mark.parametrize("indent", [None, 0, 1, 4])
def test_blanks_and_line_ends_do_not_matter(indent: int | None) -> None:
    document = read_text(json.dumps(json.loads(SOUND), indent=indent))
    assert not document.faults
    plain = read_text(SOUND)
    for block, other in zip(document.blocks, plain.blocks, strict=True):
        for shell, same in zip(block.shells, other.shells, strict=True):
            assert shell.exponents.tolist() == same.exponents.tolist()
            assert shell.coefficients.tolist() == same.coefficients.tolist()
            row = document.source.lines[shell.place(0).line - 1][shell.place(0).column - 1 :]
            assert re.match(r"[\d.]+", row), row


def test_one_very_long_line_is_no_hindrance() -> None:
    data = json.loads(SOUND)
    data["description"] = "x" * 200_000
    assert [block.symbol for block in read_text(json.dumps(data)).blocks] == ["C", "Hg"]


def test_numbers_taken_apart_are_the_same() -> None:
    # A name of two spellings makes every shell go the way of the faulty ones.
    slow = SOUND.replace('"coefficients"', '"note": "\\u0020", "coefficients"')
    document = read_text(slow)
    assert not document.faults
    for block, other in zip(document.blocks, read_text(SOUND).blocks, strict=True):
        assert block.names == other.names
        assert block.functions == other.functions
        for shell, same in zip(block.shells, other.shells, strict=True):
            assert shell.spellings() == same.spellings()
            assert shell.coefficients.tolist() == same.coefficients.tolist()
    potential = document.blocks[1].potential
    assert potential is not None
    assert [c.coefficients.tolist() for c in potential.channels] == [[15.0, -1.5], [0.0], [0.25]]


# Sound to the last member: all numbers are numbers.
PLAIN = (
    SOUND.replace('["1.0"], [".5D0"]', "[1.0], [0.5]")
    .replace('["0.3"]', "[0.3]")
    .replace('"4.0"', "4.0")
    .replace('"schema_version": 1', '"schema_version": 100')
)


def everything(document: Document) -> list[object]:
    return [
        *document.remarks,
        *((members.label, members.line) for members in document.sets),
        *(
            (block.label, block.line, block.end, block.functions, block.complete, shell.angular,
             shell.exponents.tolist(), shell.coefficients.tolist(), shell.line, shell.spellings(),
             [(shell.place(row), shell.place(row, column))
              for row, column in np.ndindex(*shell.coefficients.shape)])
            for block in document.blocks
            for shell in block.shells
        ),
        *(
            (block.potential.electrons, block.potential.line, channel.l, channel.local,
             channel.powers, channel.exponents.tolist(), channel.coefficients.tolist(),
             channel.line, channel.kind)
            for block in document.blocks
            if block.potential
            for channel in block.potential.channels
        ),
    ]  # fmt: skip


@pytest.mark.parametrize(
    "text",
    [
        PLAIN,
        PLAIN.replace("\n", "\r\n"),
        PLAIN.replace("\n", "\r"),
        json.dumps(json.loads(PLAIN)),
        json.dumps(
            [{"a": {"b": [{}]}}, {"of": "a molecule", "basis": json.loads(PLAIN)}], indent=1
        ),
        PLAIN.replace("an invented set", "\u03b1 \U0001f600"),
        re.sub(r"(-?\d+\.\d*(e0)?)", r'"\1"', PLAIN.replace("[0, -0.5", "[0.0, -0.5")),
    ],
)
def test_read_at_once_or_token_by_token_a_text_says_the_same(text: str) -> None:
    assert document_of(Source(text)) is not None
    # No count has a point: such a text is looked at more closely.
    doubtful = text.replace('"schema_version": 100', '"schema_version": 1.0')
    assert document_of(Source(doubtful)) is None
    document = read_text(text, layout="schema")
    assert [fault for fault in document.faults if fault.rule != "form.ending"] == []
    assert everything(document) == everything(read_text(doubtful, layout="schema"))


@pytest.mark.parametrize(
    ("spelled", "written"),
    [
        ("1.5", "1.5"), ("1.5e-03", "1.5e-03"), (".5", "0.5"), ("-.5D+01", "-0.5E+01"), ("5.", "5"),
        ("+0.25", "0.25"), ("007.50", "7.50"), ("-0.0", "-0.0"), ("1.0d0", "1.0E0"), ("0", "0"),
        ("00", "0"), ("5.D2", "5E2"),
    ],
)  # fmt: skip
def test_digits_are_kept_as_json_can_hold_them(spelled: str, written: str) -> None:
    assert as_json(spelled) == written
    assert json.loads(written) == plain(spelled)


def test_brackets_in_texts_are_no_brackets() -> None:
    for name in ("a}b", "{", "]}", '[\\"{'):
        document = read_text(SOUND.replace('"invented"', f'"{name}"'))
        assert not document.faults
        assert document.sets[0].label == json.loads(f'"{name}"')
        assert [block.symbol for block in document.blocks] == ["C", "Hg"]


def test_a_document_inside_a_larger_one() -> None:
    whole = f'{{"id": [1, {{"a": 2}}], "model": {{"basis": {SOUND}}}, "broken" "rest": [1, , 2]}}'
    document = read_text(whole)
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C", "Hg"]


SHELL = (
    '{"harmonic_type": "spherical", "angular_momentum": [0], '
    '"exponents": [%s], "coefficients": [[1.0]]}'
)
FIRST, SECOND = SHELL % "0.5", SHELL % "0.25"


def test_names_of_centres() -> None:
    names = ["C", "h", "N1", "bs_invented_o", "cl-2", "Si_label"]
    centres = ", ".join(f'"{name}": {{"electron_shells": [{FIRST}]}}' for name in names)
    document = read_text(f'{{"center_data": {{{centres}}}, "atom_map": {json.dumps(names)}}}')
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["C", "H", "N", "O", "Cl", "Si"]


def test_a_molecule_beside_the_basis_names_the_elements() -> None:
    centres = f'"first": {{"electron_shells": [{FIRST}]}}'
    basis = f'{{"center_data": {{{centres}}}, "atom_map": ["first", "first"]}}'
    document = read_text(f'{{"molecule": {{"symbols": ["Ne", "Ne"]}}, "basis": {basis}}}')
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["Ne"]


def test_centres_of_one_element_may_differ() -> None:
    shells = {"C1": FIRST, "C2": SECOND, "H": FIRST, "C3": FIRST}
    centres = ", ".join(f'"{name}": {{"electron_shells": [{s}]}}' for name, s in shells.items())
    document = read_text(f'{{"center_data": {{{centres}}}, "atom_map": ["C1"]}}')
    assert [[block.symbol for block in members.blocks] for members in document.sets] == [
        ["C", "H"],
        ["C"],
    ]
    assert [(fault.rule, fault.severity) for fault in document.faults] == [("form.repeat", "note")]


def test_what_cannot_be_written_is_said() -> None:
    text = "C 0\nS 1 1.0\n 1.0 1.0\n****\nHG 0\nHG-ECP 0 60\ns-ul\n 1\n2 1.0 0.5\n"
    losses = layouts()["schema"].write(read_text(text, layout="stars")).losses
    assert any("spherical" in loss for loss in losses)
    assert any("potential" in loss for loss in losses)


HEAD = '{"name": "x", "center_data": {"C": {"electron_shells": [\n'
TAIL = '\n]}}, "atom_map": ["C"]}'
S = '{"harmonic_type": "spherical", "angular_momentum": [0], '
GOOD = S + '"exponents": [4.0, 0.5], "coefficients": [[0.6, 0.5]]}'
ECP = '"ecp_type": "scalar", "angular_momentum": [0]'


def basis(*shells: str) -> str:
    return HEAD + ",\n".join(shells) + TAIL


def centre(**members: str) -> str:
    inside = ", ".join(f'"{name}": {text}' for name, text in members.items())
    return f'{HEAD}{GOOD}\n], {inside}}}}}, "atom_map": ["C"]}}'


BROKEN = {
    "a coefficient is lost": (basis(S + '"exponents": [4.0, 0.5], "coefficients": [⟦[0.6]]}'),
                              ["form.count"]),
    "a coefficient too many": (basis(S + '"exponents": [4.0], "coefficients": [⟦[0.6, 1]]}'),
                               ["form.count"]),
    "row by row": (basis(S + '"exponents": [4.0, 0.5], "coefficients": ⟦[[0.6], [0.5]]}'),
                   ["form.count"]),
    "no exponents": (basis(S + '"exponents": ⟦[], "coefficients": [[0.6]]}'), ["form.count"]),
    "no coefficients": (basis(S + '"exponents": [1.0], "coefficients": ⟦[]}'), ["form.count"]),
    "the p column is lost": (basis('{"harmonic_type": "spherical", "angular_momentum": [0, 1], '
                                   '"exponents": [1.0], "coefficients": ⟦[[1.0]]}'),
                             ["form.count"]),
    "a list is missing": (basis(S + '"exponents": [1.0], "coefficients": [⟦1.0]}'),
                          ["form.syntax"]),
    "letter O": (basis(S + '"exponents": [⟦1.O], "coefficients": [[1.0]]}'), ["form.number"]),
    "letter O in a string": (basis(S + '"exponents": ["⟦1.O"], "coefficients": [["1"]]}'),
                             ["form.number"]),
    "no number for JSON": (basis(S + '"exponents": [⟦.5, ⟦+1.0], "coefficients": [[⟦5., ⟦1D0]]}'),
                           ["form.number"] * 4),
    "not finite": (basis(S + '"exponents": [1.0], "coefficients": [[⟦NaN]]}'), ["form.number"]),
    "no list but null": (basis("⟦" + S + '"exponents": null, "coefficients": [[1.0]]}'),
                         ["form.syntax"]),
    "null": (basis(S + '"exponents": [1.0], "coefficients": [[⟦null]]}'), ["form.number"]),
    "true": (basis(S + '"exponents": [1.0], "coefficients": [[⟦true]]}'), ["form.number"]),
    "too large": (basis(S + '"exponents": [⟦1e999], "coefficients": [[1.0]]}'), ["form.number"]),
    "an empty string": (basis(S + '"exponents": ["⟦"], "coefficients": [["1.0"]]}'),
                        ["form.number"]),
    "a decimal comma in a string": (basis(S + '"exponents": ["⟦0,5"], "coefficients": [["1"]]}'),
                                    ["form.number"]),
    "a comma is lost": (basis(S + '"exponents": [4.0 ⟦0.5], "coefficients": [[0.6, 0.5]]}'),
                        ["form.syntax"]),
    "a comma is lost between names": (basis(S + '"exponents": [4.0] ⟦"coefficients": [[0.6]]}'),
                                      ["form.syntax"]),
    "a comma is lost between shells": (HEAD + GOOD + "\n⟦" + GOOD.replace("4", "5") + TAIL,
                                       ["form.syntax"]),
    "a comma too many": (basis(S + '"exponents": [4.0⟦,], "coefficients": [[0.6]]}'),
                         ["form.syntax"]),
    "two commas": (basis(S + '"exponents": [4.0, ⟦, 0.5], "coefficients": [[0.6, 0.5]]}'),
                   ["form.syntax"]),
    "a comma after the last shell": (HEAD + GOOD + "⟦," + TAIL, ["form.syntax"]),
    "a comment": (basis("⟦// from the paper\n" + GOOD), ["form.syntax"]),
    "a comment in a shell": (basis(S + '⟦# from the paper\n"exponents": [4.0], '
                                   '"coefficients": [[0.6]]}'), ["form.syntax"]),
    "single quotes": (basis(S + "⟦'exponents': [4.0], " + '"coefficients": [[0.6]]}'),
                      ["form.syntax"]),
    "no quotes": (basis(S + '⟦exponents: [4.0], "coefficients": [[0.6]]}'), ["form.syntax"]),
    "a quote is lost": (basis(S + '"exponents": [4.0], ⟦coefficients": [[0.6]]}'),
                        ["form.syntax"]),
    "the last quote is lost": (basis(S + '⟦"exponents: [4.0], "coefficients": [[0.6]]}'),
                               ["form.syntax"]),
    "a false escape": (basis(S + '"exponents": [4.0], "note": ⟦"6\\-31", "coefficients": [[1.0]]}'),
                       ["form.syntax"]),
    "a list is not closed": (basis(S + '"exponents": [4.0, "coefficients": [[0.6]]⟦}'),
                             ["form.syntax"]),
    "a shell is not closed": (HEAD + GOOD[:-1] + ",\n" + GOOD + "\n⟦]" + TAIL[2:],
                              ["form.syntax"]),
    "the list of shells is not closed": (HEAD + GOOD + "\n⟦}" + TAIL[3:], ["form.syntax"]),
    "a bracket too many": (HEAD + GOOD + "\n]⟦]" + TAIL[2:], ["form.syntax"]),
    "the text is cut off": (HEAD + GOOD + ",\n" + '⟦{"harmonic_type": "spherical",',
                            ["form.syntax"]),
    "a shell without exponents": (basis('⟦' + S + '"coefficients": [[0.6]]}'), ["form.syntax"]),
    "a misspelt name": (basis(S + '⟦"exponent": [4.0], "coefficients": [[0.6]]}'),
                        ["form.syntax"]),
    "a name given twice": (basis(S + '"exponents": [4.0], ⟦"exponents": [5.0], '
                                 '"coefficients": [[0.6]]}'), ["form.repeat"]),
    "a name without value": (basis(S + '⟦"exponents":, "coefficients": [[0.6]]}'),
                             ["form.syntax"]),
    "an unknown kind": (basis(GOOD.replace('"spherical"', '⟦"sphericl"')), ["form.syntax"]),
    "an angular momentum of letters": (basis(GOOD.replace("[0]", '⟦["s"]')), ["form.letter"]),
    "an angular momentum below 0": (basis(GOOD.replace("[0]", "⟦[-1]")), ["form.letter"]),
    "an angular momentum twice": (basis(GOOD.replace("[0]", "⟦[1, 1]")), ["form.letter"]),
    "no list": (basis(S + '"exponents": ⟦4.0, "coefficients": [[0.6]]}'), ["form.syntax"]),
    "a number among the shells": (basis(GOOD, "⟦5"), ["form.syntax"]),
    "shells are no list": ('{"center_data": {"C": {"electron_shells": ⟦5}}, "atom_map": ["C"]}',
                           ["form.syntax"]),
    "an unknown element": (basis(GOOD).replace('"C": {', '⟦"Cx": {').replace('["C"]', '["Cx"]'),
                           ["form.element"]),
    "a centre is no object": ('{"center_data": {"C": ⟦[]}, "atom_map": ["C"]}', ["form.syntax"]),
    "centres are no object": ('{"center_data": ⟦[], "atom_map": []}', ["form.syntax"]),
    "no centres": ('{⟦"C": {"electron_shells": [' + GOOD + "]}}", ["form.syntax"]),
    "the name of the shells is misspelt": (basis(GOOD).replace('"electron', '⟦"elecron'),
                                           ["form.syntax"]),
    "no shells": (basis(GOOD).replace('"C": {"electron', '"C": ⟦{"other'), ["form.syntax"]),
    "the name of the potential is misspelt": (centre(ecp_electron="2").replace(
        '"ecp', '⟦"ecp'), ["form.syntax"]),
    "the name of the map is misspelt": (basis(GOOD).replace('"atom_map', '⟦"atommap'),
                                        ["form.syntax"]),
    "no map": ('⟦{"center_data": {"C": {"electron_shells": [' + GOOD + "]}}}", ["form.syntax"]),
    "the map names what is not there": (basis(GOOD).replace('["C"]', '["C", ⟦"N", "N", ⟦5]'),
                                        ["form.element"] * 2),
    "a count of functions": (basis(GOOD).replace('["C"]', '["C", "C"], "nbf": ⟦3'),
                             ["form.count"]),
    "no electrons": (centre(ecp_potentials="[⟦{" + ECP + ', "r_exponents": [2], '
                            '"gaussian_exponents": [1.0], "coefficients": [[1.0]]}]'),
                     ["form.syntax"]),
    "half an electron": (centre(ecp_electrons="⟦1.5"), ["form.number"]),
    "a power of r is lost": (centre(ecp_electrons="2", ecp_potentials="[{" + ECP
                                    + ', "r_exponents": ⟦[2], "gaussian_exponents": [1.0, 2.0], '
                                    '"coefficients": [[1.0, 2.0]]}]'), ["form.count"]),
    "a coefficient of a potential": (centre(ecp_electrons="2", ecp_potentials="[{" + ECP
                                            + ', "r_exponents": [2], "gaussian_exponents": [1.0], '
                                            '"coefficients": [[⟦1.O]]}]'), ["form.number"]),
    "a kind of potential": (centre(ecp_electrons="2", ecp_potentials="[{" + ECP.replace(
        '"scalar"', '⟦"scaler"') + ', "r_exponents": [2], "gaussian_exponents": [1.0], '
                                   '"coefficients": [[1.0]]}]'), ["form.syntax"]),
}  # fmt: skip


@pytest.mark.parametrize("slip", BROKEN)
def test_broken(slip: str) -> None:
    broken.check("schema", *BROKEN[slip])


def test_ten_faults_are_ten_findings() -> None:
    whole = [slip for slip, (text, _) in BROKEN.items() if text.startswith(HEAD)]
    slips = [slip for slip in whole if BROKEN[slip][0].endswith(TAIL)][:20]
    symbols = "H He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K Ca".split()
    centres = [
        f'"{symbol}": {{"electron_shells": [{BROKEN[slip][0][len(HEAD) : -len(TAIL)]}]}}'
        for symbol, slip in zip(symbols, slips, strict=True)
    ]
    text = f'{{"center_data": {{{", ".join(centres)}}}, "atom_map": {json.dumps(symbols)}}}'
    broken.check("schema", text, [rule for slip in slips for rule in BROKEN[slip][1]])


def test_recovery_after_a_lost_bracket() -> None:
    lost = basis(GOOD).replace(TAIL, '\n]}, "N": {"electron_shells": [' + GOOD + TAIL)
    for text in (lost.replace("0.5]]}", "0.5]]", 1), lost.replace("0.5]]}", "0.5]}", 1)):
        document = read_text(text)
        assert [fault.rule for fault in document.faults] == ["form.syntax"]
        assert [(b.symbol, b.complete) for b in document.blocks] == [("C", False), ("N", True)]


@pytest.mark.parametrize("text", ["[" * 50_000, "{" * 50_000, '{"a":' * 20_000, '{"a": [' * 9_000])
def test_depth_is_no_hindrance(text: str) -> None:
    for whole in (text, '{"center_data": {"C": {"electron_shells": ' + text):
        assert read_text(whole, layout="schema").faults
