"""Two blocks compared: equal in which sense, or different and where."""

import re

import numpy as np
import pytest
from generated import documents
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import Document, Floats
from overlapse.grammar.reading import read_text
from overlapse.rules.compare.relation import Relation, relate_documents


def relations(left: Document, right: Document) -> list[Relation]:
    return [relation for _, _, found in relate_documents(left, right) for relation in found]


def only(left: str, right: str) -> Relation:
    (found,) = relations(read_text(left), read_text(right))
    return found


def stars(*shells: tuple[str, list[tuple[str, str]]], element: str = "C") -> str:
    """A text of one element; shells are (letter, rows)."""
    lines = ["****", f"{element} 0"]
    for letter, rows in shells:
        lines.append(f"{letter} {len(rows)} 1.00")
        lines += [f"  {exponent}  {coefficient}" for exponent, coefficient in rows]
    return "\n".join([*lines, "****", ""])


S1 = ("S", [("40.5", "0.15"), ("7.25", "0.5"), ("2.0", "0.45")])
S2 = ("S", [("0.3", "1.0")])
P1 = ("P", [("3.5", "0.6"), ("0.7", "0.45")])
D1 = ("D", [("0.8", "1.0")])
WHOLE = stars(S1, S2, P1, D1)


# ---- equal


def test_a_text_equals_itself() -> None:
    assert only(WHOLE, WHOLE).verdict == "equal text"


def test_blanks_and_comments_outside_make_no_difference_to_the_text() -> None:
    assert only(WHOLE, "! from somewhere\n" + WHOLE.replace("0.5\n", "0.5   \n")).verdict == (
        "equal text"
    )


