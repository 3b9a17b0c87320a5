"""Following a suspected number to where it explains an atom's steps, with the energy itself.

A step of a few per cent is as good as the quadratic model behind it; a misplaced decimal point is
not.  So each candidate is changed, the atom solved again, and the step repeated until it vanishes.
What is left of chi squared there decides between the candidates.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.atomic.atoms import Atom, Number
from overlapse.rules.atomic.stationary import (
    Explanation,
    Steps,
    Usual,
    explanations,
    significance,
)


@dataclass(frozen=True, eq=False)
class Verdict:
    """A number that explains an atom's steps, worked out with the energy itself.

    value: what it should be; error: standard error of ln|value|.  before, after: chi squared at the
    printed value and at the new one.  others: neighbours compared with.
    """

    own: Steps
    number: Number
    value: float
    error: float
    before: float
    after: float
    others: int

    @property
    def count(self) -> int:
        return len(self.own.numbers)

    @property
    def change(self) -> float:
        """The change over the printed number."""
        return self.value / self.own.atom.value(self.number) - 1.0

    @property
    def significance(self) -> float:
        return significance(self.before, self.after, self.count)


_FURTHEST = 0.4  # change of a logarithm in one step
_ROUNDS = 7
_LINEAR = 40.0  # root of chi squared up to which second derivatives foretell what a change does
_NUDGE = 2e-3


class _Path:
    """An atom's departures as one of its numbers varies."""

    def __init__(self, own: Steps, expected: Usual, number: Number) -> None:
        self.own, self.expected, self.number = own, expected, number
        self.atom: Atom | None = own.atom

    def away(self, value: float) -> Floats | None:
        """Departures with that value, in units of the scatter."""
        if self.atom is None:
            return None
        moved = self.atom.changed(self.number, value)
        gradient = moved.gradient if moved is not None else None
        if moved is None or gradient is None or not np.isfinite(gradient).all():
            return None
        self.atom = moved
        return self.expected.chi(gradient)

    def further(self, value: float, step: float) -> float:
        """The value a step away: of its logarithm for an exponent, of itself for a coefficient."""
        factor = float(np.exp(step)) if self.number.column is None else 1.0 + step
        return value * factor


def refined(own: Steps, expected: Usual, number: Number, start: float) -> Verdict | None:
    """Follow one number to where it explains the steps best; None where that leads nowhere.

    The pattern that the number draws is that of the second derivatives near the printed value, and
    further away the difference of the departures along the way.
    """
    path = _Path(own, expected, number)
    before = float((expected.chi(own.gradient) ** 2).sum())
    at = own.numbers.index(number)
    pattern = own.curvature[at] / (expected.stiffness * expected.scatter)
    value, away = start, path.away(start)
    if away is not None and abs(start / own.atom.value(number) - 1.0) > 0.05:
        nudged = path.away(path.further(value, _NUDGE))
        if nudged is None:
            return None
        pattern = (away - nudged) / _NUDGE
    best: Verdict | None = None
    for _ in range(_ROUNDS):
        if away is None:
            break
        length = max(float(pattern @ pattern), 1e-300)
        after, error = float(away @ away), length**-0.5
        if best is None or after < best.after:
            best = Verdict(own, number, value, error, before, after, expected.others)
        elif after > 4.0 * best.after:
            break
        step = float(np.clip((pattern @ away) / length, -_FURTHEST, _FURTHEST))
        if abs(step) < max(2e-5, 0.1 * error):
            break
        value = path.further(value, step)
        moved = path.away(value)
        if moved is not None and abs(step) > _NUDGE:
            pattern = (away - moved) / step
        away = moved
    return best


