"""Which stretch of a text a repair concerns."""

from collections.abc import Sequence

from overlapse.grammar.model import Span
from overlapse.grammar.source import Source


def block_span(source: Source, bodies: Sequence[str], first: int, last: int) -> Span:
    """The lines of a block (1-based, both included), and the separator below it.

    A separator is a line without letters and digits that stands above the block as well.
    ``bodies``: the lines without comments and outer blanks.
    """
    above = next((at for at in range(first - 2, -1, -1) if bodies[at]), None)
    below = next((at for at in range(last, len(bodies)) if bodies[at]), None)
    end = last
    if above is not None and below is not None and bodies[above] == bodies[below]:
        end = below + 1 if not any(map(str.isalnum, bodies[below])) else last
    return source.starts[first - 1], (
        source.starts[end] if end < len(source.starts) else len(source.text)
    )


def first_word_span(source: Source, index: int) -> Span:
    """The first word of a line (0-based) and the blanks after it."""
    start, _ = source.span_of_word(index, 0)
    second, _ = source.span_of_word(index, 1)
    return start, second
