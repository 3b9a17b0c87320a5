"""Spacing: exponents out of order, or with a gap that the set shows nowhere else."""

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from overlapse.grammar.elements import valence
from overlapse.grammar.model import BasisSet, Block, Floats, letter_of
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule

_LONE = 2  # the kind of ladder that lone functions make


class _Ladder(NamedTuple):
    """Exponents of one shell, or of the lone functions of one l, as they stand.

    kind: 0 for a single contraction, 1 for a matrix of several, 2 for lone functions.  ordinal: of
    the shell among those of its l.  places: (shell, row) of each.
    """

    block: Block
    l: int
    kind: int
    ordinal: int
    places: list[tuple[int, int]]
    logs: Floats


@rule("primitive.gap")
def gap(case: Case, *, margin: float = 1.2, fewest: int = 12) -> Iterator[Finding]:
    """Suspect: an exponent breaks the order or the spacing that the set keeps everywhere else.

    Exponents fall from row to row of a contraction, and from one lone function to the next.  The
    order itself has no meaning, but where a whole set keeps it and one shell does not, a decimal
    point, a digit or a row slipped.  The same holds for a gap between neighbours that is far
    wider or narrower than at this place in all other elements.  No row of the periodic table is
    needed, so the first two columns are judged as well.

    Formula: ln(a_i / a_{i+1}) against the range of the same place (l, contraction, length) in the
    other elements of the set.

    Source: even spacing of ln(exponent): R. D. Bardo, K. Ruedenberg, J. Chem. Phys. 60, 918 (1974).

    Limits: margin: by how much ln(a_i / a_{i+1}) may lie outside the range of the others (1.2 is a
    factor of 3.3).  fewest: ladders that must keep the order before one that does not is told.
    Measured: one finding per 100 elements in 25 published sets of H-Kr, two in 21 others.

    Remedy: compare the number with the original publication.

    Bad::

        H 0
        S 3 1.00
          13.0 0.02
          19.6 0.14
          0.44 0.48
        ****
        He 0
        S 3 1.00
          38.4 0.02
          5.8 0.15
          1.24 0.47
        ****
        Li 0
        S 3 1.00
          85.0 0.02
          13.0 0.15
          2.9 0.47
        ****

    Good::

        H 0
        S 3 1.00
          13.0 0.02
          1.96 0.14
          0.44 0.48
        ****
        He 0
        S 3 1.00
          38.4 0.02
          5.8 0.15
          1.24 0.47
        ****
        Li 0
        S 3 1.00
          85.0 0.02
          13.0 0.15
          2.9 0.47
        ****
    """
    for odd in spacing_oddities(case, margin, fewest):
        yield _out_of_order(case, odd) if odd.is_order else _wide(case, odd)


class Odd(NamedTuple):
    """An exponent out of order or beside an odd gap.

    place, gap: indices into the ladder.  others: ladders that show what is usual.  is_loud:
    whether it is more than a note: lone functions stand in any order and far apart in good faith.
    bound: the ratio of exponents that an odd gap goes beyond.
    """

    ladder: "_Ladder"
    place: int
    gap: int
    is_order: bool
    others: int
    is_loud: bool
    bound: float | None = None

    @property
    def shell(self) -> tuple[int, int]:
        return id(self.ladder.block), self.ladder.places[self.place][0]


def spacing_oddities(case: Case, margin: float = 1.2, fewest: int = 12) -> list[Odd]:
    """Exponents of all sets that break the order or the spacing of their set; for each shell one.

    The limits are those of the rule `primitive.gap`.
    """
    return case.shared(
        f"spacing {margin} {fewest}",
        lambda: [odd for members in case.sets for odd in _of_set(members, margin, fewest)],
    )


def _of_set(members: BasisSet, margin: float, fewest: int) -> list[Odd]:
    ladders = list(_ladders(members))
    found = []
    # Each kind keeps its own habits.
    for kind in range(3):
        alike = [ladder for ladder in ladders if ladder.kind == kind]
        broken = [ladder for ladder in alike if not _falls(ladder)]
        kept = len(alike) - len(broken)
        is_habit = kept >= min(fewest, len(members.blocks) - 1) and kept >= 2
        # One is a slip; more are one only among very many.
        if is_habit and len(broken) <= max(1, 0.02 * kept):
            loud = kind < _LONE and len(broken) == 1
            found += [Odd(ladder, _misplaced(ladder), 0, True, kept, loud) for ladder in broken]
    told = {odd.shell for odd in found}
    return found + [odd for odd in _gaps(ladders, margin) if odd.shell not in told]


