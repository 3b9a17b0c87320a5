"""Pruned files: every layout loses the functions that are named and nothing else."""

import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import Block, Document
from overlapse.grammar.reading import read_bytes, read_text
from overlapse.lint.pruned import Marked, PruneError, encoded, pruned_text

TEXT = """! an invented set, made for this test
! its second comment
C 0
S 3 1.00
  40.00 0.1
  6.0D0 0.40
  1.5 0.6
S 1 1.00
  0.50 1.0
SP 2 1.00
  2.50 -0.1 0.20
  0.35 1.10 0.9
P 1 1.00
  0.110 1.0
D 1 1.00
  0.8 1.0
****
H 0
S 1 1.00
  0.30 1.0
S 1 1.00
  0.0300 1.0
****
"""


def _marks(document: Document, element: str, shell: str, *columns: int) -> Marked:
    block = next(block for block in document.blocks if block.symbol == element)
    line = block.shells[block.names.index(shell)].line
    return frozenset((element, line, shell, column) for column in columns)


def _functions(block: Block) -> list[tuple[int, list[float], list[float]]]:
    return sorted((f.l, f.exponents.tolist(), f.coefficients.tolist()) for _, f in block.contracted)


@pytest.mark.parametrize("name", layouts())
def test_whole_shells_go_from_every_layout(name: str) -> None:
    text = layouts()[name].write(read_text(TEXT)).text
    document = read_text(text, layout=name)
    loosest = min(
        (float(f.exponents[0]), document.blocks[0].names[k], f.column, k)
        for k, f in document.blocks[0].contracted
        if f.l == 1 and len(f.exponents) == 1
    )
    marked = _marks(document, "C", loosest[1], loosest[2])
    pruned, _ = pruned_text(document, marked)
    found = read_text(pruned, layout=name)
    assert not [fault for fault in found.faults if fault.severity == "error"]
    kept = [f for f in _functions(document.blocks[0]) if f[:2] != (1, [0.11])]
    assert _functions(found.blocks[0]) == kept
    assert _functions(found.blocks[1]) == _functions(document.blocks[1])


def test_all_else_stays_byte_for_byte() -> None:
    text = TEXT.replace("\n", "\r\n")
    document = read_text(text)
    pruned, losses = pruned_text(document, _marks(document, "H", "s-2", 0))
    assert pruned == text.replace("S 1 1.00\r\n  0.0300 1.0\r\n", "")
    assert losses == ()


def test_a_part_of_a_shell_goes_and_numbers_keep_their_spelling() -> None:
    document = read_text(TEXT)
    pruned, losses = pruned_text(document, _marks(document, "C", "sp-1", 1))
    assert "comments" not in losses or "its second comment" not in pruned
    found = read_text(pruned)
    expected = [f for f in _functions(document.blocks[0]) if f[:2] != (1, [2.5, 0.35])]
    assert _functions(found.blocks[0]) == expected
    for spelling in ("40.00", "6.0D0", "0.40", "2.50", "1.10", "0.110"):
        assert spelling in pruned


def test_a_column_of_a_general_contraction_goes_with_the_rows_it_alone_used() -> None:
    rows = " 9.0 0.1 0.0 0.0\n 3.0 0.5 0.2 0.0\n 1.00 0.4 0.7 1.0\n 0.30 0 0 1.0\n"
    text = f'basis "C_x"\nC S\n{rows}end\n'
    document = read_text(text)
    pruned, _ = pruned_text(document, _marks(document, "C", "s-1", 2))
    (shell,) = read_text(pruned).blocks[0].shells
    assert shell.exponents.tolist() == [9.0, 3.0, 1.0]
    assert shell.coefficients.shape == (3, 2)
    assert "1.00" in pruned


def test_an_element_is_never_emptied() -> None:
    document = read_text("H 0\nS 1 1.00\n 0.3 1.0\n****\n")
    with pytest.raises(PruneError, match="without functions"):
        pruned_text(document, _marks(document, "H", "s-1", 0))


def test_other_encodings_are_kept() -> None:
    data = TEXT.replace("invented", "erfundenes, für Tests").encode("latin-1")
    document = read_bytes(data, "latin.basis")
    pruned, _ = pruned_text(document, _marks(document, "H", "s-2", 0))
    assert encoded(document, pruned) == data.replace(b"S 1 1.00\n  0.0300 1.0\n", b"")
