"""Texts that look like a layout and are something else: said plainly, never misread."""

import pytest

from overlapse.grammar.reading import read_text

CHARGED = """\
*
  1      0.42      0.22     -0.14
           2 s
    33.7      0.1       0.5
     5.3      0.6       0.1
*
*
  3      0.72     -0.82      0.01
           1 p
     3.4      0.9      -0.3
*
"""


@pytest.mark.parametrize("layout", [None, "dollar"])
def test_a_set_that_depends_on_the_charge_is_rejected_with_one_finding(layout: str | None) -> None:
    document = read_text(CHARGED, layout=layout)
    assert not document.blocks
    (fault,) = document.faults
    assert (fault.rule, fault.severity) == ("form.syntax", "error")
    assert "charge" in fault.message
    assert document.source.place(fault.span[0]) == (2, 3)


def test_a_section_is_not_taken_for_such_a_set() -> None:
    document = read_text("$basis\n*\nh made-up\n*\n  1  s\n 0.5 1.0\n*\n$end\n" + CHARGED)
    assert [block.symbol for block in document.blocks] == ["H"]
