"""Labels of the kind N-MPG that contraction lengths spell, whether such a set is known or not."""

from collections.abc import Iterator, Sequence
from dataclasses import replace

from overlapse.grammar.designation import Designation
from overlapse.grammar.model import Block
from overlapse.rules.families.candidates import candidates
from overlapse.rules.labels.composition import lengths_of


def by_digits(blocks: Sequence[Block]) -> list[Designation]:
    """N-MPG labels with the digits that the contraction lengths of Li-Ne spell, known or not."""
    spelled = {
        digits for block in blocks if 3 <= block.atomic_number <= 10 for digits in _digits(block)
    }
    models = [c for c in candidates() if c.family == "N-MPG" and (c.core, c.valence) == (6, (3, 1))]
    return [
        replace(model, core=core, valence=valence)
        for core, valence in sorted(spelled)
        for model in models
    ]


def _digits(block: Block) -> Iterator[tuple[int, tuple[int, ...]]]:
    """Digits that a block may spell: its loosest function is part of the valence, or diffuse."""
    exponents = {
        l: {e for _, f in block.functions_of(l) for e in f.exponents.tolist()} for l in (0, 1)
    }
    if not exponents[1] or not exponents[1] <= exponents[0]:
        return
    lengths = lengths_of(block)
    for valence in (lengths[1], lengths[1][:-1]):
        core, *rest = lengths[0]
        if 1 < len(valence) < 4 and tuple(rest[: len(valence)]) == valence and core < 10:
            yield core, valence
