"""STO-nG by content: what the numbers are, and what they should be."""

from collections.abc import Callable

import numpy as np
import pytest

from overlapse.grammar.model import Floats
from overlapse.grammar.reading import read_text
from overlapse.rules.case import Case
from overlapse.rules.expansion import screening
from overlapse.rules.finding import Finding
from overlapse.rules.labels.expanded import matches
from overlapse.rules.physics.slater import Expansion, expansions
from overlapse.rules.registry import rules

Change = Callable[[dict[str, list[list[float]]]], None]


def _expansion(name: str, count: int = 3) -> Expansion:
    return next(e for e in expansions(count) if e.name == name)


def _table(name: str, zeta: float, count: int = 3) -> list[list[float]]:
    """Rows of a shell: exponent, s coefficient and, beyond 1s, p coefficient."""
    e = _expansion(name, count)
    columns: list[Floats] = [e.exponents * zeta**2, *list(e.coefficients.values())[:2]]
    return np.column_stack(columns).tolist()


def _text(symbol: str, shells: dict[str, list[list[float]]], count: int = 3) -> str:
    lines = [f"! label: STO-{count}G", f"{symbol} 0"]
    for name, rows in shells.items():
        lines.append(f"{name[1:3].upper()} {len(rows)} 1.00")
        lines += ["  " + "  ".join(f"{value:.10f}" for value in row) for row in rows]
    return "\n".join([*lines, "****", ""])


def _judge(text: str) -> list[Finding]:
    return Case(read_text(text, "x")).judge(rules()["label.expansion"])


def _sodium(count: int = 3) -> dict[str, list[list[float]]]:
    return {
        "1s": _table("1s", 10.6, count),
        "2sp": _table("2sp", 3.48, count),
        "3sp": _table("3sp", 1.75, count),
    }


@pytest.mark.parametrize("count", range(1, 7))
def test_expansions_are_silent_for_any_zeta(count: int) -> None:
    assert not _judge(_text("Na", _sodium(count), count))


def test_zeta_is_told_back() -> None:
    block = read_text(_text("Na", _sodium()), "x").blocks[0]
    found = {match.orbital: match.zeta for match in matches(block, 3)}
    assert found == pytest.approx(
        {(1, 0): 10.6, (2, 0): 3.48, (2, 1): 3.48, (3, 0): 1.75, (3, 1): 1.75}, abs=1e-6
    )


def test_one_wrong_coefficient_is_named_with_its_value() -> None:
    shells = _sodium()
    right = shells["2sp"][1][2]
    shells["2sp"][1][2] = 0.6177
    (finding,) = _judge(_text("Na", shells))
    assert finding.shell == "sp-1" and finding.line == 9
    assert finding.expected == pytest.approx(right, rel=1e-8)
    assert "2p of Na" in finding.message and "zeta by its exponents: Na 3.480" in finding.message


def test_one_wrong_exponent_is_named_with_its_value() -> None:
    shells = _sodium()
    right = shells["3sp"][2][0]
    shells["3sp"][2][0] *= 10
    (finding,) = _judge(_text("Na", shells))
    assert finding.expected == pytest.approx(right, rel=1e-6)
    assert finding.line == 14


def test_exponents_of_another_expansion() -> None:
    shells = _sodium()
    for row, exponent in zip(shells["3sp"], _expansion("3spd").exponents, strict=True):
        row[0] = float(exponent) * 1.75**2
    (finding,) = _judge(_text("Na", shells))
    assert "ratios of the 3spd expansion" in finding.message
    assert "coefficients are those of the 3sp expansion" in finding.message


def test_exchanged_exponents_are_called_so() -> None:
    shells = _sodium()
    for left, right in zip(shells["2sp"], shells["3sp"], strict=True):
        left[0], right[0] = right[0], left[0]
    first, second = _judge(_text("Na", shells))
    assert "with the exponents of sp-2 it would be one, of zeta 3.480: exchanged?" in first.message
    assert "with the exponents of sp-1 it would be one, of zeta 1.750: exchanged?" in second.message


def test_shells_in_the_wrong_place() -> None:
    shells = _sodium()
    shells["2sp"], shells["3sp"] = shells["3sp"], shells["2sp"]
    messages = [finding.message for finding in _judge(_text("Na", shells))]
    assert any("numbers of a 3s where 2s belongs" in message for message in messages)


def test_the_numbers_of_another_element() -> None:
    (finding,) = _judge(_text("Mg", _sodium()))
    assert "zeta 10.600, as Na has it" in finding.message


def test_numbers_that_are_no_expansions_at_all_are_one_finding() -> None:
    shells = {
        "1s": [[90.0, 0.2], [12.0, 0.6], [2.5, 0.3]],
        "2s": [[3.0, 0.1], [0.8, 0.5], [0.2, 0.6]],
    }
    (finding,) = _judge(_text("Be", shells))
    assert finding.line == 1 and "2 of 2 functions" in finding.message


def test_another_label_is_not_judged() -> None:
    assert not _judge(_text("Mg", _sodium()).replace("STO-3G", "6-31G"))


def test_screening_follows_the_published_values() -> None:
    # W. J. Hehre et al. (1969, 1970), W. J. Pietro et al. (1980, 1983): best zeta of 1s.
    for z, zeta in {3: 2.69, 6: 5.67, 10: 9.64, 18: 17.40, 19: 18.61, 30: 29.43, 53: 52.05}.items():
        assert z - screening(z) == pytest.approx(zeta, abs=0.15)
