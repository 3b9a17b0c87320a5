"""Exponents beside those of a neighbouring element or by themselves, signs, vouching norms."""

from collections.abc import Sequence

import numpy as np
import pytest
from numpy.polynomial import Legendre

from overlapse.grammar.layouts import layout_of
from overlapse.grammar.model import BasisSet, Block, Document, Shell
from overlapse.grammar.reading import read_text
from overlapse.grammar.source import Source
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rules
from overlapse.rules.rowwise.alongside import odd_steps, unevenness
from overlapse.rules.rowwise.norms import is_vouched, left_out, norms_of
from overlapse.rules.slips import copied, is_size_of_a_slip


def _judged(blocks: Sequence[Block], name: str) -> list[Finding]:
    made = Document(Source(""), "stars", (BasisSet(tuple(blocks), "made"),))
    text, lost = layout_of("stars").write(made)
    assert not lost
    return Case(read_text(text, "made.basis")).judge(rules()[name])


def _series(z: int, count: int = 7, wrong: dict[int, float] | None = None) -> Block:
    """One contraction whose ln(exponent) is a smooth curve that drifts slowly with Z."""
    at = np.arange(count)
    logs = 2.1 * np.log(z) + 6.0 - (1.3 + 0.05 * at + 0.002 * z) * at
    exponents = np.exp(logs)
    for place, factor in (wrong or {}).items():
        exponents[place] *= factor
    return Block(z, (Shell((0,), exponents, np.full((count, 1), 0.3)),))


def test_steps_on_a_cubic_leave_no_departure_inside() -> None:
    x = np.arange(9.0)
    curve = 0.3 + 0.02 * x - 0.004 * x**2 + 0.001 * x**3
    departure, scale = unevenness(curve)
    assert np.abs(departure[2:-2]).max() < 1e-12
    assert (scale > 0.0).all()
    # Several ladders at once give what each gives by itself.
    both, _ = unevenness(np.array([curve, 2.0 * curve]))
    assert both[1] == pytest.approx(2.0 * departure)


@pytest.mark.parametrize(("z", "other"), [(1, 2), (19, 20)])
@pytest.mark.parametrize("at", [0, 2, 4])
def test_a_pair_without_a_row_shows_a_slip_at_the_right_element(
    z: int, other: int, at: int
) -> None:
    assert not _judged([_series(z), _series(other)], "primitive.trend")
    for wrong, sound in ((z, other), (other, z)):
        blocks = [_series(wrong, wrong={at: 1.3}), _series(sound)]
        (finding,) = _judged(blocks, "primitive.trend")
        assert finding.element == blocks[0].symbol
        assert finding.expected == pytest.approx(_series(wrong).shells[0].exponents[at], rel=0.02)
        assert f"or the exponent of {blocks[1].symbol}" in finding.message


def test_a_neighbour_that_is_vouched_for_leaves_one_culprit() -> None:
    blocks = [_series(3, wrong={3: 0.9}), _series(4), _series(5)]
    (finding,) = _judged(blocks, "primitive.trend")
    assert finding.element == "Li"
    assert "or the exponent" not in finding.message
    assert finding.severity == "note"


def test_an_element_alone_is_held_to_its_own_progression() -> None:
    assert not _judged([_series(6)], "primitive.trend")
    block = _series(6, wrong={3: 10.0})
    (step,) = odd_steps(BasisSet((block,)), 6.0)
    # numpy's own Legendre fit through the other exponents: an independent way to the departure.
    logs = np.log(block.shells[0].exponents)
    x, keep = np.linspace(-1.0, 1.0, 7), np.arange(7) != 3
    fit = Legendre.fit(x[keep], logs[keep], 3, domain=[-1.0, 1.0])
    assert step.departure == pytest.approx(logs[3] - fit(x[3]), abs=1e-9)
    (finding,) = _judged([block], "primitive.trend")
    assert (finding.element, finding.shell) == ("C", "s-1")
    assert finding.expected == pytest.approx(_series(6).shells[0].exponents[3], rel=0.25)


def _with_signs(z: int, signs: Sequence[int]) -> Block:
    shell = _series(z, 4).shells[0]
    sizes = np.array([0.11, 0.35, 0.52, 0.2]) * (1.0 + 0.01 * z)
    return Block(z, (Shell((0,), shell.exponents, (sizes * signs)[:, None]),))


def test_a_sign_that_neighbours_contradict() -> None:
    usual = (-1, -1, 1, 1)
    assert not _judged([_with_signs(z, usual) for z in (3, 4)], "contraction.trend")
    # The sign of the whole function is free.
    turned = [_with_signs(3, usual), _with_signs(4, (1, 1, -1, -1))]
    assert not _judged(turned, "contraction.trend")
    wrong = [_with_signs(3, usual), _with_signs(4, (1, -1, 1, 1)), _with_signs(5, usual)]
    (finding,) = _judged(wrong, "contraction.trend")
    assert (finding.element, finding.severity) == ("Be", "warning")
    assert finding.expected == -finding.measured  # type: ignore[operator]
    # Of two elements alone the one with more changes of sign.
    pair = [_with_signs(11, usual), _with_signs(12, (1, -1, 1, 1))]
    (finding,) = _judged(pair, "contraction.trend")
    assert (finding.element, finding.severity) == ("Mg", "note")


