"""Near dependence on one centre does not depend on how long the functions are printed."""

import warnings

import pytest

from overlapse.grammar.model import BasisSet, Block, Document, Shell
from overlapse.grammar.source import Source
from overlapse.rules.case import Case
from overlapse.rules.registry import rules


@pytest.mark.parametrize("length", [1.0, 1e-200, 1e300])
def test_twins_are_found_whatever_their_coefficients(length: float) -> None:
    shells = tuple(Shell((0,), [e], [[c]]) for e, c in ((0.3, 1.0), (0.3003, length), (4.0, 1.0)))
    document = Document(Source("C\n"), "stars", (BasisSet((Block(6, shells),)),))
    (finding,) = Case(document).judge(rules()["primitive.crowded"])
    assert "the closest pair is 0.3003 here and 0.3" in finding.message


@pytest.mark.parametrize("exponent", [5e-324, 1e-300, 1e-200])
def test_senseless_exponents_are_no_failure_of_pairs(exponent: float) -> None:
    shells = tuple(Shell((l,), [e], [[1.0]]) for l in (0, 1, 2) for e in (exponent, 0.3))
    blocks = tuple(Block(z, shells) for z in (1, 6))
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        found = Case(Document(Source("C\n"), "stars", (BasisSet(blocks),)))
        assert not found.judge(rules()["overlap.pair"])
