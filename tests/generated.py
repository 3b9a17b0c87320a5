"""Invented documents for property tests: any elements, shells, numbers and potentials."""

from hypothesis import strategies as st

from overlapse.grammar.model import BasisSet, Block, Channel, Document, Potential, Shell
from overlapse.grammar.source import Source

exponents = st.floats(1e-4, 1e7, allow_nan=False)
coefficients = st.floats(-10.0, 10.0, allow_nan=False).filter(lambda c: c == 0.0 or abs(c) > 1e-8)


@st.composite
def shells(draw: st.DrawFn, highest: int = 6, general: bool = True) -> Shell:
    """A shell; with ``general`` it may have several contractions."""
    angular = draw(st.sampled_from([*((l,) for l in range(highest + 1)), (0, 1)]))
    count = draw(st.integers(1, 5))
    columns = len(angular) if len(angular) > 1 or not general else draw(st.integers(1, 3))
    values = draw(st.lists(exponents, min_size=count, max_size=count, unique=True))
    table = [draw(st.lists(coefficients, min_size=columns, max_size=columns)) for _ in range(count)]
    # A column without any coefficient is no function; a row without any says nothing.
    for column in range(columns):
        table[column % count][column] = table[column % count][column] or 0.5
    for row in table:
        row[0] = row[0] or 0.25
    return Shell(angular, sorted(values, reverse=True), table)


@st.composite
def potentials(draw: st.DrawFn) -> Potential:
    """A potential: the local part first, then s, p, ... below it."""
    highest = draw(st.integers(1, 4))
    channels = []
    for l, local in [(highest, True), *((l, False) for l in range(highest))]:
        count = draw(st.integers(1, 3))
        channels.append(
            Channel(
                l,
                local,
                tuple(draw(st.integers(0, 2)) for _ in range(count)),
                [draw(exponents) for _ in range(count)],
                [draw(coefficients) for _ in range(count)],
            )
        )
    return Potential(draw(st.sampled_from([2, 10, 28, 46, 60])), tuple(channels))


@st.composite
def documents(
    draw: st.DrawFn, highest: int = 6, general: bool = True, with_potentials: bool = True
) -> Document:
    """A document of one set."""
    elements = draw(st.lists(st.integers(1, 86), min_size=1, max_size=3, unique=True))
    functions = draw(st.sampled_from(["spherical", "cartesian", None]))
    blocks = []
    for z in sorted(elements):
        found = draw(st.lists(shells(highest, general), min_size=1, max_size=4))
        # All layouts list a block's shells by rising angular momentum.
        found.sort(key=lambda shell: shell.angular)
        potential = draw(st.none() | potentials()) if with_potentials else None
        blocks.append(Block(z, tuple(found), potential, "invented", functions))
    return Document(Source(""), "", (BasisSet(tuple(blocks), "invented"),))


def content(document: Document) -> list[tuple[object, ...]]:
    """What must survive a change of layout, bit for bit: functions and potentials by element."""
    found: list[tuple[object, ...]] = []
    for block in document.blocks:
        functions = sorted(
            (f.l, tuple(f.exponents.tolist()), tuple(f.coefficients.tolist()))
            for _, f in block.contracted
        )
        channels = []
        if block.potential is not None:
            channels = sorted(
                (
                    c.l, c.local, c.kind, c.powers,
                    tuple(c.exponents.tolist()), tuple(c.coefficients.tolist()),
                )
                for c in block.potential.channels
            )  # fmt: skip
        electrons = block.potential.electrons if block.potential else None
        found.append((block.atomic_number, functions, electrons, channels))
    return found
