"""Whether a function lies in the span of others, as far as printed digits tell."""

from collections.abc import Sequence

import numpy as np

from overlapse.rules.compare.canonical import numbers_of
from overlapse.rules.compare.printed import Printed, is_rounded
from overlapse.rules.compare.sides import Member, Side
from overlapse.rules.physics.spans import difference, noise, normalised_overlaps, projection

# An exponent printed more coarsely than this share of itself is not taken as another one rounded.
COARSEST_EXPONENT = 0.010001
# No printing is so coarse that a function further outside a space than this would lie in it.
_FURTHEST = 1e-3
# What a new contraction adds to a function lies in the space but for this share, and for what the
# printed digits of a change that is clearly larger than them allow.
_IN_SPACE = 1e-6
_CLEARLY = 0.03


def lies_within(own: Side, members: Sequence[Member], side: Side, others: Sequence[Member]) -> bool:
    """Whether functions lie in the span of others of the same l, as far as printed digits tell."""
    if not members or not others:
        return not members
    targets = [member.function for member in others]
    functions = [member.function for member in members]
    known = {numbers_of(function) for function in targets}
    distances, weights = projection(functions, targets)
    errors = np.array([side.error(other) for other in others])
    floor = noise([*functions, *targets])
    for member, distance, weight in zip(members, distances, weights, strict=True):
        limit = floor + 3.0 * (own.error(member) + float(np.abs(weight) @ errors))
        if not distance <= min(limit, _FURTHEST):
            return False
        if numbers_of(member.function) not in known and (
            not _has_support(own, member, side, others)
            or _is_changed(own, member, side, others, limit)
        ):
            return False
    return True


def _has_support(own: Side, member: Member, side: Side, others: Sequence[Member]) -> bool:
    """Whether every exponent of a function occurs in the others, as far as it is printed.

    Gaussian functions of different exponents are independent, so that no combination of others
    can replace one.
    """
    known = np.concatenate([other.function.exponents for other in others])
    missing = np.flatnonzero(~np.isin(member.function.exponents, known))
    if not len(missing):
        return True
    printed = [side.exponent(other, at) for other in others for at in range(_length(other))]
    for at in missing.tolist():
        exponent = own.exponent(member, at)
        coarsest = COARSEST_EXPONENT * abs(exponent.value)
        near = (p for p in printed if abs(p.value - exponent.value) <= coarsest)
        if not any(is_rounded(exponent, p, coarsest) for p in near):
            return False
    return True


def _length(member: Member) -> int:
    return len(member.function.exponents)


def _is_changed(
    own: Side, member: Member, side: Side, others: Sequence[Member], limit: float
) -> bool:
    """Whether a function is one of the others with a number changed.

    A changed digit may leave the function within rounding, ``limit``, of the space.  But what a new
    contraction adds to a function lies in the space itself; what a slip adds does not.
    """
    functions = [other.function for other in others]
    overlaps = np.abs(normalised_overlaps([member.function], functions))[0]
    nearest = others[int(np.argmax(np.nan_to_num(overlaps)))]
    if factor(own, member, side, nearest) is not None:
        return False
    if _has_moved(own, member, side, nearest):
        return True
    rest, size = difference(member.function, nearest.function)
    if not size or not len(rest.exponents):
        return False
    allowed = max(_IN_SPACE, noise([rest]))
    if not _mostly_equal(member, nearest) and limit < _CLEARLY * size:
        allowed = max(allowed, limit / size)
    return not projection([rest], functions).distances[0] <= allowed


def _has_moved(own: Side, member: Member, side: Side, other: Member) -> bool:
    """Whether two functions differ in an exponent by so little that arithmetic would lose it."""
    a, b = member.function.exponents, other.function.exponents
    if len(a) != len(b) or not np.allclose(a, b, rtol=1e-4, atol=0.0):
        return False
    moved = np.flatnonzero(a != b).tolist()
    pairs = ((own.exponent(member, at), side.exponent(other, at)) for at in moved)
    return not all(is_rounded(x, y, COARSEST_EXPONENT * abs(x.value)) for x, y in pairs)


def _mostly_equal(one: Member, other: Member) -> bool:
    """Whether most numbers of two functions are the same to the last digit."""
    a, b = one.function, other.function
    if len(a.exponents) != len(b.exponents):
        return False
    same = (a.exponents == b.exponents) & (a.coefficients == b.coefficients)
    return bool(2 * same.sum() > len(same))


def factor(left: Side, one: Member, right: Side, other: Member) -> float | None:
    """By which number a function is the other as a whole, within the printed digits, or None.

    A number too near one to tell is no factor.
    """
    a, b = one.function, other.function
    count = len(a.exponents)
    if count != len(b.exponents) or not np.allclose(a.exponents, b.exponents, rtol=0.02, atol=0.0):
        return None
    mine = [left.coefficient(one, at) for at in range(count)]
    theirs = [right.coefficient(other, at) for at in range(count)]
    big = int(np.argmax(np.abs(a.coefficients)))
    scale = theirs[big].value / mine[big].value
    doubt = mine[big].step / abs(mine[big].value) + theirs[big].step / abs(theirs[big].value)
    if count > 1 and abs(scale - 1.0) <= 1.5 * doubt:
        return None
    exponents = ((left.exponent(one, at), right.exponent(other, at)) for at in range(count))
    if not all(
        x.value == y.value or is_rounded(x, y, COARSEST_EXPONENT * abs(x.value))
        for x, y in exponents
    ):
        return None
    pairs = zip(mine, theirs, strict=True)
    return scale if all(_is_multiple(x, y, scale, doubt) for x, y in pairs) else None


def _is_multiple(one: Printed, other: Printed, scale: float, doubt: float) -> bool:
    """Whether one number is the other times a factor, within half a last place of both."""
    reach = 0.5 * (other.step + abs(scale) * (one.step + doubt * abs(one.value)))
    return abs(other.value - scale * one.value) <= reach * (1 + 1e-9) + 1e-14