def _ladders(members: BasisSet) -> Iterator[_Ladder]:
    for block in members.blocks:
        lone: dict[int, list[tuple[int, int]]] = {}
        seen: dict[int, int] = {}
        for index, shell in enumerate(block.shells):
            l = shell.angular[0]
            if not (shell.exponents > 0.0).all():
                continue
            if len(shell.exponents) == 1:
                lone.setdefault(l, []).append((index, 0))
                continue
            seen[l] = seen.get(l, -1) + 1
            places = [(index, row) for row in range(len(shell.exponents))]
            kind = int(shell.columns_per_l > 1)
            yield _Ladder(block, l, kind, seen[l], places, np.log(shell.exponents))
        # Lone p functions of alkali and alkaline-earth atoms serve the core and polarization, in an
        # order and spacing of their own.
        if set(valence(block.atomic_number)) == {0} and block.atomic_number > 2:
            lone.pop(1, None)
        for l, places in lone.items():
            if len(places) > 1:
                values = [float(block.shells[index].exponents[0]) for index, _ in places]
                yield _Ladder(block, l, _LONE, 0, places, np.log(values))


def _falls(ladder: _Ladder) -> bool:
    # Equal exponents are told elsewhere.
    return bool((np.diff(ladder.logs) <= 0.0).all())


def _misplaced(ladder: _Ladder) -> int:
    """The place whose removal leaves a falling ladder, the one that stands out most."""
    logs = ladder.logs
    places = [at for at in range(len(logs)) if (np.diff(np.delete(logs, at)) <= 0.0).all()] or list(
        range(len(logs))
    )
    even = np.linspace(logs.max(), logs.min(), len(logs))
    return max(places, key=lambda at: abs(logs[at] - even[at]))


def _out_of_order(case: Case, odd: Odd) -> Finding:
    ladder = odd.ladder
    index, row = ladder.places[odd.place]
    shell = ladder.block.shells[index]
    return case.at_shell(
        ladder.block,
        index,
        "warning" if odd.is_loud else "note",
        f"suspect: exponent {shell.spelling(row)} breaks the order of these "
        f"{letter_of(ladder.l)} exponents, which fall in {odd.others} other places of this set",
        row=row,
        measured=float(shell.exponents[row]),
        witnesses=(f"{odd.others} contractions and series of lone functions are in order",),
        remedy="compare with the original publication: the point or digits may have slipped",
    )


def _gaps(ladders: list[_Ladder], margin: float) -> Iterator[Odd]:
    groups: dict[tuple[int, int, int, int], list[_Ladder]] = {}
    for ladder in ladders:
        key = (ladder.l, ladder.kind, ladder.ordinal, len(ladder.logs))
        groups.setdefault(key, []).append(ladder)
    for group in groups.values():
        gaps = -np.diff(np.array([ladder.logs for ladder in group]), axis=1)
        if len(group) >= 4:
            ranked = np.sort(gaps, axis=0)
        elif group[0].kind == _LONE:
            # Few series of this length: all gaps between lone functions of this l.
            every = [
                -np.diff(other.logs)
                for other in ladders
                if other.kind == _LONE and other.l == group[0].l
            ]
            pool = np.sort(np.concatenate(every))
            if len(pool) < 8:
                continue
            ranked = np.repeat(pool[:, None], gaps.shape[1], axis=1)
        else:
            continue
        # The range of the others: a value that is itself the extreme is left out.
        low = np.where(gaps == ranked[0], ranked[1], ranked[0])
        high = np.where(gaps == ranked[-1], ranked[-2], ranked[-1])
        outside = np.maximum(low - gaps, gaps - high)
        worst = outside.argmax(axis=1)
        for row, (ladder, far, at) in enumerate(zip(group, outside, worst.tolist(), strict=True)):
            if far[at] > margin:
                place, is_wide = _at_fault(far, at, margin), gaps[row, at] > high[row, at]
                bound = np.exp(high[row, at] + margin if is_wide else low[row, at] - margin)
                others, loud = len(ranked) - 1, ladder.kind < _LONE
                yield Odd(ladder, place, at, False, others, loud, float(bound))


def _at_fault(far: Floats, at: int, margin: float) -> int:
    """Of the two exponents beside a gap the one whose other gap is odd too, or the outer one."""
    if at + 1 < len(far) and far[at + 1] > 0.5 * margin:
        return at + 1
    if at > 0 and far[at - 1] > 0.5 * margin:
        return at
    return at if at == 0 else at + 1


def _wide(case: Case, odd: Odd) -> Finding:
    ladder = odd.ladder
    index, row = ladder.places[odd.place]
    first, second = np.exp(ladder.logs[odd.gap : odd.gap + 2])
    return case.at_shell(
        ladder.block,
        index,
        "warning" if odd.is_loud else "note",
        f"suspect: the ratio of the exponents {first:.6g} and {second:.6g} is "
        f"{first / second:.3g}, far outside the {odd.others} others at such a place",
        row=row,
        measured=float(first / second),
        limit=odd.bound,
        witnesses=("spacing of the exponents",),
        remedy="compare with the original publication: the point or digits may have slipped",
    )
