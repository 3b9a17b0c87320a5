"""Slips in a made row of elements: expansions of Slater functions scaled along the row."""

from collections.abc import Callable

import numpy as np
import pytest

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.layouts import layout_of
from overlapse.grammar.model import BasisSet, Block, Document, Shell
from overlapse.grammar.reading import read_text
from overlapse.grammar.source import Source
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rules

# 1s and 2sp of zeta = 1 in three primitives: W. J. Hehre, R. F. Stewart, J. A. Pople, J. Chem.
# Phys. 51, 2657 (1969), typed from memory; exponents scale with the square of zeta.
CORE = (2.227660584, 0.405771156, 0.109818036), (0.154328967, 0.535328142, 0.444634542)
OUTER = (0.994203, 0.231031, 0.075139), (-0.09996723, 0.39951283, 0.70011547)
RULES = (
    "primitive.trend", "primitive.gap", "primitive.range", "primitive.digits",
    "contraction.trend", "contraction.norm", "shell.neighbour",
)  # fmt: skip


def _block(z: int) -> Block:
    # Slater's rules: J. C. Slater, Phys. Rev. 36, 57 (1930).
    inner, outer = z - 0.3, (z - 4.15 + 0.65 + 0.35 * (10 - z)) / 2.0
    return Block(
        z,
        (
            Shell((0,), np.round(np.array(CORE[0]) * inner**2, 6), np.array(CORE[1])[:, None]),
            Shell((0,), np.round(np.array(OUTER[0]) * outer**2, 6), np.array(OUTER[1])[:, None]),
            Shell((2,), [round(0.02 * z**1.8, 3)], [[1.0]]),
        ),
    )


BLOCKS = {z: _block(z) for z in range(4, 11)}


def _with(z: int, shell: int, change: Callable[[Shell], Shell]) -> dict[int, Block]:
    shells = list(BLOCKS[z].shells)
    shells[shell] = change(shells[shell])
    return {**BLOCKS, z: Block(z, tuple(shells))}


def _exponent(row: int, factor: float) -> Callable[[Shell], Shell]:
    def change(shell: Shell) -> Shell:
        exponents = shell.exponents.copy()
        exponents[row] *= factor
        return Shell(shell.angular, exponents, shell.coefficients)

    return change


def _coefficient(row: int, factor: float) -> Callable[[Shell], Shell]:
    def change(shell: Shell) -> Shell:
        coefficients = shell.coefficients.copy()
        coefficients[row] *= factor
        return Shell(shell.angular, shell.exponents, coefficients)

    return change


def _judged(blocks: dict[int, Block]) -> list[Finding]:
    made = Document(Source(""), "stars", (BasisSet(tuple(blocks.values()), "made"),))
    text, lost = layout_of("stars").write(made)
    assert not lost
    case = Case(read_text(text, "made.basis"))
    return [finding for name in RULES for finding in case.judge(rules()[name])]


def _suspects(found: list[Finding]) -> set[tuple[str, str]]:
    return {(f.element or "", f.shell or "") for f in found if "suspect" in f.message}


def test_the_row_itself_is_sound() -> None:
    assert not _judged(BLOCKS)


@pytest.mark.parametrize("z", [5, 7, 10])
@pytest.mark.parametrize(("shell", "row"), [(0, 0), (0, 2), (1, 1), (2, 0)])
@pytest.mark.parametrize("factor", [10.0, 0.1, 1.3])
def test_a_wrong_exponent_is_found_at_its_place(
    z: int, shell: int, row: int, factor: float
) -> None:
    found = _judged(_with(z, shell, _exponent(row, factor)))
    name = BLOCKS[z].names[shell]
    assert (symbol_of(z), name) in _suspects(found)
    trend = [f for f in found if f.rule == "primitive.trend" and f.shell == name]
    assert [f.element for f in trend] == [symbol_of(z)]
    true = float(BLOCKS[z].shells[shell].exponents[row])
    if z == 7:
        assert trend[0].expected == pytest.approx(true, rel=0.03)


