"""Digests: the same for the same numbers however they are laid out, another for another digit."""

import struct
from dataclasses import replace
from hashlib import sha256

import pytest
from generated import documents
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import BasisSet, Block, Channel, Document, Potential, Shell
from overlapse.grammar.reading import read_text
from overlapse.rules.compare.canonical import digest_of, elements_of

CALM = [HealthCheck.too_slow, HealthCheck.filter_too_much]


def digests(document: Document) -> dict[tuple[int, int], str]:
    return {
        key: digest_of(block).whole
        for members in document.sets
        for key, block in elements_of(members).items()
    }


@pytest.mark.parametrize("name", sorted(layouts()))
@settings(max_examples=12, deadline=None, suppress_health_check=CALM)
@given(data=st.data())
def test_no_layout_changes_a_digest(name: str, data: st.DataObject) -> None:
    highest = min(6, layouts()[name].highest)
    document = data.draw(documents(highest, with_potentials=False))
    again = read_text(layouts()[name].write(document).text, layout=name)
    assert digests(again) == digests(document)


def _respelled(value: float, draw: st.DrawFn) -> str:
    """Another spelling of the same double."""
    word = repr(value)
    mantissa, _, power = word.partition("e")
    kind = draw(st.integers(0, 3))
    if kind == 0:
        return word
    if kind == 1:
        return f"{mantissa}{'' if '.' in mantissa else '.'}000D{power or '+00'}"
    if kind == 2:
        return f"{value:.17e}".upper()
    return ("" if word.startswith("-") else "+") + word.upper()


@st.composite
def respelled(draw: st.DrawFn, document: Document) -> str:
    """The document in the layout of stars: shells, rows and elements in any order, any spelling."""
    lines = ["****"]
    (members,) = document.sets
    for block in draw(st.permutations(members.blocks)):
        lines.append(f"{draw(st.sampled_from([str.upper, str.lower, str]))(block.symbol)} 0")
        for shell in draw(st.permutations(block.shells)):
            table = shell.coefficients.tolist()
            each = 1 if len(shell.angular) == 1 else len(shell.angular)
            for column in range(0, shell.coefficients.shape[1], each):
                letters = draw(st.sampled_from([str.upper, str.lower]))(shell.letters)
                rows = [
                    (exponent, row[column : column + each])
                    for exponent, row in zip(shell.exponents.tolist(), table, strict=True)
                    if any(row[column : column + each])
                ]
                lines.append(f"{letters} {len(rows)} 1.00")
                for exponent, values in draw(st.permutations(rows)):
                    words = [_respelled(number, draw) for number in (exponent, *values)]
                    lines.append("  " + "  ".join(words))
        lines.append("****")
    return "\n".join([*lines, ""])


@settings(max_examples=60, deadline=None, suppress_health_check=CALM)
@given(data=st.data())
def test_order_spelling_and_case_leave_a_digest_whole(data: st.DataObject) -> None:
    document = data.draw(documents(4, with_potentials=False))
    text = data.draw(respelled(document))
    again = read_text(text, layout="stars")
    assert not [fault for fault in again.faults if fault.severity == "error"], text
    assert digests(again) == digests(document), text


@settings(max_examples=150, deadline=None, suppress_health_check=CALM)
@given(data=st.data())
def test_the_last_digit_of_any_number_breaks_it(data: st.DataObject) -> None:
    document = data.draw(documents(4, with_potentials=False))
    (members,) = document.sets
    block = data.draw(st.sampled_from(members.blocks))
    at = data.draw(st.integers(0, len(block.shells) - 1))
    shell = block.shells[at]
    row = data.draw(st.integers(0, len(shell.exponents) - 1))
    column = data.draw(st.integers(-1, shell.coefficients.shape[1] - 1))
    places = data.draw(st.integers(0, 14))
    digits = data.draw(st.integers(10**places, 10 ** (places + 1) - 2))

    def with_number(mantissa: int) -> Block:
        exponents, table = shell.exponents.copy(), shell.coefficients.copy()
        value = float(f"{mantissa}e-{places + 2}")
        if column < 0:
            exponents[row] = value
        else:
            table[row, column] = value
        shells = [*block.shells]
        shells[at] = Shell(shell.angular, exponents, table)
        return replace(block, shells=tuple(shells))

    before, after = digest_of(with_number(digits)), digest_of(with_number(digits + 1))
    assert before.whole != after.whole
    # A changed shell shows in its own letters alone.
    names = {*before.parts, *after.parts}
    differing = {name for name in names if before.parts.get(name) != after.parts.get(name)}
    assert differing and differing <= set(shell.letters)


