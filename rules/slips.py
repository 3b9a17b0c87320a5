"""Slips of the pen and the keyboard that make one number of another."""

import re
from collections.abc import Iterable, Iterator
from itertools import pairwise
from typing import NamedTuple

from overlapse.grammar.numbers import FORTRAN, NUMBER

_PADDED = re.compile(r"[-+]?0\d")  # a zero before other digits, which nobody prints


class Slip(NamedTuple):
    """What may have stood there: the word as it would be typed, its value, and what happened."""

    word: str
    value: float
    told: str


def slips(word: str) -> Iterator[Slip]:
    """All numbers of which a word could have been made by one slip."""
    if not NUMBER.fullmatch(word):
        return
    seen = {word}
    is_padded = bool(_PADDED.match(word))
    for changed, told in _changes(word):
        if _PADDED.match(changed) and not is_padded:
            continue
        if changed not in seen and NUMBER.fullmatch(changed):
            seen.add(changed)
            value = float(changed.translate(FORTRAN))
            if value != 0.0:
                yield Slip(changed, value, told)


def turned(word: str) -> str:
    """The number with the other sign, as it would be typed."""
    return word[1:] if word.startswith("-") else f"-{word.lstrip('+')}"


def _changes(word: str) -> Iterator[tuple[str, str]]:
    digits = [at for at, sign in enumerate(word) if sign.isdigit()]
    power = next((at for at, sign in enumerate(word) if sign in "EeDd"), len(word))
    mantissa, tail = word[:power], word[power:]
    yield turned(word), "sign lost or added"
    value = float(word.translate(FORTRAN))
    for factor in (10.0, 0.1, 100.0, 0.01):
        yield _moved(mantissa, factor) + tail, "decimal point moved"
    if tail:
        other = tail.replace("-", "+") if "-" in tail else tail[0] + "-" + tail[1:].lstrip("+")
        yield mantissa + other, "sign of the power of ten lost or added"
    inside = [at for at in digits if at < power]
    for first, second in pairwise(inside):
        if word[first] != word[second]:
            yield (
                word[:first] + word[second] + word[first + 1 : second] + word[first]
                + word[second + 1 :],
                "digits exchanged",
            )  # fmt: skip
    for first, second in pairwise(inside):
        if word[first] == word[second] and second == first + 1:
            yield word[:second] + word[second + 1 :], "digit doubled"
    if abs(value) > 0.0:
        for at in inside:
            for digit in "0123456789":
                if digit != word[at]:
                    yield word[:at] + digit + word[at + 1 :], "digit mistyped"
        for at in [*inside, power]:
            for digit in "0123456789":
                yield word[:at] + digit + word[at:], "digit lost"


def _moved(mantissa: str, factor: float) -> str:
    """The digits of a number with its decimal point moved."""
    sign = mantissa[: len(mantissa) - len(mantissa.lstrip("+-"))]
    whole, _, fraction = mantissa.lstrip("+-").partition(".")
    shift = {10.0: 1, 0.1: -1, 100.0: 2, 0.01: -2}[factor]
    if shift > 0:
        fraction = fraction.ljust(shift, "0")
        return f"{sign}{(whole + fraction[:shift]).lstrip('0') or '0'}.{fraction[shift:]}"
    whole = whole.rjust(-shift + 1, "0")
    return f"{sign}{whole[:shift]}.{whole[shift:]}{fraction}"


# Slips in the order in which they are believed; the later kinds fit nearly anything.
_CLEAR = (
    "sign lost or added",
    "decimal point moved",
    "sign of the power of ten lost or added",
    "digits exchanged",
)
# Those that are evidence where they fit.
TELLING = (*_CLEAR, "digit doubled")


def likely(word: str, value: float, error: float) -> Slip | None:
    """The slip that leads from the number meant to the word, where just one fits.

    value: the number meant, with its relative standard error.
    """
    within = max(2.5 * error, 1e-6)
    if within > 0.02:
        return None

    def fits(slip: Slip) -> bool:
        return abs(slip.value / value - 1.0) < within

    found = [slip for slip in slips(word) if fits(slip)]
    for kinds in (_CLEAR, ("digit doubled",), ("digit mistyped",), ("digit lost",)):
        fitting = [slip for slip in found if slip.told in kinds]
        distinct = {slip.value for slip in fitting}
        if len(distinct) == 1:
            return fitting[0]
        if distinct:
            return None
    return None


def likeliest(word: str, low: float, high: float, expected: float) -> Slip | None:
    """The telling slip whose number lies within the bounds and nearest to what is expected."""
    within = [slip for slip in slips(word) if slip.told in TELLING and low <= slip.value <= high]
    return min(within, key=lambda slip: abs(slip.value - expected), default=None)


def is_size_of_a_slip(value: float, expected: float) -> bool:
    """Whether one slip of the pen can make one number of the other: a factor of ten, or the sign.

    What lies farther off, or has another sign and another size, is another number.
    """
    ratio = value / expected if expected else 0.0
    return 1.0 / 12.0 < ratio < 12.0 or abs(ratio + 1.0) < 0.25


def copied(word: str, others: Iterable[tuple[str, str]]) -> str:
    """Where the same number stands that should not: one of the places told, or "" for none.

    others: (word, place) of the numbers from which an eye may have slipped: the rows above and
    below, the same place of the elements beside.  Numbers of one or two digits prove nothing.
    """
    digits = word.translate(FORTRAN).upper().partition("E")[0].replace(".", "").strip("+-0")
    if len(digits) < 3:
        return ""
    value = float(word.translate(FORTRAN))
    for other, place in others:
        if NUMBER.fullmatch(other) and float(other.translate(FORTRAN)) == value:
            return place
    return ""
