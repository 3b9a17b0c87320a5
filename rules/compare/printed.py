"""Numbers as they are printed: what their last place is worth, and which are one number rounded."""

import re
from typing import NamedTuple

from overlapse.grammar.numbers import FORTRAN, NUMBER

_PARTS = re.compile(r"[+-]?([0-9]*)\.?([0-9]*)(?:[EeDd]([+-]?[0-9]+))?")
_DOUBLE = 2e-15  # relative: what two programs may make of one number


class Printed(NamedTuple):
    """A number and how finely it is printed.

    value: of the model.  word: as typed.  step: what one unit of the last place is worth; bare:
    the same without trailing zeros.  exact: whether the word spells the value, which it does not
    where a scale factor or a norm was worked in.
    """

    value: float
    word: str
    step: float
    bare: float
    exact: bool


def printed(value: float, word: str) -> Printed:
    """A number of the model with the word it comes from."""
    if not NUMBER.fullmatch(word):
        return Printed(value, word, abs(value) * _DOUBLE, abs(value) * _DOUBLE, False)
    spelled = float(word.translate(FORTRAN))
    step, bare = _steps(word)
    if spelled == value:
        return Printed(value, word, step, bare, True)
    scale = abs(value / spelled) if spelled else 1.0
    return Printed(value, word, step * scale, bare * scale, False)


def _steps(word: str) -> tuple[float, float]:
    match = _PARTS.fullmatch(word)
    assert match is not None
    fraction, power = match[2], int(match[3] or 0)
    places = len(fraction)
    digits = match[1] + fraction
    zeros = len(digits) - len(digits.rstrip("0"))
    power = max(-300, min(300, power))
    return 10.0 ** (power - places), 10.0 ** (power - places + zeros)


def is_rounded(left: Printed, right: Printed, coarsest: float) -> bool:
    """Whether one number is the other with fewer digits, rounded or cut.

    coarsest: largest worth of the last place at which this may be claimed; a number of one or two
    digits says too little.  Numbers of equally many digits are not one number rounded.
    """
    apart = abs(left.value - right.value)
    if apart <= _DOUBLE * max(abs(left.value), abs(right.value)):
        return True
    coarse, fine = (left, right) if left.step > right.step else (right, left)
    if left.exact and right.exact and fine.step > 0.99 * coarse.step:
        return False
    if _fits(apart, coarse.value, coarse.step, fine.value, fine.step, coarsest):
        return True
    # Conversions fill up with zeros: then the number with more places is the coarser one.
    padded = fine.bare >= 100 * fine.step and fine.bare > coarse.step
    return padded and _fits(apart, fine.value, fine.bare, coarse.value, coarse.step, coarsest)


def _fits(
    apart: float, coarse: float, step: float, fine: float, fine_step: float, coarsest: float
) -> bool:
    if step > coarsest:
        return False
    cut = abs(coarse) < abs(fine) and apart < step
    return cut or apart <= 0.5 * (step + fine_step) * (1 + 1e-9)
