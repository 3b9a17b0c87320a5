"""Contractions: is each normalised, where the set shows that it should be?"""

from collections.abc import Iterable, Iterator
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import Block, Shell, letter_of
from overlapse.rules.case import Case
from overlapse.rules.families.expected import unnormalised_as_published
from overlapse.rules.finding import Edit, Finding
from overlapse.rules.physics.trends import quantile
from overlapse.rules.registry import rule
from overlapse.rules.repair import rescaled
from overlapse.rules.rowwise.norms import (
    NORMALISED,
    Culprit,
    Norm,
    culprit,
    left_out,
    look_alike,
    rounding,
)
from overlapse.rules.rowwise.rows import Row, rows_of


@rule("contraction.norm")
def norm(case: Case, *, share: float = 0.9, floor: float = 3e-6) -> Iterator[Finding]:
    """A contraction is not normalised although its neighbours, or nearly all of the set, are.

    A wrong digit in an exponent or a coefficient, or a lost row, moves the self-overlap away from
    one.  Programs rescale the contraction when they read it, so nothing shows but a wrong shape of
    the function and an energy that is a little too high.  A plain test would cry wolf, since half
    of all published contractions are printed unnormalised: so a self-overlap other than one counts
    where the same contraction of the neighbours in the row is normalised, or nearly all
    contractions of the set are.  A set that is printed unnormalised throughout gets one note.
    Segmented forms of general contractions leave out the primitive that also stands alone; where
    that one would restore the norm it is named, and the contraction is a note.

    Formula: <f|f> = sum_ij c_i c_j (2 sqrt(a_i a_j) / (a_i + a_j)) ** (l + 3/2) for coefficients
    over normalised primitives; the factor that mends it is 1 / sqrt(<f|f>).

    Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000.
    The two self-overlaps that differ in published files are told in R. C. Raffenetti, J. Chem.
    Phys. 58, 4452 (1973) (general contraction) and its segmented forms.

    Limits: share: the part of the set that must be normalised before one that is not is evidence.
    floor: departures below it never count; above it, three times what the printed digits explain
    and ten times what the neighbours show.

    Remedy: compare the number pointed at with the original publication.  To rescale the
    contraction instead would hide the slip.

    Bad::

        C 0
        S 2 1.00
          2.0 0.48
          0.4 0.68
        S 3 1.00
          9.0 0.15
          2.5 0.55
          0.7 0.45
        S 3 1.00
          5.0 0.1540
          1.0 0.5344
          0.2 0.6357
        ****

    Good::

        C 0
        S 2 1.00
          5.0 1.0
          1.0 1.0
        S 2 1.00
          4.0 0.5
          0.2 0.5
        ****
    """
    for index, (members, found) in enumerate(zip(case.sets, case.norms, strict=True)):
        broken = [n for n in found if not (np.isfinite(n.overlap) and n.overlap > 0.0)]
        for off in broken:
            yield case.at_shell(
                off.block,
                off.shell,
                "error",
                f"self-overlap {off.overlap:g} is not positive and finite",
                function=off.function,
                measured=off.overlap,
                limit=0.0,
                remedy="the coefficients cancel one another or are far out of range",
            )
        judged, sound, evident = norm_evidence(case, share, floor)[index]
        if evident:
            # The narrow rows first: where both hold a contraction they are the smoother ones.
            rows = [*rows_of(members), *rows_of(members, True)]
            yield from _odd_ones(case, evident, sound, rows)
        plain = [n for n in judged if n.deviation >= NORMALISED and n not in evident]
        if plain and len(sound) < share * len(judged):
            yield _throughout(case, plain, len(judged))


class Evidence(NamedTuple):
    """Contractions of a set whose norm can be judged, those in order, and those evidently off."""

    judged: list[Norm]
    sound: list[Norm]
    evident: list[Norm]


