"""Which single number would explain that an atom's energy is not stationary.

At the true numbers of a set that was made for the energy of atoms the gradient vanishes, or is what
it is for the neighbours in the row.  A number that is off by e (of its logarithm) adds H e to the
gradient, H the second derivatives; so the step of every number z, t_z = -g_z / H_zz, moves by
-H_zy e / H_zz.  The steps are compared with those of the same places in the neighbours, in units of
their scatter s_z, and the one number y whose correction leaves the least,

    chi**2 = sum_z (d_z - x p_yz)**2,   d_z = (t_z - usual_z) / s_z,   p_yz = H_zy / (H_zz s_z),

with the best x for each, is the suspect; x is what its logarithm has to change by.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from hashlib import sha256

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.atomic.atoms import Atom, Number
from overlapse.rules.atomic.rows import by_both, by_medians
from overlapse.rules.rowwise.norms import half_unit

_FINEST = 3e-4  # steps of the best published numbers
_NOISE = 1e-7  # of a derivative, hartree: what optimisations of sets leave at best
_LONE = 1e-5  # the same for an element that has no neighbours to compare with
_STRANGE = 4e-3  # added to the scatter of elements that are of the period, but not of the row
# Of an element without neighbours: how large g / sqrt(H) may be, over the quantile of its role.
_MOSTLY, _AMPLE, _ENOUGH, _UNKNOWN = 0.75, 3.0, 8, 0.05
TELLING = 20  # numbers of an atom that say something
_SOFT = 1e-5  # second derivatives below it, hartree, tell nothing


@dataclass(eq=False)
class Steps:
    """The first and second derivatives of an atom's energy by its numbers.

    gradient: by ln|number|, hartree, shape (n,).  curvature: second derivatives, shape (n, n).
    """

    atom: Atom
    numbers: tuple[Number, ...]
    gradient: Floats
    curvature: Floats

    @cached_property
    def stiffness(self) -> Floats:
        """Size of the diagonal second derivatives, hartree, shape (n,)."""
        return np.asarray(np.abs(np.diagonal(self.curvature)))

    @cached_property
    def effort(self) -> Floats:
        """What is gained by each number: size of the gradient over the root of the stiffness,
        by that of the atom's size, shape (n,).
        """
        stiffness = np.maximum(self.stiffness, _SOFT)
        return np.asarray(np.abs(self.gradient) / np.sqrt(stiffness) / self.size)

    @property
    def size(self) -> float:
        """The scale of efforts: they grow from atom to atom, but less than the energy."""
        return float(abs(self.atom.shells.limit) ** 0.25)

    def places_of(self, names: str) -> dict[tuple[object, ...], list[int]]:
        """Where the numbers of each kind, or each role, are."""
        if names not in self._sorted:
            found: dict[tuple[object, ...], list[int]] = {}
            for at, name in enumerate(getattr(self, names)):
                found.setdefault(name, []).append(at)
            self._sorted[names] = found
        return self._sorted[names]

    @cached_property
    def _sorted(self) -> dict[str, dict[tuple[object, ...], list[int]]]:
        return {}

    @cached_property
    def blur(self) -> Floats:
        """What printed digits and an unfinished iteration add to the gradient, shape (n,)."""
        digits = np.array([_digits(self.atom, number) for number in self.numbers])
        return np.asarray(np.sqrt((self.curvature**2) @ digits**2 + _NOISE**2))

    @cached_property
    def places(self) -> tuple[tuple[str, str, int, int | None], ...]:
        """For each number the letters and the name of its shell, its row and its column."""
        block = self.atom.block
        return tuple(
            (block.shells[n.shell].letters, block.names[n.shell], n.row, n.column)
            for n in self.numbers
        )

    @cached_property
    def roles(self) -> tuple[tuple[object, ...], ...]:
        """For each number what decides how loose it may be: kind, and place counted from outside.

        The outermost functions were made for molecules, or hold few electrons; the innermost are
        the sharpest.
        """
        shells = self.atom.block.shells
        found = []
        for n in self.numbers:
            letters, size = shells[n.shell].letters, len(shells[n.shell].exponents)
            behind = self._behind[n.shell]
            place = (min(behind, 2), 0) if size == 1 else (min(behind, 1), min(size - 1 - n.row, 2))
            found.append((letters, n.column is None, size == 1, *place))
        return tuple(found)

    @cached_property
    def _behind(self) -> dict[int, int]:
        """How many shells of the same letters follow each shell that holds a number."""
        shells = self.atom.block.shells
        held = sorted({n.shell for n in self.numbers})
        return {
            at: sum(shells[other].letters == shells[at].letters for other in held if other > at)
            for at in held
        }

    @cached_property
    def spare(self) -> list[int]:
        """Lone functions of an l that only closed inner shells have: made for molecules."""
        atom = self.atom
        if atom.shells.text.endswith("p6"):
            return []
        inner = {l for l, held in atom.shells.electrons.items() if l and held[-1] == 4 * l + 2}
        return [
            at
            for at, number in enumerate(self.numbers)
            if len(atom.block.shells[number.shell].exponents) == 1
            and inner.issuperset(atom.block.shells[number.shell].angular)
        ]

    @cached_property
    def kinds(self) -> tuple[tuple[int, bool], ...]:
        """For each number its l and whether it is an exponent."""
        shells = self.atom.block.shells
        return tuple((shells[n.shell].angular[0], n.column is None) for n in self.numbers)


def _digits(atom: Atom, number: Number) -> float:
    """Standard error of ln|number| from rounding to its printed digits."""
    exponents, coefficients = _spellings(atom)[number.shell]
    column, value = number.column, atom.value(number)
    word = exponents[number.row] if column is None else coefficients[number.row][column]
    return half_unit(word) / abs(value) / 3**0.5 if value else 0.0


def _spellings(atom: Atom) -> list[tuple[list[str], list[list[str]]]]:
    if not hasattr(atom, "_words"):
        atom._words = [shell.spellings() for shell in atom.block.shells]  # type: ignore[attr-defined]
    return atom._words  # type: ignore[attr-defined, no-any-return]


def steps_of(atom: Atom) -> Steps | None:
    """The steps of an atom, or None where it has no energy."""
    found = atom.response
    if found is None or not (
        np.isfinite(found.gradient).all() and np.isfinite(found.curvature).all()
    ):
        return None
    return Steps(atom, tuple(atom.numbers), found.gradient, found.curvature)


@dataclass(frozen=True, eq=False)
class Usual:
    """What the steps of an atom should be: for each number a value, and its scatter.

    stiffness: second derivatives that turn gradients into steps.  others: neighbours it rests on.
    """

    centre: Floats
    scatter: Floats
    stiffness: Floats
    others: int

    @property
    def token(self) -> str:
        """Equal where the same is expected."""
        parts = b"".join(a.tobytes() for a in (self.centre, self.scatter, self.stiffness))
        return sha256(parts).hexdigest()

    def chi(self, gradient: Floats) -> Floats:
        """Departures of an atom's steps in units of the scatter, shape (n,)."""
        away: Floats = (-gradient / self.stiffness - self.centre) / self.scatter
        return away