def block(*shells: Shell, potential: Potential | None = None) -> Block:
    return Block(6, shells, potential)


def test_shared_exponents_are_an_s_and_a_p_function() -> None:
    shared = Shell((0, 1), [2.0, 0.5], [[0.3, 0.4], [0.7, 0.6]])
    s, p = Shell((0,), [2.0, 0.5], [[0.3], [0.7]]), Shell((1,), [0.5, 2.0], [[0.6], [0.4]])
    assert digest_of(block(shared)) == digest_of(block(p, s))


def test_a_general_contraction_is_its_functions_without_zeros() -> None:
    general = Shell((0,), [9.0, 2.0, 0.5], [[0.3, 0.0], [0.7, 0.1], [0.0, 0.9]])
    first = Shell((0,), [9.0, 2.0], [[0.3], [0.7]])
    second = Shell((0,), [2.0, 0.5], [[0.1], [0.9]])
    assert digest_of(block(general)) == digest_of(block(second, first))


def test_functions_are_counted() -> None:
    one = Shell((0,), [0.5], [[1.0]])
    assert digest_of(block(one)).whole != digest_of(block(one, one)).whole


def test_the_same_numbers_of_another_element_or_letter_are_another_content() -> None:
    s, p = Shell((0,), [0.5], [[1.0]]), Shell((1,), [0.5], [[1.0]])
    assert len({digest_of(b).whole for b in (Block(6, (s,)), Block(7, (s,)), Block(6, (p,)))}) == 3


def channel(l: int, *terms: tuple[int, float, float], local: bool = False) -> Channel:
    powers, exponents, coefficients = zip(*terms, strict=True)
    return Channel(l, local, powers, exponents, coefficients)


def test_potentials_are_sealed_as_well() -> None:
    shell = Shell((0,), [0.5], [[1.0]])
    local = channel(2, (1, 3.5, -1.0), (2, 0.7, 4.0), local=True)
    s = channel(0, (2, 1.5, 2.0))
    whole = digest_of(block(shell, potential=Potential(2, (local, s))))
    turned = channel(2, (2, 0.7, 4.0), (2, 9.0, 0.0), (1, 3.5, -1.0), local=True)
    assert digest_of(block(shell, potential=Potential(2, (s, turned)))) == whole
    others = [
        Potential(10, (local, s)),
        Potential(2, (local,)),
        Potential(2, (local, channel(1, (2, 1.5, 2.0)))),
        Potential(2, (local, channel(0, (1, 1.5, 2.0)))),
        Potential(2, (local, channel(0, (2, 1.5, 2.1)))),
        Potential(2, (local, replace(s, kind="spin-orbit"))),
    ]
    for other in others:
        found = digest_of(block(shell, potential=other))
        assert found.whole != whole.whole
        assert found.parts["s"] == whole.parts["s"]
        assert found.parts["potential"] != whole.parts["potential"]
    assert "potential" not in digest_of(block(shell)).parts


def test_an_element_given_twice_has_a_place_for_each() -> None:
    shell = Shell((0,), [0.5], [[1.0]])
    members = BasisSet((Block(6, (shell,)), Block(7, (shell,)), Block(6, (shell,))))
    assert list(elements_of(members)) == [(6, 0), (7, 0), (6, 1)]


def test_the_form_of_a_digest_is_fixed() -> None:
    """A seal made today must hold tomorrow: this value may never change within one version."""
    form = b"functions and potentials, form 1\n" + (6).to_bytes(4, "big")
    numbers = (2).to_bytes(4, "big") + struct.pack(">dd", 0.5, 1.0)
    value = sha256(form + sha256(b"s\n" + numbers).digest()).hexdigest()
    assert digest_of(block(Shell((0,), [0.5], [[1.0]]))).whole == value
    assert value == "9b47b2dd63fe56827807daafe1d7b27bdf5fb9206c4284e2c2b1421ed4f886ce"