def by_row(own: Steps, others: Sequence[Steps]) -> list[tuple[Number, float, float]]:
    """Numbers that depart from the same place in the neighbours: number, expected value, how far.

    How far in units of the neighbours' own scatter, the furthest first.
    """
    if len(others) < 3:
        return []
    z = np.log([float(other.atom.block.atomic_number) for other in others])
    here = float(np.log(own.atom.block.atomic_number))
    first, second = np.triu_indices(len(z), 1)
    apart = z[first] != z[second]  # an element may be there twice
    first, second = first[apart], second[apart]
    if not first.size:
        return []
    found = []
    for at, number in enumerate(own.numbers):
        if at in own.spare:
            continue
        values = np.array([other.atom.value(number) for other in others])
        value = own.atom.value(number)
        logarithmic = bool((values > 0.0).all()) and value > 0.0
        if logarithmic:
            values, value = np.log(values), float(np.log(value))
        slope = float(np.median((values[second] - values[first]) / (z[second] - z[first])))
        level = float(np.median(values - slope * z))
        away = np.sort(np.abs(values - slope * z - level))
        scatter = 1.5 * float(away[-2]) + (
            2e-3 if logarithmic else 2e-3 * float(np.abs(values).max())
        )
        expected = level + slope * here
        far = abs(value - expected) / scatter
        found.append((number, float(np.exp(expected)) if logarithmic else expected, far))
    return sorted(found, key=lambda each: -each[2])


def explain(own: Steps, others: Sequence[Steps], expected: Usual, enough: float) -> Verdict | None:
    """The single number that explains an atom's steps best, found with the energy itself.

    A few candidates are tried at first, more where these leave much unexplained.  enough: the
    significance that is asked for; where second derivatives foretell much less, None.
    """
    best: Verdict | None = None
    tried: set[tuple[Number, float]] = set()
    guesses = explanations(own, expected)
    foretold = significance(guesses[0].before, guesses[0].after, len(own.numbers))
    is_small = guesses[0].before < _LINEAR**2
    if is_small and foretold < 0.7 * enough:
        return None
    for most in (3,) if is_small else (3, 9):
        for number, start in _candidates(own, others, guesses, most):
            if (number, start) in tried:
                continue
            tried.add((number, start))
            found = refined(own, expected, number, start)
            if found is not None and (best is None or found.after < best.after):
                best = found
            if is_small and best is not None and best.after < 0.7 * guesses[1].after:
                return best  # the others explain less
        if best is not None and best.after < 20.0 * best.count:
            break
    return best


def _candidates(
    own: Steps, others: Sequence[Steps], guesses: Sequence[Explanation], most: int
) -> Iterator[tuple[Number, float]]:
    """Numbers with the values to begin from."""
    atom = own.atom
    for guess in guesses[:most]:
        if guess.before < _LINEAR**2 and guess.after > 0.6 * guess.before:
            break  # small departures follow the second derivatives; the rest explain still less
        step = float(np.clip(guess.change, -_FURTHEST, _FURTHEST))
        value = atom.value(guess.number)
        yield (
            guess.number,
            value * (float(np.exp(step)) if guess.number.column is None else 1.0 + step),
        )
    for number, value, far in by_row(own, others)[:most]:
        if far > 5.0 and value != 0.0:
            yield number, value
    if most > 3 and len(others) < 3:
        yield from _cheapest_slips(own, most)


def _cheapest_slips(own: Steps, most: int) -> Iterator[tuple[Number, float]]:
    """Without neighbours: signs and decimal points whose change lowers the energy most."""
    found = []
    for number in own.numbers:
        value = own.atom.value(number)
        for factor in (0.1, 10.0) if number.column is None else (-1.0,):
            if number.column is None and not _falls(own.atom, number, factor * value):
                continue
            energy = own.atom.tried(number, factor * value)
            if energy is not None:
                found.append((energy, number, factor * value))
    for _, number, value in sorted(found)[:most]:
        yield number, value


def _falls(atom: Atom, number: Number, value: float) -> bool:
    """Whether an exponent of this value would have its place in a shell that falls."""
    exponents = atom.block.shells[number.shell].exponents
    others = np.delete(exponents, number.row)
    if (np.diff(others) > 0.0).any():
        return True
    above, below = others[: number.row], others[number.row :]
    return bool((above > value).all() and (below < value).all())