def usual(
    own: Steps, others: Sequence[Steps], mates: Sequence[Steps], file: Sequence[Steps]
) -> Usual:
    """From the neighbours of one pattern, or where they are few from the period or the whole set.

    others: steps of neighbours with the same numbers, this atom's not among them.  mates: those of
    the whole period.  file: those of all other atoms of the set.
    """
    alike = np.array([*(other.stiffness for other in others), own.stiffness])
    stiffness = np.maximum(np.median(alike, axis=0), _SOFT)
    blur = own.blur / stiffness
    here = own.atom.block.atomic_number
    if len(others) >= 3:
        table = np.array([other.gradient for other in others])
        centre, spread = by_both(here, _charges(others), -table / stiffness)
        for kind in set(own.kinds):
            places = [at for at, each in enumerate(own.kinds) if each == kind]
            # A few neighbours may agree by chance.
            spread[places] = np.hypot(spread[places], 0.5 * np.median(spread[places]))
    else:
        centre, spread = np.zeros(len(own.numbers)), _by_role(own, file, stiffness)
        for other in others:
            spread = np.maximum(spread, 2.0 * np.abs(other.gradient / stiffness))
        spread = np.hypot(spread, np.hypot(blur, _LONE / stiffness))
        _by_period(own, mates, stiffness, centre, spread)
        blur = np.zeros(len(own.numbers))
    spread[own.spare] += 1.0
    return Usual(centre, np.sqrt(spread**2 + blur**2 + _FINEST**2), stiffness, len(others))


