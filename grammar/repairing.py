"""Which stretch of a text a repair concerns."""

from overlapse.grammar.model import Span
from overlapse.grammar.source import Source


def block_span(source: Source, first: int, last: int) -> Span:
    """The lines of a block (1-based, both included), and the separator below it.

    A separator is a line without letters and digits that stands above the block as well.
    """
    above = next((at for at in range(first - 2, -1, -1) if source.lines[at].strip()), None)
    below = next((at for at in range(last, len(source.lines)) if source.lines[at].strip()), None)
    end = last
    if above is not None and below is not None:
        words = source.lines[below].strip()
        if words == source.lines[above].strip() and not any(map(str.isalnum, words)):
            end = below + 1
    return source.starts[first - 1], (
        source.starts[end] if end < len(source.starts) else len(source.text)
    )


def first_word_span(source: Source, index: int) -> Span:
    """The first word of a line (0-based) and the blanks after it."""
    start, _ = source.span_of_word(index, 0)
    second, _ = source.span_of_word(index, 1)
    return start, second
