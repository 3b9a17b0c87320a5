"""Columns of general contractions against the atom's own orbitals.

The energy hardly feels a column's coefficient where other columns and lone primitives can make up
for it.  But such columns are the orbitals of the uncontracted atom, so each coefficient can be held
against the orbital's: over the primitives of the column both differ by one factor only.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from overlapse.grammar.model import Floats
from overlapse.rules.atomic.atoms import Atom, Number
from overlapse.rules.atomic.rows import by_medians, by_squares
from overlapse.rules.rowwise.norms import half_unit

_LEAST = 4  # primitives of a column that is compared
_ALIKE = 0.03  # median departure of a column that is an orbital
_CLOSE = 3e-4  # median departure of a column that was printed as the orbital
_CLOSEST = 3e-3  # and its largest but one
_GROSS = 0.3  # departure that counts without neighbours: sets add functions to the atom's own
_FINEST = 3e-4


@dataclass(frozen=True, eq=False)
class Column:
    """A column that is one of the atom's orbitals.

    numbers: its coefficients.  own: as printed; orbital: those of the orbital, scaled to them.
    departure: own over orbital less one.  blur: what printed digits make of it.
    """

    atom: Atom
    numbers: tuple[Number, ...]
    own: Floats
    orbital: Floats
    departure: Floats
    blur: Floats


def columns_of(atom: Atom) -> list[Column]:
    """The columns of an atom that are orbitals of its uncontracted primitives."""
    bare = atom.uncontracted
    if bare is None or not bare.converged:
        return []
    found = []
    for l, owners in atom.owners.items():
        orbitals = bare.orbitals[l]
        for function, (index, column) in enumerate(owners):
            shell = atom.block.shells[index]
            rows = np.flatnonzero(shell.coefficients[:, column])
            if len(rows) < _LEAST or len(set(shell.exponents[rows].tolist())) < len(rows):
                continue
            places = [
                int(np.flatnonzero(atom.exponents[l] == shell.exponents[row])[0]) for row in rows
            ]
            own = atom.functions[l][places, function]
            if np.count_nonzero(atom.functions[l][places], axis=1).mean() < 1.5:
                continue  # a segmented contraction: its primitives are its own
            scale = float(shell.coefficients[rows[0], column] / own[0])
            best = _best(own, orbitals[places])
            if best is None:
                continue
            words = [row[column] for row in shell.spellings()[1]]
            printed = own * scale
            half = np.array([half_unit(words[row]) for row in rows])
            size = np.maximum(np.abs(best * scale), 1e-3 * np.abs(printed).max())
            numbers = tuple(Number(index, int(row), column) for row in rows)
            departure = (printed - best * scale) / size
            found.append(
                Column(atom, numbers, printed, best * scale, departure, half / 3**0.5 / size)
            )
    return found


def _best(own: Floats, orbitals: Floats) -> Floats | None:
    """The orbital that a column is, scaled to it, or None."""
    found: list[tuple[float, Floats]] = []
    for orbital in orbitals.T:
        with np.errstate(all="ignore"):
            ratio = own / orbital
        heavy = np.argsort(-np.abs(own))[: max(3, len(own) * 2 // 3)]
        factor = float(np.median(ratio[heavy]))
        if not np.isfinite(factor) or factor == 0.0:
            continue
        scaled = factor * orbital
        away = float(np.median(np.abs(own[heavy] - scaled[heavy]) / np.abs(scaled[heavy])))
        found.append((away, scaled))
    away, scaled = min(found, key=lambda each: each[0], default=(np.inf, own))
    return scaled if away < _ALIKE else None


@dataclass(frozen=True)
class Stray:
    """A coefficient that is not its orbital's, while the others of its column are.

    value: what it should be; error: relative standard error.  times: its departure over the usual.
    """

    atom: Atom
    number: Number
    value: float
    error: float
    times: float
    others: int


def strays(column: Column, others: Sequence[Column]) -> list[Stray]:
    """At most one coefficient of a column that departs by itself.

    others: the same column of the neighbours.  Two ways along the row must agree: some columns bend
    along it, and in others single neighbours fall out.
    """
    if len(others) < 3:
        return _alone(column, others)
    here = column.atom.block.atomic_number
    z = np.array([float(other.atom.block.atomic_number) for other in others])
    table = np.array([other.departure for other in others])
    found = []
    for fit in (by_medians, by_squares):
        centre, spread = fit(here, z, table)
        spread = np.hypot(spread, 0.5 * float(np.median(spread)))
        found.append(_worst(column, len(others), centre, spread))
    weaker = min(found, key=lambda stray: stray.times)
    return [weaker] if found[0].number == found[1].number else []


def _alone(column: Column, others: Sequence[Column]) -> list[Stray]:
    """The same without neighbours: only a column that is an orbital to the last digits tells."""
    centre = np.zeros(len(column.numbers))
    spread = np.full(len(centre), 2e-3 + 4.0 * float(np.median(np.abs(column.departure))))
    stray = _worst(column, len(others), centre, spread)
    sizes = np.abs(column.departure)
    worst = column.numbers.index(stray.number)
    rest = np.delete(sizes, worst)
    sure = float(np.median(sizes)) < _CLOSE and float(rest.max()) < _CLOSEST
    return [stray] if sure and sizes[worst] >= _GROSS else []


def _worst(column: Column, others: int, centre: Floats, spread: Floats) -> Stray:
    """The coefficient that departs most, over what the others of the column depart by."""
    scatter = np.sqrt(spread**2 + (2.0 * column.blur) ** 2 + _FINEST**2)
    away = np.abs(column.departure - centre) / scatter
    worst = int(np.argmax(away))
    rest = float(np.median(np.delete(away, worst)))
    size = column.departure[worst] - centre[worst]
    usual = max(abs(float(column.orbital[worst])), 1e-3 * float(np.abs(column.own).max()))
    value = float(column.own[worst] - size * usual)
    error = float(scatter[worst] * usual / max(abs(value), 1e-300))
    times = float(away[worst] / np.hypot(1.0, rest))
    return Stray(column.atom, column.numbers[worst], value, error, times, others)