@pytest.mark.parametrize("name", sorted(layouts()))
@settings(max_examples=10, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(data=st.data())
def test_every_layout_of_one_set_has_equal_numbers(name: str, data: st.DataObject) -> None:
    highest = min(6, layouts()[name].highest)
    document = data.draw(documents(highest, with_potentials=False))
    again = read_text(layouts()[name].write(document).text, layout=name)
    for relation in relations(document, again):
        assert relation.verdict == "equal numbers", relation


def test_order_spelling_and_case_leave_numbers_equal() -> None:
    other = stars(
        ("d", [("8.0D-01", "1")]),
        P1,
        ("s", [(".3", "1.000")]),
        ("S", [("2.00", ".450"), ("0.405E+02", "15.0d-2"), ("7.25", "+0.5")]),
    )
    assert only(WHOLE, other).verdict == "equal numbers"


def test_shared_exponents_equal_separate_shells() -> None:
    shared = "****\nC 0\nSP 2 1.00\n 3.5 0.6 0.2\n 0.7 0.45 0.9\n****\n"
    apart = stars(("S", [("3.5", "0.6"), ("0.7", "0.45")]), ("P", [("3.5", "0.2"), ("0.7", "0.9")]))
    assert only(shared, apart).verdict == "equal numbers"


def test_fewer_digits_are_equal_to_rounding() -> None:
    fine = stars(("S", [("40.512345", "0.1512345"), ("7.2598765", "0.5598765")]), S2)
    rounded = stars(("S", [("40.5123", "0.15123"), ("7.25988", "0.55988")]), S2)
    cut = stars(("S", [("40.5123", "0.15123"), ("7.25987", "0.55987")]), S2)
    padded = stars(("S", [("40.51230000", "0.151230000"), ("7.259880000", "0.5598800000")]), S2)
    for coarse in (rounded, cut, padded):
        found = only(fine, coarse)
        assert found.verdict == "equal to rounding"
        assert len(found.differences) == 4
        assert found.first is not None and found.first.left is not None
        assert found.first.left.spelling == "40.512345"


def test_one_digit_is_no_rounding_of_two() -> None:
    coarse, fine = stars(S1, ("D", [("0.8", "1.0")])), stars(S1, ("D", [("0.75", "1.0")]))
    assert only(coarse, fine).verdict == "different"


# ---- equal span

# cc-pVDZ carbon, s functions as T. H. Dunning, J. Chem. Phys. 90, 1007 (1989) gives them; the
# numbers are those of the file cc-pvdz.dat bundled with PySCF.
EXPONENTS = np.array([6665.0, 1000.0, 228.0, 64.71, 21.06, 7.495, 2.797, 0.5215, 0.1596])
COLUMNS = np.array(
    [
        [0.000692, 0.005329, 0.027077, 0.101718, 0.274740, 0.448564, 0.285074, 0.015204, -0.003191],
        [-0.000146, -0.001154, -0.005725, -0.023312, -0.063955, -0.149981, -0.127262, 0.544529,
         0.580496],
        [0, 0, 0, 0, 0, 0, 0, 0, 1.0],
    ]
).T  # fmt: skip


def general(columns: Floats, digits: int = 8) -> str:
    """The carbon as a text that keeps general contractions."""
    lines = ['basis "C_own" SPHERICAL', "C S"]
    for exponent, row in zip(EXPONENTS, columns, strict=True):
        lines.append(f"  {exponent:.4f} " + " ".join(f"{c:.{digits}f}" for c in row))
    return "\n".join([*lines, "end", ""])


def without(columns: Floats, row: int) -> Floats:
    """Contractions with one primitive removed from all, by means of the function it makes alone.

    E. R. Davidson, Chem. Phys. Lett. 260, 514 (1996): what a function of the set can take out of
    another one changes the contraction and not the space.
    """
    found = columns.copy()
    found[row, :-1] = 0.0
    return found


def without_by_functions(columns: Floats, row: int) -> Floats:
    """The first contraction with a primitive removed by means of the second."""
    found = columns.copy()
    found[:, 0] -= columns[row, 0] / columns[row, 1] * columns[:, 1]
    return found


def test_an_optimised_general_contraction_spans_what_its_original_spans() -> None:
    original = general(COLUMNS)
    removed = only(original, general(without(COLUMNS, 8)))
    assert removed.verdict == "equal span"
    assert removed.angle is not None and removed.angle < 1e-7
    combined = only(original, general(without_by_functions(COLUMNS, 7)))
    assert combined.verdict == "equal span"
    # Both differ in numbers, of which the first is shown.
    first = combined.first
    assert first is not None and first.left is not None
    assert (first.what, first.left.spelling) == ("coefficient", "0.00069200")


@settings(max_examples=40, deadline=None)
@given(data=st.data())
def test_any_mixture_of_contractions_spans_the_same(data: st.DataObject) -> None:
    entries = st.floats(-2.0, 2.0).map(lambda x: round(x, 2))
    mixing = np.array([[data.draw(entries) for _ in range(3)] for _ in range(3)])
    if abs(np.linalg.det(mixing)) < 0.3:
        mixing = mixing + 3.0 * np.eye(3)
    if abs(np.linalg.det(mixing)) < 0.3:
        return
    found = only(general(COLUMNS, 10), general(COLUMNS @ mixing, 10))
    # Where the mixing only sorts the columns anew, even the numbers are equal.
    assert found.verdict in ("equal span", "equal numbers", "equal text")


def test_a_scaled_function_is_the_same_and_says_so() -> None:
    scaled = ("S", [("40.5", "0.345"), ("7.25", "1.15"), ("2.0", "1.035")])
    found = only(WHOLE, stars(scaled, S2, P1, D1))
    assert found.verdict == "equal span"
    assert found.reasons == ("s-1 is scaled by 2.3 as a whole",)
    turned = ("S", [(e, f"-{c}") for e, c in S1[1]])
    assert only(WHOLE, stars(turned, S2, P1, D1)).verdict == "equal span"
    assert only(WHOLE, WHOLE.replace("0.8  1.0", "0.8  0.5")).verdict == "equal span"


def test_a_function_given_twice_adds_nothing() -> None:
    found = only(WHOLE, stars(S1, S2, S2, P1, D1))
    assert found.verdict == "equal span"
    assert "adds nothing" in found.reasons[0]


# ---- contained


def test_a_function_more_contains_the_other() -> None:
    more = stars(S1, S2, ("S", [("0.09", "1.0")]), P1, D1)
    assert only(WHOLE, more).verdict == "contained in"
    assert only(more, WHOLE).verdict == "contains"
    first = only(more, WHOLE).first
    assert first is not None and first.what == "function" and first.right is None
    assert first.left is not None and (first.left.spelling, first.left.shell) == ("0.09", "s-3")


def test_a_whole_angular_momentum_more_contains_the_other() -> None:
    assert only(stars(S1, S2, P1), WHOLE).verdict == "contained in"


def test_more_on_either_side_is_different() -> None:
    assert only(stars(S1, S2, P1), stars(S1, P1, D1)).verdict == "different"


# ---- different


NUMBERS = [word for _, rows in (S1, S2, P1, D1) for row in rows for word in row if word != "1.0"]


@pytest.mark.parametrize("word", NUMBERS)
@pytest.mark.parametrize("name", ["stars", "keyworded", "matrix", "sets", "schema", "commas"])
def test_one_digit_changed_is_different_and_placed(word: str, name: str) -> None:
    written = layouts()[name].write(read_text(WHOLE)).text
    changed = word[:-1] + str((int(word[-1]) + 4) % 10)
    at = next(re.finditer(rf"(?<![\d.]){re.escape(word)}(?![\d.])", written)).start()
    damaged = written[:at] + changed + written[at + len(word) :]
    (found,) = relations(read_text(written, layout=name), read_text(damaged, layout=name))
    assert found.verdict == "different"
    (difference,) = found.differences
    left, right = difference.left, difference.right
    assert left is not None and right is not None
    assert (left.spelling, right.spelling) == (word, changed)
    assert left.line == right.line == written.count("\n", 0, at) + 1
    assert left.column == right.column == at - written.rfind("\n", 0, at)
    assert difference.apart == pytest.approx(float(changed) - float(word))


@settings(max_examples=60, deadline=None)
@given(row=st.integers(0, 8), column=st.integers(0, 1), step=st.sampled_from([1, -1, 3]))
def test_the_last_digit_of_a_general_contraction_is_different(
    row: int, column: int, step: int
) -> None:
    if row == 8:
        return  # this primitive stands alone in the set, which can take the change up
    changed = COLUMNS.copy()
    changed[row, column] += step * 1e-8
    found = only(general(COLUMNS), general(changed))
    assert found.verdict == "different"
    assert len(found.differences) == 1


def test_a_zero_that_became_a_number_is_placed_in_both() -> None:
    changed = COLUMNS.copy()
    changed[2, 2] = 0.04
    found = only(general(COLUMNS), general(changed))
    assert found.verdict == "different"
    (difference,) = found.differences
    assert difference.left is not None and difference.right is not None
    assert (difference.left.spelling, difference.right.spelling) == ("0.00000000", "0.04000000")
    assert difference.left.column == difference.right.column
    assert difference.left.line == difference.right.line == 5


def test_the_last_digit_of_an_exponent_is_different() -> None:
    text = general(COLUMNS)
    for word in ("6665.0000", "0.1596", "0.5215"):
        found = only(text, text.replace(word, word[:-1] + "3"))
        assert found.verdict == "different", word


def test_columns_exchanged_are_equal_numbers_but_columns_of_sp_are_not() -> None:
    assert only(general(COLUMNS), general(COLUMNS[:, [1, 0, 2]])).verdict == "equal numbers"
    shared = "****\nC 0\nSP 2 1.00\n 3.5 0.6 0.2\n 0.7 0.45 0.9\n****\n"
    turned = "****\nC 0\nSP 2 1.00\n 3.5 0.2 0.6\n 0.7 0.9 0.45\n****\n"
    assert only(shared, turned).verdict == "different"


def test_exponents_that_are_not_positive_do_not_stop_it() -> None:
    broken = WHOLE.replace("7.25", "-7.25")
    found = only(WHOLE, broken)
    assert found.verdict == "different"
    assert found.first is not None and found.first.right is not None
    assert found.first.right.spelling == "-7.25"


def test_the_kind_of_functions_counts_from_d_on() -> None:
    marked = general(COLUMNS).replace("end", "C D\n  0.8 1.0\nend")
    other = marked.replace("SPHERICAL", "CARTESIAN")
    assert only(marked, other).verdict == "different"
    assert only(general(COLUMNS), general(COLUMNS).replace("SPHERICAL", "CARTESIAN")).verdict == (
        "equal numbers"
    )


# ---- potentials

CORE = (
    'basis "Na" SPHERICAL\nNa S\n 0.5 1.0\nEND\nECP\nNa nelec 10\nNa ul\n'
    "1 175.55025 -10.0\n2 35.05167 -47.4902\nNa S\n0 243.36052 3.0\n1 41.57648 36.2847\nEND\n"
)


def test_potentials_are_compared_term_by_term() -> None:
    assert only(CORE, CORE).verdict == "equal text"
    found = only(CORE, CORE.replace("41.57648", "41.57684"))
    assert found.verdict == "different"
    (difference,) = found.differences
    assert difference.what == "exponent"
    assert difference.left is not None and difference.right is not None
    assert (difference.left.line, difference.left.column) == (12, 3)
    assert (difference.left.spelling, difference.right.spelling) == ("41.57648", "41.57684")
    assert only(CORE, CORE.replace("41.57648", "41.576")).verdict == "equal to rounding"
    assert only(CORE, CORE.replace("1 41.57648", "2 41.57648")).verdict == "different"


def test_core_electrons_and_lost_potentials_are_different() -> None:
    found = only(CORE, CORE.replace("nelec 10", "nelec 2"))
    assert (found.verdict, found.reasons) == ("different", ("core electrons: 10 and 2",))
    bare = CORE[: CORE.index("ECP")]
    found = only(CORE, bare)
    assert found.verdict == "different"
    assert "core potential" in found.reasons[0]


# ---- sets


def test_elements_missing_on_either_side_are_told() -> None:
    carbon, nitrogen = stars(S1, element="C"), stars(S1, element="N")
    found = relations(read_text(carbon), read_text(nitrogen))
    assert [(r.symbol, r.verdict) for r in found] == [
        ("C", "only in first"),
        ("N", "only in second"),
    ]


ODD = "1.0 0.0 -1.0 1e300 1e-300 -3e155 4.0000001 4.0 4 0.40E1 7.7e7 1e-8 0.123456789012345".split()
odd_rows = st.lists(
    st.tuples(st.sampled_from(ODD), st.sampled_from(ODD)), min_size=1, max_size=3
)  # fmt: skip
odd_shells = st.lists(st.tuples(st.sampled_from("SPD"), odd_rows), min_size=1, max_size=3)


@settings(max_examples=150, deadline=None)
@given(odd_shells, odd_shells)
def test_odd_numbers_get_a_verdict_that_does_not_depend_on_the_side(
    one: list[tuple[str, list[tuple[str, str]]]], other: list[tuple[str, list[tuple[str, str]]]]
) -> None:
    there, back = only(stars(*one), stars(*other)), only(stars(*other), stars(*one))
    turned = {"contained in": "contains", "contains": "contained in"}
    assert back.verdict == turned.get(there.verdict, there.verdict)
    assert only(stars(*one), stars(*one)).verdict == "equal text"
