"""Slips planted in published sets, bundled with PySCF: a short run of tests/bench/faults.py."""

from functools import cache

import pytest
from planting import bundled, new_findings, planted

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)
from overlapse.lint.engine import FileAudit  # noqa: E402


@cache
def _clean(name: str) -> FileAudit:
    return bundled(name).judged()


@cache
def _is_found(name: str, kind: str, seed: str) -> bool | None:
    published = bundled(name)
    clean = _clean(name)
    slip = planted(published, kind, seed)
    if slip is None:
        return None
    return bool(new_findings(clean, published.judged(slip.text), slip))


SETS = ["pople-basis/6-31Gs", "cc-pvtz", "def2-svp", "pc-1"]
# Least shares found of three slips in each of the four sets.
LEAST = {
    "row lost": 1.0,
    "shell lost": 1.0,
    "shell twice": 1.0,
    "neighbour's block copied": 1.0,
    "elements exchanged": 0.7,
    "columns exchanged": 0.7,
    "exponent x10 or /10": 0.7,
    "exponent 30 %": 0.5,
}


@pytest.mark.parametrize("kind", LEAST)
def test_gross_slips_are_found(kind: str) -> None:
    outcomes = [
        found
        for name in SETS
        for at in range(3)
        if (found := _is_found(name, kind, f"short {at}")) is not None
    ]
    assert len(outcomes) >= 9
    assert sum(outcomes) >= LEAST[kind] * len(outcomes)


@pytest.mark.parametrize("name", SETS)
def test_sound_sets_carry_few_suspicions(name: str) -> None:
    published = bundled(name)
    suspects = [f for f in published.judged().findings if "suspect" in f.message]
    assert len(suspects) <= 0.2 * len(published.blocks)
    assert not [f for f in suspects if f.severity != "note"]


# The numbers that neighbours contradict, in sets as published; what should stand there comes from
# the other elements of the row, not from a source.
def test_a_known_oddity_is_noted_with_what_the_row_suggests() -> None:
    # 3-21G copper, outer sp exponent 0.000751, where Ni and Zn have about 0.04.
    published = bundled("pople-basis/3-21G")
    (finding,) = [f for f in published.judged().findings if f.rule == "primitive.trend"]
    assert (finding.element, finding.shell, finding.measured) == ("Cu", "sp-4", 0.000751)
    assert finding.expected == pytest.approx(0.041, rel=0.1)
