"""What was computed for an atom is not computed again while its numbers are the same."""

from collections import Counter
from typing import Any

import pytest

from overlapse.grammar.reading import read_text
from overlapse.rules.atomic import atoms
from overlapse.rules.case import Case
from overlapse.rules.registry import rules

# Even-tempered functions of our own, on the scale of each nuclear charge.
ELEMENTS = {"B": 5, "C": 6, "N": 7, "O": 8}


def text(**scaled: float) -> str:
    blocks = []
    for symbol, z in ELEMENTS.items():
        scale = z**2 * scaled.get(symbol, 1.0)
        shells = [("S", scale * 12.0 * 0.3**k) for k in range(7)]
        shells += [("P", scale * 0.6 * 0.3**k) for k in range(4)]
        lines = [f"{letter} 1 1.00\n  {exponent:.8g} 1.0" for letter, exponent in shells]
        blocks.append("\n".join([f"{symbol} 0", *lines, "****"]))
    return "\n".join(blocks) + "\n"


@pytest.fixture
def solved(monkeypatch: pytest.MonkeyPatch) -> Counter[int]:
    """How many atoms of each nuclear charge were computed."""
    counts: Counter[int] = Counter()
    solve = atoms.solve

    def counted(integrals: Any, *rest: Any) -> Any:
        counts[integrals.shells.charge] += 1
        return solve(integrals, *rest)

    monkeypatch.setattr(atoms, "solve", counted)
    monkeypatch.setattr(atoms, "MEMORY", atoms._Memory(10_000_000))
    return counts


def judge(of: str) -> None:
    case = Case(read_text(of, "set.basis"), energies=True)
    for name, rule in rules().items():
        if name.startswith("energy."):
            case.judge(rule)


def test_only_an_edited_element_is_computed_again(solved: Counter[int]) -> None:
    judge(text())
    assert sorted(solved) == sorted(ELEMENTS.values())
    solved.clear()
    judge(text())
    assert not solved
    judge(text(N=1.0001))
    assert set(solved) == {7}


def test_what_is_unused_for_longest_is_forgotten_first(monkeypatch: pytest.MonkeyPatch) -> None:
    memory = atoms._Memory(250)
    for key in (b"a", b"b"):
        memory.of(key, 100)["energy"] = key
    assert memory.of(b"a", 100)["energy"] == b"a"  # used again
    memory.of(b"c", 100)
    assert memory.size == 200
    assert "energy" in memory.of(b"a", 100)
    assert "energy" not in memory.of(b"b", 100)
