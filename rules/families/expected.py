"""What a label promises for an element, as contraction lengths for each angular momentum.

The digits of N-MPG and the n of STO-nG say it by formula; rows that do not follow them, added
functions and published ranges are data (`pople.json`, `slater.json`).
"""

from functools import cache
from typing import Any, NamedTuple

from overlapse.grammar.designation import Designation
from overlapse.grammar.elements import period_of
from overlapse.rules.families.counted import row, table, within

Lengths = dict[int, tuple[int, ...]]
_LETTERS = "spdfghi"


class Promise(NamedTuple):
    """Contraction lengths per l, longest first.

    plain: without polarization and diffuse functions.  full: all of it.  optional: functions that
    some published files have and some lack.  why: a remark on an irregular row.  bare: the label's
    diffuse functions were published for other elements only.
    """

    plain: Lengths
    full: Lengths
    optional: Lengths
    why: str = ""
    bare: bool = False


@cache
def promise(designation: Designation, z: int) -> Promise | None:
    """What a digit label promises for an element, or None where the set is not defined for it."""
    return _slater(designation, z) if designation.family == "STO-nG" else _split(designation, z)


def _slater(designation: Designation, z: int) -> Promise | None:
    data = table("slater")
    n, period = designation.core, period_of(z)
    if not within(data["elements"].get(str(n), "H-Ar"), z):
        return None
    plain: Lengths = {0: (n,) * period}
    if z > 2:
        plain[1] = (n,) * (period - 1)
    if d := row(data["d"], z):
        plain[2] = (n,) * d
    added = row(data["star"], z) if designation.stars else None
    return Promise(plain, _with(plain, _by_l(added or {})), {})


def _split(designation: Designation, z: int) -> Promise | None:
    data = table("pople")
    name = f"{designation.core}-{''.join(map(str, designation.valence))}"
    known = data["sets"].get(name, {})
    if not within(known.get("elements", "H-Ar"), z):
        return None
    plain, why = _plain(designation, known, z)
    added: dict[int, int] = {}
    optional: Lengths = {}
    usual = data["usual"]
    # A single d function is the star under its other name, and means the same in each row.
    if z > 2 and designation.heavy == ((2, 1),):
        stars = row(known.get("star", usual["star"]), z)
        if stars is None:
            return None
        added |= _by_l(stars)
    else:
        added |= dict(designation.light if z <= 2 else designation.heavy)
    if designation.heavy and z > 2 and not added and name == "3-21":
        why = "the star of 3-21G adds functions to Na-Ar only"
    if designation.diffuse and within(known.get("diffuse", usual["diffuse"]), z):
        added[0] = added.get(0, 0) + 1
        added[1] = added.get(1, 0) + 1
    elif designation.diffuse == 2 and z == 1:
        added[0] = added.get(0, 0) + 1
    elif designation.diffuse == 2 and z == 2:
        optional = {0: (1,)}
    bare = bool(designation.diffuse) and z > 2 and not added.get(0)
    if bare:
        why = "no diffuse functions were published for this element"
    return Promise(plain, _with(plain, added), optional, why, bare)


def _plain(designation: Designation, known: dict[str, Any], z: int) -> tuple[Lengths, str]:
    if (irregular := row(known.get("rows", {}), z)) is not None:
        return {_LETTERS.index(l): tuple(n) for l, n in irregular.items()}, known.get("why", "")
    core, valence = designation.core, designation.valence
    period = period_of(z)
    plain: Lengths = {0: (core,) * (period - 1) + valence}
    if z > 2:
        plain[1] = (core,) * (period - 2) + valence
    if (d := row(known.get("d", {}), z)) is not None:
        plain[2] = tuple(d)
    return {l: tuple(sorted(n, reverse=True)) for l, n in plain.items()}, ""


def _by_l(counts: dict[str, int]) -> dict[int, int]:
    return {_LETTERS.index(letter): count for letter, count in counts.items()}


def _with(plain: Lengths, added: dict[int, int]) -> Lengths:
    full = dict(plain)
    for l, count in added.items():
        full[l] = full.get(l, ()) + (1,) * count
    return dict(sorted(full.items()))


def unnormalised_as_published(z: int, length: int, self_overlap: float) -> str:
    """Why a contraction is printed unnormalised in every known copy, "" if it is not."""
    known = table("pople")["printed_unnormalised"]["He"]
    close = abs(self_overlap - known["self_overlap"]) < 1e-3
    return str(known["why"]) if z == 2 and length == known["length"] and close else ""
