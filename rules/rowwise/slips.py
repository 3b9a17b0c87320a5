"""Slips of the pen: which one would turn a number that was meant into the one that stands there."""

import re
from collections.abc import Iterator
from typing import NamedTuple

_PARTS = re.compile(r"([-+]?)([0-9]*)\.?([0-9]*)(?:([EeDd])([-+]?)([0-9]+))?")


class Slip(NamedTuple):
    """A number that may have been meant, as it would be typed, its value, and what happened."""

    word: str
    value: float
    what: str


def slips(word: str) -> Iterator[Slip]:
    """Numbers from which one usual slip makes ``word``; each differs from it in one step only."""
    parts = _PARTS.fullmatch(word)
    if parts is None or not (parts[2] or parts[3]):
        return
    sign, whole, decimals, mark, power_sign, power = parts.groups()
    tail = f"{mark}{power_sign}{power}" if mark else ""

    def typed(digits: str, point: int, what: str) -> Slip:
        if point <= 0:
            digits, point = "0" * (1 - point) + digits, 1
        digits = digits.ljust(point, "0")
        text = f"{sign}{digits[:point]}.{digits[point:]}{tail}"
        return Slip(text, _value(text), what)

    digits, point = whole + decimals, len(whole)
    for step in (-1, 1, -2, 2):
        yield typed(digits, point + step, "decimal point moved")
    first = len(digits) - len(digits.lstrip("0"))
    for at in range(first, len(digits.rstrip("0")) - 1):
        if digits[at] != digits[at + 1]:
            swapped = digits[:at] + digits[at + 1] + digits[at] + digits[at + 2 :]
            yield typed(swapped, point, "digits exchanged")
        else:
            shorter = digits[:at] + digits[at + 1 :]
            yield typed(shorter, point - (at < point), "digit doubled")
            yield typed(shorter, point, "digit doubled")
    if mark and int(power):
        turned = "" if power_sign == "-" else "-"
        text = f"{sign}{whole}.{decimals}{mark}{turned}{power}"
        yield Slip(text, _value(text), "sign of the power of ten lost or added")


def _value(text: str) -> float:
    return float(text.upper().replace("D", "E"))


def likeliest(word: str, low: float, high: float, expected: float) -> Slip | None:
    """The slip whose number lies within the bounds and nearest to what is expected, if any does."""
    within = [slip for slip in slips(word) if low <= slip.value <= high]
    return min(within, key=lambda slip: abs(slip.value - expected), default=None)
