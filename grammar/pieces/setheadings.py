"""The heading of a set of functions that share exponents: whole numbers, and what they announce.

A label of no meaning here, the lowest and the highest l, the number of exponents, and for each l
the number of contractions: `1 0 1 3 2 1`.
"""

import re
from functools import lru_cache
from typing import NamedTuple

from overlapse.grammar.model import LETTERS, Grid

_WHOLE = re.compile(r"\d{1,15}(?:[ \t]+\d{1,15}){4,}")


class Part(NamedTuple):
    """What a set has of one l: the number of contractions, and where its numbers stand."""

    l: int
    contractions: int
    grid: Grid


class Heading(NamedTuple):
    """The parts of a set, the number of rows, and of words in a row.

    ``surplus``: how many numbers stand behind the last one that counts.
    """

    parts: list[Part]
    length: int
    width: int
    surplus: int


class Slip(NamedTuple):
    """What is wrong with a heading: which word (0-based), a message, what is expected."""

    ordinal: int
    message: str
    expected: int | None = None


@lru_cache(4096)  # the same few headings come again and again
def heading_of(body: str) -> Heading | None:
    """What a line announces, or None if it is no heading of a set."""
    return made_of(list(map(int, body.split()))) if _WHOLE.fullmatch(body) else None


def made_of(whole: list[int]) -> Heading | None:
    """What whole numbers announce, if they are enough and of sensible size."""
    if len(whole) < 5 or not whole[1] <= whole[2] < len(LETTERS) or not whole[3]:
        return None
    lowest, highest = whole[1:3]
    counts = whole[4 : 5 + highest - lowest]
    if len(counts) <= highest - lowest or not any(counts):
        return None
    width = 1 + sum(counts)
    parts = [
        Part(l, count, Grid(0, width, 1 + sum(counts[:at]), width, 1))
        for at, (l, count) in enumerate(enumerate(counts, lowest))
        if count
    ]
    return Heading(parts, whole[3], width, len(whole) - 4 - len(counts))


def slip_in(whole: list[int]) -> Slip | None:
    """What is wrong with whole numbers where the heading of a set is expected."""
    if len(whole) < 4:
        return Slip(len(whole) - 1, f"{len(whole)} numbers make no heading of a set")
    lowest, highest, length = whole[1:4]
    wanted, found = highest - lowest + 1, len(whole) - 4
    if wanted < 1:
        return Slip(1, f"the lowest l, {lowest}, lies above the highest, {highest}")
    if highest >= len(LETTERS):
        return Slip(2, f"l = {highest} is no angular momentum of a basis function")
    if found != wanted:
        span = f"l = {lowest}" + f" to {highest}" * (wanted > 1)
        what = "number" + "s" * (wanted > 1)
        return Slip(2, f"{span} wants {wanted} {what} of contractions, {found} follow", wanted)
    if not length:
        return Slip(3, "the heading announces no exponent")
    return None if any(whole[4:]) else Slip(4, "the heading announces no contraction")
