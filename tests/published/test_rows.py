"""Single slips in published sets bundled with PySCF: each witness names the number and its value.

What stood there before is what the sets print; the slips are planted here.
"""

import pytest
from planting import Published, bundled

from overlapse.grammar.model import Block
from overlapse.grammar.reading import read_text
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rules
from overlapse.rules.rowwise.norms import left_out, norms_of

pyscf = pytest.importorskip(
    "pyscf", reason="PySCF has no wheel here; install the extra 'oracle' to run this check"
)


def _found(published: Published, text: str, rule: str, symbol: str, shell: str) -> list[Finding]:
    found = Case(read_text(text, published.path)).judge(rules()[rule])
    return [f for f in found if f.element == symbol and (f.shell or "").startswith(shell)]


def _block(published: Published, z: int) -> Block:
    return published.blocks[z]


def _changed(
    published: Published, z: int, shell: str, row: int, column: int | None, factor: float
) -> str:
    """The text with one number multiplied, printed to its usual digits."""
    block = _block(published, z)
    at = block.shells[block.names.index(shell)]
    assert at.cells is not None
    start, end = at.cells.span(row, column)
    word = published.text[start:end]
    value = float(word.upper().replace("D", "E")) * factor
    return published.text[:start] + f"{value:.9g}" + published.text[end:]


# Each with the rule that must speak: exponents by their row, of the s block beside a neighbour
# (K and Ca of def2-SVP share their core with each other alone), coefficients by row and overlaps.
SLIPS = [
    ("def2-svp", 8, "p-1", 1, None, 1.1, "primitive.trend"),
    ("cc-pvtz", 15, "s-1", 4, None, 0.9, "primitive.trend"),
    ("def2-svp", 19, "s-1", 1, None, 1.1, "primitive.trend"),
    ("def2-svp", 20, "s-1", 1, None, 0.9, "primitive.trend"),
    ("pc-2", 11, "s-1", 3, None, 1.1, "primitive.trend"),
    ("pc-1", 9, "s-1", 2, 0, 0.9, "contraction.trend"),
    ("cc-pvdz", 35, "s-1", 5, 0, 1.03, "contraction.trend"),
    ("pcseg-1", 17, "p-1", 3, 0, 0.97, "contraction.trend"),
]


@pytest.mark.parametrize(("name", "z", "shell", "row", "column", "factor", "rule"), SLIPS)
def test_a_slip_in_a_published_set_is_named(
    name: str, z: int, shell: str, row: int, column: int | None, factor: float, rule: str
) -> None:
    published = bundled(name)
    block = _block(published, z)
    at = block.shells[block.names.index(shell)]
    true = float(at.exponents[row] if column is None else at.coefficients[row, column])
    assert not _found(published, published.text, rule, block.symbol, shell)
    text = _changed(published, z, shell, row, column, factor)
    (finding,) = _found(published, text, rule, block.symbol, shell)
    assert finding.expected == pytest.approx(true, rel=0.03)
    assert finding.line == at.place(row).line


def test_a_set_of_one_element_is_held_to_its_own_shell() -> None:
    published = bundled("cc-pvqz")
    block = _block(published, 6)
    first = block.shells[0].line - 1
    last = block.shells[0].cells.last  # type: ignore[union-attr]
    head = "BASIS made\n"
    sound = head + "\n".join(published.lines[first:last]) + "\nEND\n"
    assert not _found(published, sound, "primitive.trend", "C", "s-1")
    word = block.shells[0].spelling(4)
    wrong = sound.replace(word, f"{10 * float(word):.7f}", 1)
    (finding,) = _found(published, wrong, "primitive.trend", "C", "s-1")
    assert finding.measured == pytest.approx(10 * float(word))


def test_hydrogen_of_a_correlation_consistent_set_leaves_its_lone_primitive_out() -> None:
    members = bundled("cc-pvdz").document.sets[0]
    (norm,) = [n for n in norms_of(members) if n.block.atomic_number == 1]
    found = left_out(norm)
    assert found is not None
    # The coefficient that layouts with the whole matrix print: T. H. Dunning, J. Chem. Phys. 90,
    # 1007 (1989), typed from memory.
    assert found.coefficient == pytest.approx(0.501240, abs=1e-4)


SOUND = ["pople-basis/6-31Gs", "cc-pvtz", "def2-svp", "def2-qzvp", "pc-1", "pcseg-2"]


def test_sound_sets_carry_few_suspicions_and_hardly_a_warning() -> None:
    blocks = notes = warnings = 0
    for name in SOUND:
        published = bundled(name)
        blocks += len(published.blocks)
        case = Case(published.document)
        for rule in ("primitive.trend", "contraction.trend", "shell.neighbour"):
            for finding in case.judge(rules()[rule]):
                notes += finding.severity == "note"
                warnings += finding.severity != "note"
    assert notes <= 0.05 * blocks
    assert warnings <= 0.005 * blocks
