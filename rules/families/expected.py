"""What a label promises for an element, as contraction lengths for each angular momentum.

The digits of N-MPG and the n of STO-nG say it by formula; rows that do not follow them, added
functions and published ranges are data (`pople.json`, `slater.json`).
"""

import json
from collections.abc import Iterator
from functools import cache
from importlib.resources import files
from itertools import product
from typing import Any, NamedTuple

from overlapse.grammar.designation import Designation
from overlapse.grammar.elements import number_of, period_of

Lengths = dict[int, tuple[int, ...]]
_LETTERS = "spdfghi"


class Promise(NamedTuple):
    """Contraction lengths per l, longest first.

    plain: without polarization and diffuse functions.  full: all of it.  optional: functions that
    some published files have and some lack.  why: a remark on an irregular row.
    """

    plain: Lengths
    full: Lengths
    optional: Lengths
    why: str = ""


@cache
def _data(name: str) -> Any:
    return json.loads(files("overlapse.rules.families").joinpath(f"{name}.json").read_text("utf-8"))


@cache
def within(ranges: str, z: int) -> bool:
    """Whether an element lies in a list of ranges such as "H-Ne,P-Cl"."""
    for part in ranges.split(","):
        first, _, last = part.partition("-")
        low, high = number_of(first), number_of(last)
        assert low is not None and high is not None, part
        if low <= z <= high:
            return True
    return False


def _row(rows: dict[str, Any], z: int) -> Any:
    return next((value for ranges, value in rows.items() if within(ranges, z)), None)


@cache
def promise(designation: Designation, z: int) -> Promise | None:
    """What a label promises for an element, or None where the set is not defined for it."""
    return _slater(designation, z) if designation.family == "STO-nG" else _split(designation, z)


def _slater(designation: Designation, z: int) -> Promise | None:
    data = _data("slater")
    n, row = designation.core, period_of(z)
    if not within(data["elements"].get(str(n), "H-Ar"), z):
        return None
    plain: Lengths = {0: (n,) * row}
    if z > 2:
        plain[1] = (n,) * (row - 1)
    if d := _row(data["d"], z):
        plain[2] = (n,) * d
    added = _row(data["star"], z) if designation.stars else None
    return Promise(plain, _with(plain, _by_l(added or {})), {})


def _split(designation: Designation, z: int) -> Promise | None:
    data = _data("pople")
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
        stars = _row(known.get("star", usual["star"]), z)
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
    elif designation.diffuse and z > 2:
        why = "no diffuse functions were published for this element"
    return Promise(plain, _with(plain, added), optional, why)


def _plain(designation: Designation, known: dict[str, Any], z: int) -> tuple[Lengths, str]:
    if (irregular := _row(known.get("rows", {}), z)) is not None:
        return {_LETTERS.index(l): tuple(n) for l, n in irregular.items()}, known.get("why", "")
    core, valence, row = designation.core, designation.valence, period_of(z)
    plain: Lengths = {0: (core,) * (row - 1) + valence}
    if z > 2:
        plain[1] = (core,) * (row - 2) + valence
    if (d := _row(known.get("d", {}), z)) is not None:
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
    known = _data("pople")["printed_unnormalised"]["He"]
    close = abs(self_overlap - known["self_overlap"]) < 1e-3
    return str(known["why"]) if z == 2 and length == known["length"] and close else ""


def candidates() -> Iterator[Designation]:
    """Labels that are tried when one is sought that fits, plain ones first."""
    for n in (3, 6, 2, 4, 5):
        for stars in (0, 1):
            yield Designation("STO-nG", n, stars=stars)
    cores = [(3, (2, 1)), (4, (3, 1)), (6, (3, 1)), (6, (2, 1)), (6, (3, 1, 1)), (5, (3, 1))]
    d, p = (((2, 1),),), (((1, 1),),)
    decorations: list[tuple[Any, Any, int]] = [
        ((), (), 0), (d[0], (), 1), (d[0], p[0], 2),
        (((2, 2),), (), 0), (((2, 2),), ((1, 1),), 0), (((2, 2),), ((1, 2),), 0),
        (((2, 1), (3, 1)), ((1, 1),), 0), (((2, 2), (3, 1)), ((1, 1),), 0),
        (((2, 2), (3, 1)), ((1, 2), (2, 1)), 0),
        (((2, 3),), ((1, 3),), 0), (((2, 3), (3, 1)), ((1, 3), (2, 1)), 0),
    ]  # fmt: skip
    for (core, valence), (heavy, light, stars), diffuse in product(cores, decorations, (0, 1, 2)):
        yield Designation("N-MPG", core, valence, diffuse, heavy, light, stars)
