"""How atoms are called in geometries: symbols, numbered symbols, atomic numbers, ghosts.

A ghost has the functions of its element but neither charge nor electrons; it is written ``Gh(H)``,
``@H``, ``X-H`` or ``H_ghost``, in any letter case.  ``D`` and ``T`` are hydrogen.  ``X`` alone, and
its like, is a point without an element.
"""

import re
from functools import lru_cache
from typing import NamedTuple

from overlapse.grammar.elements import number_of

_GHOST = re.compile(r"gh\((?P<a>\w+)\)|@(?P<b>\w+)|x-(?P<c>\w+)|(?P<d>[a-z0-9]+)[_-]ghost", re.I)
_NUMBERED = re.compile(r"([A-Za-z]{1,2})[_-]?\d+")
_HEAVY_HYDROGEN = frozenset("dDtT")
_POINTS = frozenset(("x", "xx", "q", "du", "dummy"))


class Name(NamedTuple):
    """What an atom's name says: atomic number (0 for a point without an element), ghost or not."""

    atomic_number: int
    ghost: bool = False


@lru_cache(maxsize=512)
def name_of(word: str) -> Name | None:
    """The element an atom is called by, or None if the word is no such name."""
    if match := _GHOST.fullmatch(word):
        inner = _number(next(filter(None, match.groups())))
        return Name(inner, True) if inner is not None else None
    if word.lower() in _POINTS:
        return Name(0)
    plain = _number(word)
    return Name(plain) if plain is not None else None


def _number(word: str) -> int | None:
    if word.isdecimal() and word.isascii():
        return int(word) if len(word) <= 3 and 1 <= int(word) <= 118 else None
    if match := _NUMBERED.fullmatch(word):
        word = match[1]
    return 1 if word in _HEAVY_HYDROGEN else number_of(word)