def norm_evidence(case: Case, share: float = 0.9, floor: float = 3e-6) -> list[Evidence]:
    """For each set, what its norms tell; the limits are those of the rule `contraction.norm`."""

    def of_set(norms: list[Norm]) -> Evidence:
        # A shell whose form is at fault has been reported; its norm only follows from that.
        judged = [
            n
            for n in norms
            if np.isfinite(n.overlap) and n.overlap > 0.0 and not case.is_faulty(n.block, n.shell)
        ]
        sound = [n for n in judged if n.deviation < NORMALISED]
        scale = _Scale(judged, sound, share, floor)
        evident = [n for n in judged if n.deviation > floor and scale.is_evident(n)]
        return Evidence(
            judged, [n for n in sound if n not in evident] if evident else sound, evident
        )

    return case.shared(f"norms {share} {floor}", lambda: [of_set(norms) for norms in case.norms])


def spoiled_shells(case: Case) -> set[tuple[int, int]]:
    """Shells, by id of block and index, that a norm shows to hold a wrong number."""
    found: set[tuple[int, int]] = set()
    for evidence in norm_evidence(case):
        shells = {(id(off.block), off.shell): off for off in evidence.evident}
        found |= {key for key, off in shells.items() if not _is_throughout(off.block, shells)}
    return found


def _is_throughout(block: Block, shells: Iterable[tuple[int, int]]) -> bool:
    """Whether so many shells of a block are off that it was printed unnormalised as a whole.

    A slip spoils one shell.
    """
    off = sum(key == id(block) for key, _ in shells)
    return off >= 3 and off >= 0.6 * sum(len(shell.exponents) > 1 for shell in block.shells)


class _Scale:
    """How far from one a self-overlap must be before it is evidence in this set."""

    def __init__(self, judged: list[Norm], sound: list[Norm], share: float, floor: float) -> None:
        self.floor = floor
        self.sound = sound
        # How far the contractions that are meant to be normalised usually are from one.
        self.usual = quantile([n.deviation for n in sound], 0.9) if sound else 0.0
        others, alike = len(judged) - 1, len(sound)
        self.all_but_one = others >= 2 and alike >= share * others
        self.often = alike * 2 >= others
        self.places: dict[tuple[int, str, int], list[Norm]] = {}
        for n in judged:
            self.places.setdefault(self._place(n), []).append(n)

    @staticmethod
    def _place(n: Norm) -> tuple[int, str, int]:
        return n.function.l, n.block.names[n.shell], n.function.column

    def is_evident(self, off: Norm) -> bool:
        """Ask the same contraction of the neighbours in the row first, then the whole set."""
        z = off.block.atomic_number
        near = [
            n.deviation
            for n in self.places[self._place(off)]
            if n.block is not off.block and abs(n.block.atomic_number - z) <= 3
        ]
        if len(near) >= 2 and max(near) < NORMALISED and self.often:
            limit = 10.0 * max(near)
        elif self.all_but_one:
            # Where the neighbours are printed unnormalised too, this is how the row was printed,
            # unless the set's other expansions tell which number is wrong.
            if (
                len(near) >= 2
                and quantile(near, 0.5) >= NORMALISED
                and not look_alike(off, self.sound)[0]
            ):
                return False
            limit = max(20.0 * self.usual, 1e-4)
        else:
            return False
        return off.deviation > max(limit, self.floor) and off.deviation > 3.0 * rounding(off)


def _odd_ones(
    case: Case, evident: list[Norm], sound: list[Norm], rows: list[Row]
) -> Iterator[Finding]:
    """One finding for each shell that has contractions off their norm."""
    shells: dict[tuple[int, int], list[Norm]] = {}
    for off in evident:
        shells.setdefault((id(off.block), off.shell), []).append(off)
    told: set[int] = set()
    for (block, _), group in shells.items():
        if not _is_throughout(group[0].block, shells):
            yield _odd_one(case, group, sound, rows)
        elif block not in told:
            told.add(block)
            yield _element_throughout(case, [n for n in evident if id(n.block) == block])


