"""Labels that are tried when one is sought that fits a set's contents."""

from collections.abc import Iterator
from functools import cache
from itertools import product
from typing import Any

from overlapse.grammar.designation import Designation, parse_label
from overlapse.grammar.names import usual_names
from overlapse.rules.families.counted import table

_TABLES = ("karlsruhe", "jensen", "older", "atomic", "effective", "consistent", "dyall", "fitting",
           "borrowed")  # fmt: skip


@cache
def candidates() -> tuple[Designation, ...]:
    """Known labels, those in wide use and the plain ones of a family first."""
    found = [*_slater(), *_split(), *_consistent(), *_minimally(), *_tabled()]
    return tuple(dict.fromkeys(found))


def _slater() -> Iterator[Designation]:
    for n, stars in product((3, 6, 2, 4, 5), (0, 1)):
        yield Designation("STO-nG", n, stars=stars)


def _split() -> Iterator[Designation]:
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


def _consistent() -> Iterator[Designation]:
    prefixes = ("", "aug", "jul", "jun", "may", "apr", "maug", "d-aug", "t-aug")
    for potential, core, tight, prefix, zeta in product(
        ("", "PP"), ("", "C", "wC"), (False, True), prefixes, range(2, 7)
    ):
        if potential and (tight or core == "C" or prefix not in ("", "aug")):
            continue
        yield Designation(
            "cc-pVXZ", zeta=zeta, augmentation=prefix, core_valence=core, tight=tight,
            potential=potential,
        )  # fmt: skip


def _minimally() -> Iterator[Designation]:
    for name in ("SV(P)", "SVP", "TZVP", "TZVPP", "QZVP", "QZVPP"):
        label = parse_label(f"ma-def2-{name}")
        if label is not None:
            yield label


def _tabled() -> Iterator[Designation]:
    names = usual_names()
    for file in _TABLES:
        for name in table(file)["sets"]:
            label = Designation(names[name], name=name) if name in names else parse_label(name)
            if label is not None and not label.readings:
                yield label
                if file == "jensen" and not label.augmentation:
                    yield label.but(augmentation="aug")
