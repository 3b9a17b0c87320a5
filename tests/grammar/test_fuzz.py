"""Damaged and arbitrary texts never raise; the long run is in tests/bench/fuzz.py."""

import random
import re
import sys
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

sys.path.insert(0, str(Path(__file__).parents[1] / "bench"))
from fuzz import damaged, run_one, samples
from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.layouts import names
from overlapse.grammar.source import Source

GRAMMARS = Path(__file__).parents[2] / "grammar" / "layouts"

# Words that readers look for, so that random texts reach deep into them.
WORDS = (
    "C H Hg Xx 0 1 3 6 1.00 0.5 4.0 -1 .5 1e3 1D-2 nan **** * @ATOMBASIS @END $basis $end $DATA "
    "$END $ecp basis ecp end [GTO] [Atoms] a / : , ; { } S P SP d f L=7 nelec ul ncore = lmax 2 99 "
    "INPUT "
    '"electron_shells" "center_data" [ ] ! # O l 1.5-03 \u2212 \u00a0 9999999999'
).split(" ")


@pytest.mark.parametrize("name", names())
@settings(max_examples=60, deadline=None)
@given(lines=st.lists(st.lists(st.sampled_from(WORDS), max_size=6), max_size=30))
def test_words_in_any_order(name: str, lines: list[list[str]]) -> None:
    text = "\n".join(" ".join(words) for words in lines)
    run_one(text.encode(), name)


@pytest.mark.parametrize("name", names())
def test_a_grammar_takes_tokens_in_any_order(name: str) -> None:
    kinds = sorted(_declared(name))
    dice = random.Random(7)
    for _ in range(300):
        build = Build(Source("x\n" * 12), name)
        tokens = [
            Token(dice.choice(kinds), "x", line=at, end_line=at + 1)
            for at in range(dice.randint(0, 12))
        ]
        build.parse(tokens)


def _declared(name: str) -> set[str]:
    text = (GRAMMARS / f"{name.replace('-', '_')}.lark").read_text()
    return {
        word for line in re.findall(r"^%declare (.*)$", text, re.MULTILINE) for word in line.split()
    }


@settings(max_examples=200, deadline=None)
@given(data=st.binary(max_size=400))
def test_any_bytes(data: bytes) -> None:
    for layout in (None, *names()):
        run_one(data, layout)


def test_damaged_texts_of_all_layouts() -> None:
    dice = random.Random(20261201)
    texts = samples(None)
    for _ in range(600):
        run_one(damaged(dice.choice(texts), dice), None)