def _charges(others: Sequence[Steps]) -> Floats:
    return np.array([float(other.atom.block.atomic_number) for other in others])


def _by_period(
    own: Steps, mates: Sequence[Steps], stiffness: Floats, centre: Floats, spread: Floats
) -> None:
    """Put in what the period tells, letter by letter, where shells of a letter have one pattern."""
    z = own.atom.block.atomic_number
    for letters in {place[0] for place in own.places}:
        here = [at for at, place in enumerate(own.places) if place[0] == letters]
        wanted = [own.places[at] for at in here]
        alike, rows = [], []
        for mate in mates:
            there = [at for at, place in enumerate(mate.places) if place[0] == letters]
            if [mate.places[at] for at in there] == wanted:
                alike.append(mate)
                rows.append(-mate.gradient[there] / stiffness[here])
        if len(alike) >= 3:
            middle, away = by_medians(z, _charges(alike), np.array(rows))
            away = 3.0 * away + _STRANGE
            better = away < spread[here]
            for at, value, size, is_better in zip(here, middle, away, better, strict=True):
                if is_better:
                    centre[at], spread[at] = value, size


def _by_role(own: Steps, file: Sequence[Steps], stiffness: Floats) -> Floats:
    """How large the steps of an element without neighbours can be, by the rest of the set.

    Whoever varies a number stops where nothing is gained any more, g**2 / 2H; so what numbers of
    one role have in common from one element to the next is the size of g / sqrt(H).
    """
    spread = np.full(len(own.numbers), _UNKNOWN)
    for names in ("kinds", "roles"):
        sizes: dict[tuple[object, ...], list[Floats]] = {}
        for other in file:
            for role, places in other.places_of(names).items():
                sizes.setdefault(role, []).append(other.effort[places])
        for role, places in own.places_of(names).items():
            known = np.sort(np.concatenate(sizes.get(role, [np.zeros(0)])))
            if len(known) >= _ENOUGH:
                usual = float(known[int(_MOSTLY * len(known))])
                spread[places] = _AMPLE * usual * own.size / np.sqrt(stiffness[places])
    return spread


@dataclass(frozen=True, eq=False)
class Explanation:
    """One number as the explanation of an atom's steps.

    change: of ln|number|.  before, after: chi squared without and with it.
    """

    number: Number
    change: float
    before: float
    after: float


def explanations(own: Steps, expected: Usual) -> list[Explanation]:
    """All numbers as explanations, but those that were not made for the atom; the best first."""
    away = expected.chi(own.gradient)
    patterns = own.curvature / (expected.stiffness * expected.scatter)[None, :]
    lengths = np.sqrt((patterns**2).sum(axis=1))
    along = patterns @ away
    gains = (along / np.maximum(lengths, 1e-300)) ** 2
    before = float(away @ away)
    found = [
        Explanation(
            number, float(a / max(length * length, 1e-300)), before, max(before - float(gain), 0.0)
        )
        for at, (number, a, length, gain) in enumerate(
            zip(own.numbers, along, lengths, gains, strict=True)
        )
        if at not in own.spare
    ]
    return sorted(found, key=lambda e: e.after)


def significance(before: float, after: float, count: int) -> float:
    """Of a change that takes chi squared from ``before`` to ``after``, in standard errors.

    The scatter is that of the other elements, or that of what the change leaves unexplained in the
    atom's own ``count`` numbers where that is larger; of many numbers most say nothing.
    """
    return float((max(before - after, 0.0) / (1.0 + after / min(count, TELLING))) ** 0.5)
