"""Slips in headings that several layouts share."""

from overlapse.grammar.building import BlockDraft, Build, shorten

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
