"""Repairs in every layout: an element given twice, and a contraction off its norm."""

import numpy as np
import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import BasisSet, Block, Document, Shell
from overlapse.grammar.reading import read_text
from overlapse.grammar.source import Source
from overlapse.lint.mending import content, mend
from overlapse.lint.settings import Settings


def _written(name: str, *blocks: Block) -> str:
    document = Document(Source(""), "", (BasisSet(blocks, "invented"),))
    return layouts()[name].write(document).text


def _block(number: int, shells: tuple[Shell, ...] = ()) -> Block:
    own = (
        Shell((0,), [2.1 * number, 0.4], [[0.5], [0.6]]),
        Shell((0,), [0.11], [[1.0]]),
        Shell((1,), [0.3 * number], [[1.0]]),
    )
    return Block(number, shells or own, None, "invented", "spherical")


@pytest.mark.parametrize("name", layouts())
def test_an_element_given_twice_with_the_same_numbers(name: str) -> None:
    lithium, beryllium, boron = map(_block, (3, 4, 5))
    text = _written(name, lithium, beryllium, lithium, boron)
    broken = read_text(text, layout=name)
    if not [fault for fault in broken.faults if fault.rule == "form.repeat"]:
        assert len(broken.blocks) == 3  # the layout's writer has no way to say it twice
        return
    result = mend(text.encode(), "own", Settings(layout=name))
    assert {repair.rule for repair in result.done} == {"form.repeat"}
    mended = read_text(result.data.decode(), layout=name)
    assert not [fault for fault in mended.faults if fault.severity == "error"]
    assert len(mended.blocks) == 3
    assert content(mended) == content(broken)
    assert content(mended) == content(
        read_text(_written(name, lithium, beryllium, boron), layout=name)
    )


@pytest.mark.parametrize("name", layouts())
def test_a_contraction_off_its_norm(name: str) -> None:
    shells = []
    for k, l in enumerate((0, 0, 0, 1, 1, 1)):
        plain = Shell((l,), [9.1 + k, 2.3, 0.6 / (k + 1)], [[0.15], [0.5], [0.4]])
        factor = 1.1 if k == 5 else 1.0
        shells.append(Shell((l,), plain.exponents, np.round(factor * plain.normalised(), 7)))
    text = _written(name, _block(6, tuple(shells)))
    result = mend(text.encode(), "own", Settings(layout=name), ["contraction.norm"])
    assert {repair.rule for repair in result.done} == {"contraction.norm"}
    before, after = (
        read_text(each, layout=name).blocks[0] for each in (text, result.data.decode())
    )
    changed = 0
    for (_, old), (_, new) in zip(before.contracted, after.contracted, strict=True):
        assert (old.exponents == new.exponents).all()
        if (old.coefficients != new.coefficients).any():
            changed += 1
            # At least six decimals are printed.
            assert new.coefficients == pytest.approx(old.coefficients / 1.1, abs=6e-7)
    assert changed == 1
