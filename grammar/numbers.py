"""Spelling of numbers: what is one, what nearly is one, and which slip made the difference.

A number is ``[+-]?(digits[.digits] | .digits)([EeDd][+-]?digits)?``; the exponent letter D is how
Fortran writes double precision.
"""

import re
from math import isfinite
from typing import NamedTuple

NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[EeDd][+-]?[0-9]+)?")
CHARACTERS = frozenset("0123456789+-.eEdD ")
_DELETED = "".join(sorted(CHARACTERS | {"\t"})).encode()
FORTRAN = str.maketrans("Dd", "Ee")

_DASHES = "\u2212\u2010\u2011\u2012\u2013\u2014\ufe63\uff0d"
_LOOK_ALIKES = str.maketrans(
    {**dict.fromkeys(_DASHES, "-"), **dict.fromkeys("oO", "0"), **dict.fromkeys("lI|", "1")}
)
_LOST_LETTER = re.compile(r"([+-]?(?:[0-9]+\.[0-9]*|\.[0-9]+))([+-][0-9]{1,3})")
_ABUTTED = re.compile(r"([+-]?[0-9]*\.[0-9]+(?:[EeDd][+-]?[0-9]+)?)([+-][0-9]*\.[0-9]+.*)")
_OTHER_LETTER = re.compile(r"([+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+))[FfGgHhQqXx^]([+-]?[0-9]+)")
_LETTER_FOR_POINT = re.compile(r"([+-]?[0-9]+)[A-Za-z;:]([0-9]+(?:[EeDd][+-]?[0-9]+)?)")


class Reading(NamedTuple):
    """A word read as a number.

    value: the number, or the likely one behind a slip, or None if no guess is safe.
    slip: what is wrong with the spelling, "" if nothing.  spelling: the likely right spelling.
    """

    value: float | None
    slip: str = ""
    spelling: str | None = None


def has_only_characters(text: str) -> bool:
    """Whether numbers and blanks alone could make up a text; quick for a long one."""
    return text.isascii() and not text.encode().translate(None, _DELETED)


def plain(word: str) -> float:
    """Value of a correctly spelled number; raises ValueError for anything else."""
    if not NUMBER.fullmatch(word):
        raise ValueError(word)
    return _value(word)


def _value(number: str) -> float:
    try:
        return float(number)
    except ValueError:  # D is rare enough to try without looking for it
        return float(number.translate(FORTRAN))


def read_number(word: str) -> Reading:
    """Read a word, and name the slip where it is not a number."""
    if NUMBER.fullmatch(word):
        value = _value(word)
        if not isfinite(value):
            return Reading(None, "is too large for a double-precision number")
        if value == 0.0 and re.match(r"[+-]?[0.]*[1-9]", word):
            return Reading(None, "is too small for a double-precision number")
        return Reading(value)
    return _slip(word)


_INVISIBLE = dict.fromkeys(map(ord, "\u200b\u200c\u200d\u2060\ufeff\u00ad"))


def _slip(word: str) -> Reading:
    if (seen := word.translate(_INVISIBLE)) != word:
        again = read_number(seen)
        if again.value is not None:
            return _guess("has an invisible character in it", again.spelling or seen)
    if set(word) == {"*"}:
        return Reading(None, "is a field that overflowed when it was written: its digits are lost")
    if match := _LOST_LETTER.fullmatch(word):
        return _guess("has lost its exponent letter", f"{match[1]}E{match[2]}")
    if word.count(",") == 1 and "." not in word and NUMBER.fullmatch(word.replace(",", ".")):
        return _guess("is written with a decimal comma", word.replace(",", "."))
    likely = word.translate(_LOOK_ALIKES)
    if likely != word and any(c.isdigit() for c in word):
        again = read_number(likely)
        if again.spelling or not again.slip:
            found = sorted({c for c in word if c not in likely}, key=word.index)
            looks = ", ".join(f"{_name(c)} for {c.translate(_LOOK_ALIKES)!r}" for c in found)
            return _guess(f"has {looks}", again.spelling or likely)
    if match := _ABUTTED.fullmatch(word):
        return Reading(None, f"is two numbers run together, perhaps {match[1]} and {match[2]}")
    if match := _OTHER_LETTER.fullmatch(word):
        return _guess("has a wrong letter before the power of ten", f"{match[1]}E{match[2]}")
    if match := _LETTER_FOR_POINT.fullmatch(word):
        return _guess("has a letter where the point should be", f"{match[1]}.{match[2]}")
    if word.count(".") > 1 and set(word) <= CHARACTERS:
        return Reading(None, "has more than one decimal point: two numbers run together or a slip")
    if word.lower().lstrip("+-") in ("nan", "inf", "infinity"):
        return Reading(None, "is not a finite number")
    return Reading(None, "is not a number")


def _guess(slip: str, spelling: str) -> Reading:
    value = float(spelling.translate(FORTRAN))
    return Reading(value, slip, spelling) if isfinite(value) else Reading(None, slip)


def _name(character: str) -> str:
    if character in "oO":
        return f"the letter {character}"
    if character in _DASHES:
        return f"a typographic dash (U+{ord(character):04X})"
    return f"the character {character}"


def looks_numeric(word: str) -> bool:
    """Whether a word is a number or was most likely meant as one."""
    return (
        NUMBER.fullmatch(word) is not None
        or (any(c.isdigit() for c in word) and _slip(word).value is not None)
        or (len(word) >= 3 and set(word) == {"*"})
    )