# Hydrogen of cc-pVDZ: T. H. Dunning, J. Chem. Phys. 90, 1007 (1989), typed from memory.  The full
# contraction has 0.501240 at the primitive that segmented forms leave out.
HYDROGEN = Block(
    1,
    (
        Shell((0,), [13.01, 1.962, 0.4446], [[0.019685], [0.137977], [0.478148]]),
        Shell((0,), [0.122], [[1.0]]),
    ),
)


def test_the_primitive_that_a_segmented_form_leaves_out() -> None:
    (norm,) = norms_of(BasisSet((HYDROGEN,)))
    assert norm.overlap == pytest.approx(0.345, abs=5e-4)  # 1 in layouts that print the matrix
    found = left_out(norm)
    assert found is not None
    assert (found.shell, found.exponent) == ("s-2", 0.122)
    assert found.coefficient == pytest.approx(0.501240, abs=1e-4)
    # A primitive far away, or none, is no explanation.
    far = Block(1, (HYDROGEN.shells[0], Shell((0,), [0.002], [[1.0]])))
    assert left_out(norms_of(BasisSet((far,)))[0]) is None
    # Nor is one beyond a shell that lies between.
    between = Shell((0,), [0.3, 0.15], [[0.5], [0.6]])
    beyond = Block(1, (HYDROGEN.shells[0], between, HYDROGEN.shells[1]))
    assert left_out(norms_of(BasisSet((beyond,)))[0]) is None


def test_a_contraction_that_is_normalised_vouches_for_its_numbers() -> None:
    # 1s of STO-3G: W. J. Hehre, R. F. Stewart, J. A. Pople, J. Chem. Phys. 51, 2657 (1969).
    exponents = [2.227660584, 0.405771156, 0.109818036]
    block = Block(1, (Shell((0,), exponents, [[0.154328967], [0.535328142], [0.444634542]]),))
    norms = norms_of(BasisSet((block,)))
    assert is_vouched(norms, block, 0, 1, 0, 0.5)
    assert is_vouched(norms, block, 0, 1, None, 0.45)
    # Where the suggestion lies within what the norm can tell, it says nothing.
    assert not is_vouched(norms, block, 0, 1, 0, 0.5353281)
    scaled = Block(1, (Shell((0,), exponents, 0.9 * block.shells[0].coefficients),))
    assert not is_vouched(norms_of(BasisSet((scaled,))), scaled, 0, 1, 0, 0.45)


def test_numbers_that_an_eye_slipped_to() -> None:
    places = [("0.3425", "the row above"), ("1.20D+01", "this place in N")]
    assert copied("0.34250", places) == "the row above"
    assert copied("12.0", places) == ""  # too few digits to prove anything
    assert copied("0.3524", places) == ""
    assert copied("3.425E-01", [*places, ("x", "nowhere")]) == "the row above"


def test_a_number_of_the_row_above_is_named() -> None:
    def block(z: int) -> Block:
        factor = (z / 7.0) ** 2.1
        shell = Shell((0,), np.round(np.array([120.3, 27.14, 7.352, 2.137]) * factor, 4),
                      [[0.1], [0.3], [0.5], [0.2]])  # fmt: skip
        return Block(z, (shell,))

    blocks = {z: block(z) for z in range(5, 11)}
    right = blocks[7].shells[0]
    exponents = right.exponents.copy()
    exponents[2] = exponents[1]
    blocks[7] = Block(7, (Shell((0,), exponents, right.coefficients),))
    (finding,) = _judged(list(blocks.values()), "primitive.trend")
    assert (finding.element, finding.expected) == ("N", pytest.approx(7.352, rel=0.01))
    assert "it is the number of the row above" in finding.message


@pytest.mark.parametrize(
    ("value", "expected", "is_slip"),
    [(1.2, 1.0, True), (10.0, 1.0, True), (-1.05, 1.0, True), (-3.0, 1.0, False),
     (40.0, 1.0, False), (0.01, 1.0, False), (1.0, 0.0, False)],
)  # fmt: skip
def test_what_one_slip_can_make(value: float, expected: float, is_slip: bool) -> None:
    assert is_size_of_a_slip(value, expected) is is_slip


def test_one_exponent_out_of_order_is_one_finding() -> None:
    blocks = [_series(z, wrong={2: 0.1} if z == 4 else None) for z in (3, 4, 5, 11)]
    assert [f.element for f in _judged(blocks, "primitive.gap")] == ["Be"]
    assert not _judged(blocks, "primitive.order")
    # Where the set has no habit, the order speaks.
    assert [f.element for f in _judged(blocks[1:2], "primitive.order")] == ["Be"]


@pytest.mark.parametrize(("z", "symbol"), [(3, None), (4, None), (6, "C"), (1, "H")])
def test_lone_p_functions_of_the_s_block_keep_an_order_of_their_own(
    z: int, symbol: str | None
) -> None:
    def lone(number: int, *exponents: float) -> Block:
        return Block(number, tuple(Shell((1,), [a], [[1.0]]) for a in exponents))

    row = [lone(number, 0.1 * number, 0.025 * number) for number in (5, 7, 8, 9, 13, 14, 15, 16)]
    found = _judged([*row, lone(z, 0.06, 3.3)], "primitive.gap")
    assert [finding.element for finding in found] == ([symbol] if symbol else [])