def test_a_decimal_point_is_named() -> None:
    found = _judged(_with(7, 1, _exponent(0, 10.0)))
    (trend,) = [f for f in found if f.rule == "primitive.trend"]
    assert "decimal point moved" in trend.message
    assert trend.expected == pytest.approx(float(BLOCKS[7].shells[1].exponents[0]), rel=1e-12)


def test_a_wrong_sign_is_named_and_loud() -> None:
    # Printed unnormalised throughout, so that norms tell nothing.
    blocks = {
        z: Block(z, tuple(Shell(s.angular, s.exponents, 0.7 * s.coefficients) for s in b.shells))
        for z, b in _with(7, 1, _coefficient(1, -1.0)).items()
    }
    found = _judged(blocks)
    (trend,) = [f for f in found if f.rule == "contraction.trend"]
    assert (trend.element, trend.shell, trend.severity) == ("N", "s-2", "warning")
    assert "sign lost or added" in trend.message
    assert trend.expected == pytest.approx(0.7 * 0.39951283)


def test_elements_exchanged_are_both_named() -> None:
    swapped = {
        **BLOCKS,
        6: Block(6, BLOCKS[7].shells),
        7: Block(7, BLOCKS[6].shells),
    }
    found = [f for f in _judged(swapped) if f.rule == "shell.neighbour"]
    assert [(f.element, f.severity) for f in found] == [("C", "warning"), ("N", "warning")]
    assert all("exchanged" in f.message for f in found)


def test_a_copied_block_is_told_from_its_origin() -> None:
    for copy, origin in ((7, 6), (6, 7)):
        found = _judged({**BLOCKS, copy: Block(copy, BLOCKS[origin].shells)})
        (finding,) = [f for f in found if f.rule == "shell.neighbour"]
        assert finding.element == symbol_of(copy)
        assert f"the numbers of {symbol_of(origin)}" in finding.message


def test_columns_in_another_order() -> None:
    def general(z: int, order: tuple[int, ...]) -> Block:
        inner, outer = BLOCKS[z].shells[:2]
        table = np.zeros((6, 2))
        table[:3, 0], table[3:, 1] = inner.coefficients[:, 0], outer.coefficients[:, 0]
        exponents = np.concatenate([inner.exponents, outer.exponents])
        return Block(z, (Shell((0,), exponents, table[:, order]),))

    blocks = {z: general(z, (1, 0) if z == 8 else (0, 1)) for z in BLOCKS}
    made = Document(Source(""), "stars", (BasisSet(tuple(blocks.values())),))
    found = Case(made).judge(rules()["shell.neighbour"])
    assert [(f.element, f.shell) for f in found] == [("O", "s-1")]


def test_digits_that_were_cut() -> None:
    def cut(shell: Shell) -> Shell:
        exponents = np.array([1238.4016938, 186.29004992, 42.2, 11.676557932])
        return Shell((0,), exponents, [[0.1], [0.2], [0.4], [0.5]])

    found = [f for f in _judged(_with(6, 0, cut)) if f.rule == "primitive.digits"]
    assert [(f.element, f.shell, f.measured) for f in found] == [("C", "s-1", 3)]


def test_an_element_printed_unnormalised_is_one_note() -> None:
    def scaled(block: Block, factor: float) -> Block:
        shells = [
            Shell(s.angular, s.exponents, s.coefficients * factor) if len(s.exponents) > 1 else s
            for s in [*block.shells, *_block(12).shells]
        ]
        return Block(block.atomic_number, tuple(shells))

    blocks = {z: scaled(_block(z), 0.5 if z == 9 else 1.0) for z in BLOCKS}
    found = [f for f in _judged(blocks) if f.rule == "contraction.norm"]
    assert [(f.element, f.severity) for f in found] == [("F", "note")]
    assert found[0].measured == pytest.approx(0.25, rel=1e-4)
