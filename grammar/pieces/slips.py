"""Slips in headings that several layouts share."""

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, index_of, shorten

# Published scale factors lie near 1; far outside of this stands something else.
_LEAST, _MOST = 0.01, 100.0


def is_sensible(scale: float) -> bool:
    return _LEAST <= scale <= _MOST


def check_scale(build: Build, block: BlockDraft, index: int, ordinal: int, value: float) -> float:
    """The scale factor that is a word of a line (both 0-based), or 1 where it is senseless."""
    if is_sensible(value):
        return value
    build.fault_word(
        "form.number",
        index,
        ordinal,
        f"a scale factor of {value:g}: exponents are multiplied by its square",
        element=block.symbol,
        measured=value,
        expected=1.0,
        remedy="write 1.0 where the exponents stand for themselves",
    )
    return 1.0


def say_not_whole(
    build: Build, block: BlockDraft, index: int, ordinal: int, word: str, perhaps: str
) -> None:
    """A word of a line (both 0-based) that should be a whole number."""
    build.fault_word(
        "form.number",
        index,
        ordinal,
        f"{shorten(word)!r} stands where a whole number belongs",
        element=block.symbol,
        measured=shorten(word),
        remedy=f"write a whole number; {perhaps}",
    )


def say_unheaded(build: Build, first: Token, element: str | None, heading: str, parts: str) -> None:
    """Rows without a shell heading above them, or a line of text that should have been one.

    heading: how one looks; parts: what it is made of, in words.
    """
    build.fault_line(
        "form.syntax",
        index_of(first),
        f"{str(first)!r} stands where a shell heading belongs: {parts}"
        if first.type == "TEXT"
        else "rows of numbers without a shell heading above them",
        element=element,
        expected=f"a shell heading such as `{heading}`",
        remedy="write the heading of the shell that these rows belong to",
    )


def say_remark(
    build: Build, line: Token, element: str | None, heading: str, end: str, comment: str
) -> None:
    """A line of text among shells.  end: the word or sign that ends them; comment: the sign."""
    build.fault_line(
        "form.syntax",
        index_of(line),
        f"{str(line)!r} is no shell heading, no row of numbers and no `{end}`",
        element=element,
        expected=f"a shell heading such as `{heading}`, a row of numbers, or `{end}`",
        remedy=f"make it a comment with `{comment}`, or mend the heading",
    )