def _element_throughout(case: Case, off: list[Norm]) -> Finding:
    low, high = min(n.overlap for n in off), max(n.overlap for n in off)
    return case.at_shell(
        off[0].block,
        off[0].shell,
        "note",
        f"{len(off)} contractions of {off[0].block.symbol} have self-overlaps other than one "
        f"({low:.4g} to {high:.4g}), unlike the other elements of this set: its numbers come from "
        "another source, or an exponent that they share is wrong; this is the first",
        function=off[0].function,
        measured=off[0].overlap,
        expected=1.0,
        remedy="compare with the original publication; programs rescale contractions",
    )


def _odd_one(case: Case, group: list[Norm], sound: list[Norm], rows: list[Row]) -> Finding:
    off = max(group, key=lambda n: n.deviation)
    shell = off.block.shells[off.shell]
    parts = ", ".join(
        f"{letter_of(n.function.l)} part {_short(n.overlap)}" if len(shell.angular) > 1
        else _short(n.overlap)
        for n in group
    )  # fmt: skip
    told, row, value = look_alike(off, sound)
    guess: Culprit | None = None
    if row is not None and value is not None:
        guess = Culprit(row, False, value, told)
    elif not told:
        guess = culprit(off, rows)
    published = unnormalised_as_published(
        off.block.atomic_number, len(off.function.exponents), off.overlap
    )
    is_clear = guess is not None and guess.clear
    factor = 1.0 / np.sqrt(off.overlap)
    witnesses = [f"{len(sound)} contractions of this set are normalised"]
    message = f"self-overlap {parts} where 1 is expected"
    expected: float | str | None = 1.0
    place: dict[str, int | None] = {}
    if published:
        message += f"; {published}"
    elif guess is not None:
        what = "exponent" if guess.exponent else "coefficient"
        column = None if guess.exponent else off.function.column
        place = {"row": guess.row, "column": column}
        expected = float(f"{guess.value:.10g}")
        told = "should probably be" if guess.clear else "is the likeliest culprit; it might be"
        message += f"; {what} {shell.spelling(guess.row, column)} {told} {guess.value:.8g}"
        witnesses.append(guess.why)
    elif told:
        message += f"; {told}"
    absent = left_out(off) if guess is None and not told and not published else None
    if absent is not None:
        message += (
            f"; it would be one with the primitive of exponent {absent.exponent:.6g} in it, which "
            f"stands alone as {absent.shell}, at a coefficient of about {absent.coefficient:.3g}: "
            "segmented forms leave such a primitive out"
        )
        witnesses.append(f"{absent.shell} follows on the exponents of this contraction")
    is_minor = off.deviation < 1e-4 and not is_clear
    return case.at_shell(
        off.block,
        off.shell,
        "note" if published or is_minor or absent is not None else "warning",
        message,
        function=off.function,
        **place,
        measured=off.overlap,
        limit=1.0,
        expected=expected,
        witnesses=tuple(witnesses),
        edits=() if published else _renormalised(shell, group),
        remedy=(
            "nothing to do: programs rescale it"
            if published
            else "compare with the original publication; the factor "
            f"{factor:.8g} on its coefficients would restore the norm but hide a slip"
        ),
    )


def _renormalised(shell: Shell, group: list[Norm]) -> tuple[Edit, ...]:
    """Edits that make the self-overlap of each of the functions one; all of them or none."""
    each = [rescaled(shell, n.function, float(1.0 / np.sqrt(n.overlap))) for n in group]
    return tuple(edit for edits in each for edit in edits) if all(each) else ()


def _short(value: float) -> str:
    return f"{value:.7f}" if abs(value - 1.0) < 1e-3 else f"{value:.5g}"


def _throughout(case: Case, plain: list[Norm], count: int) -> Finding:
    low, high = min(n.overlap for n in plain), max(n.overlap for n in plain)
    first = plain[0]
    return case.at_shell(
        first.block,
        first.shell,
        "note",
        f"{len(plain)} of {count} contractions of this set are printed unnormalised "
        f"(self-overlap {low:.3g} to {high:.3g}), so norms say nothing about its numbers; "
        "this is the first",
        function=first.function,
        measured=first.overlap,
        expected=1.0,
        remedy="nothing to do: programs rescale contractions when they read them",
    )
