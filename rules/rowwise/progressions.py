"""Numbers at one place in the blocks of a row, and those that fall out of their progression.

Exponents are compared shell by shell along the ladder of all shells of one l, coefficients column
by column.  Blocks are comparable where their shells of that letter have the same lengths and they
lie in one stretch of the periodic table.
"""

from collections.abc import Callable, Iterator
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import BasisSet, Block, Floats, Shell
from overlapse.rules.physics.prediction import FEWEST, Predictions, alone, beside, predictions
from overlapse.rules.rowwise.rows import STRETCHES, in_stretches, stretch

# Exponents are believed to follow their companions to this, coefficients (in units of their size).
_FINEST = 0.003
_FINEST_LONE = 0.005
# One s electron in the valence where the neighbours have two (or none): less is believed of these.
# Source: ground-state configurations, NIST Atomic Spectra Database.
_ODD_VALENCE = frozenset((24, 29, 41, 42, 44, 45, 46, 47, 78, 79))
_ODD_WEIGHT = 0.75
_END_WEIGHT = 0.7


def _middle(values: Floats, axis: int) -> Floats:
    """The median without interpolation; numpy's own takes much longer for small tables."""
    ranked = np.sort(values, axis=axis)
    return np.asarray(ranked.take(values.shape[axis] // 2, axis=axis))


class Oddity(NamedTuple):
    """A number that departs from what the other elements of its row suggest.

    column: of the shell, None for an exponent.  departure: of ln(exponent), or of the coefficient
    in units of its usual size.  surprise: the departure in units of its spread.  rest: the largest
    surprise that is left in the element when the number is put right.  expected: the number
    suggested; low and high bound it by twice its spread.  others: elements that suggest it.
    disorder: the part of the set's other elements, shell by shell, that hold such a number as well.
    """

    block: Block
    shell: int
    row: int
    column: int | None
    departure: float
    surprise: float
    rest: float
    expected: float
    low: float
    high: float
    others: int
    disorder: float = 0.0

    @property
    def value(self) -> float:
        """The number as it stands."""
        return self.block.shells[self.shell].number(self.row, self.column)

    @property
    def strictness(self) -> float:
        """Factor on limits: below one in a set without disorder, above it in one with much."""
        return _ORDER + _DISORDER * self.disorder

    @property
    def is_alone(self) -> bool:
        """Whether the element is in order but for this number; else it goes its own way."""
        return self.rest < max(_REST, _REST_SHARE * self.surprise)


# What a corrected element may still surprise by.  Measured with changes of 10 % in 46 published
# sets: true slips leave less in nine of ten cases, elements that go their own way more in three of
# four.
_REST = 2.5
_REST_SHARE = 0.3
_TRIED = 5.0  # surprise from which on it is tried what a correction leaves


# Published sets hold such numbers in none to a third of their elements; where they are many a
# number must be odder to be noted.
_ORDER, _DISORDER = 0.65, 5.0
_FEW = 20


def _with_disorder(found: list[Oddity], judged: int) -> list[Oddity]:
    """Oddities that know how many others there are among so many elements judged."""
    share = (len(found) - 1) / max(judged, _FEW)
    return [oddity._replace(disorder=share) for oddity in found]


class _Cell(NamedTuple):
    block: Block
    shell: int
    row: int


def odd_exponents(members: BasisSet, least: float) -> list[Oddity]:
    """Exponents whose surprise is at least ``least``; of each ladder of an element one."""
    groups: dict[Any, dict[int, list[tuple[int, Shell]]]] = {}
    blocks: dict[int, Block] = {}
    for at, block in in_stretches(members):
        z = block.atomic_number
        blocks[z] = block
        ladders: dict[int, list[tuple[int, Shell]]] = {}
        for index, shell in enumerate(block.shells):
            ladders.setdefault(shell.angular[0], []).append((index, shell))
        for l, ladder in ladders.items():
            lengths = tuple((len(s.angular), len(s.exponents)) for _, s in ladder)
            groups.setdefault((at, l, lengths), {})[z] = ladder
    found: list[Oddity] = []
    judged = 0
    for group in groups.values():
        if len(group) < FEWEST:
            continue
        judged += len(group)
        numbers = tuple(sorted(group))
        values = np.array([np.concatenate([s.exponents for _, s in group[z]]) for z in numbers])
        if not (values > 0.0).all():
            continue
        ladder = group[numbers[0]]
        lone = np.repeat([len(s.exponents) == 1 for _, s in ladder],
                         [len(s.exponents) for _, s in ladder])  # fmt: skip
        orders = _orders(np.log(values), np.flatnonzero(lone))
        values = np.take_along_axis(values, orders, axis=1)
        logs = np.log(values)
        finest = np.where(lone, _FINEST_LONE, _FINEST)

        def predict(
            table: Floats, numbers: tuple[int, ...] = numbers, finest: Floats = finest
        ) -> Predictions:
            companions = [(companion, 1.0) for companion in beside(table)]
            return predictions(numbers, table, companions, finest, _FINEST**2)

        told = predict(logs)
        for at, place, surprise, rest in _oddest(numbers, logs, told, predict, least):
            z = numbers[at]
            # A lone function at the end of a row is extrapolated, with few others to tell how far.
            if at in (0, len(numbers) - 1) and lone[orders[at, place]]:
                surprise *= _END_WEIGHT
            cell = _cell(blocks[z], group[z], int(orders[at, place]))
            departure, spread = float(told.departure[at, place]), float(told.spread[at, place])
            expected = float(values[at, place] * np.exp(-departure))
            found.append(
                Oddity(
                    *cell, None, departure, surprise, rest, expected,
                    expected * float(np.exp(-2.0 * spread)),
                    expected * float(np.exp(2.0 * spread)),
                    len(numbers) - 1,
                )
            )  # fmt: skip
    return _with_disorder(found, judged)


def _orders(logs: Floats, lone: npt.NDArray[np.intp]) -> npt.NDArray[np.intp]:
    """For each element the order of its places in which lone functions correspond to the others'.

    Files list lone functions of one l in either order.  They are turned only where that makes
    them fit much better than they stand.
    """
    orders = np.tile(np.arange(logs.shape[1]), (logs.shape[0], 1))
    if len(lone) < 2:
        return orders
    usual = _middle(logs[:, lone], axis=0)
    # The order of the usual values, applied to each element's own.
    rank = np.argsort(np.argsort(-usual))
    sorted_places = np.argsort(-logs[:, lone], axis=1)[:, rank]
    turned = np.take_along_axis(logs[:, lone], sorted_places, axis=1)
    # A block may be tighter or looser as a whole, but not by much.
    shift = (turned - usual).mean(axis=1)
    as_written = np.abs(logs[:, lone] - usual - shift[:, None]).sum(axis=1)
    is_better = np.abs(turned - usual - shift[:, None]).sum(axis=1) < 0.5 * as_written - 0.1
    is_better &= np.abs(shift) < 0.6
    orders[np.ix_(is_better, lone)] = lone[sorted_places[is_better]]
    return orders


def _oddest(
    numbers: tuple[int, ...],
    values: Floats,
    told: Predictions,
    predict: Callable[[Floats], Predictions],
    least: float,
) -> Iterator[tuple[int, int, float, float]]:
    """(element, place, surprise, rest) of the elements that hold a number odd enough."""
    weight = np.array([_ODD_WEIGHT if z in _ODD_VALENCE else 1.0 for z in numbers])
    surprise = told.surprise * weight[:, None]
    for at in np.flatnonzero(surprise.max(axis=1) >= least).tolist():
        place, rest = int(surprise[at].argmax()), np.inf
        # Below this they are counted only.
        if surprise[at, place] >= _TRIED:
            place, rest = alone(predict, values, told, at, _REST_SHARE)
        yield at, place, float(surprise[at, place]), rest


def _cell(block: Block, ladder: list[tuple[int, Shell]], place: int) -> _Cell:
    for index, shell in ladder:
        if place < len(shell.exponents):
            return _Cell(block, index, place)
        place -= len(shell.exponents)
    raise IndexError(place)


class _Column(NamedTuple):
    """Coefficients at corresponding places: shapes (elements, rows used); rows are of the shell."""

    numbers: tuple[int, ...]
    column: int
    rows: tuple[int, ...]
    shells: list[tuple[Block, int]]
    relative: Floats
    logs: Floats
    sizes: Floats
    units: Floats


def odd_coefficients(members: BasisSet, least: float) -> list[Oddity]:
    """As `odd_exponents`, for the coefficients of contractions."""
    groups: dict[Any, dict[int, tuple[Block, int]]] = {}
    for block in members.blocks:
        z = block.atomic_number
        if (at := stretch(z, STRETCHES)) < 0:
            continue
        lengths: dict[tuple[int, ...], tuple[int, ...]] = {}
        for shell in block.shells:
            lengths[shell.angular] = (*lengths.get(shell.angular, ()), len(shell.exponents))
        seen: dict[tuple[int, ...], int] = {}
        for index, shell in enumerate(block.shells):
            kind = shell.angular
            seen[kind] = seen.get(kind, -1) + 1
            if len(shell.exponents) < 2 or not (shell.exponents > 0.0).all():
                continue
            used = (shell.coefficients != 0.0).tobytes()
            key = (at, kind, lengths[kind], seen[kind], shell.coefficients.shape[1], used)
            groups.setdefault(key, {}).setdefault(z, (block, index))
    found: list[Oddity] = []
    judged = 0
    for group in groups.values():
        if len(group) >= FEWEST:
            columns = _columns(group)
            for column in columns:
                judged += len(group)
                found += _of_column(column, columns, least)
    return _with_disorder(found, judged)


def _columns(group: dict[int, tuple[Block, int]]) -> list[_Column]:
    numbers = tuple(sorted(group))
    shells = [group[z] for z in numbers]
    exponents = np.log([block.shells[index].exponents for block, index in shells])
    tables = np.array([block.shells[index].coefficients for block, index in shells])
    found = []
    for column in range(tables.shape[2]):
        rows = np.flatnonzero(tables[0, :, column])
        if len(rows) < 2:
            continue
        values = tables[:, rows, column]
        # The sign of a whole function is free: turn all to that of their usual largest number.
        largest = int(_middle(np.abs(values), axis=0).argmax())
        signs = np.sign(values[:, largest])
        usual = _middle(values * signs[:, None], axis=0)
        # By their number, so that one wrong sign does not turn all others; by size where even.
        large = np.abs(values) > 0.02 * np.abs(values).max(axis=1, keepdims=True)
        same = np.sign(values) * np.sign(usual)
        lean = (same * large).sum(axis=1) + 0.5 * np.tanh((same * np.abs(values)).sum(axis=1))
        signs = np.where(lean < 0.0, -1.0, 1.0)
        # So is its scale; some elements print whole contractions by a factor larger or smaller.
        turned = values * signs[:, None]
        factors = _middle(turned / _middle(np.abs(turned), axis=0), axis=1)
        factors = np.where((np.abs(np.abs(factors) - 1.0) > 0.3) & (factors != 0.0), factors, 1.0)
        units = signs * (np.abs(factors) if len(rows) > 2 else 1.0)
        turned = values / units[:, None]
        sizes = _middle(np.abs(turned), axis=0)
        found.append(
            _Column(
                numbers, column, tuple(rows.tolist()), shells, turned / sizes,
                exponents[:, rows], sizes, units,
            )
        )  # fmt: skip
    return found


def _of_column(column: _Column, columns: list[_Column], least: float) -> list[Oddity]:
    fixed = [(column.logs, 0.0)]
    for other in columns:
        if abs(other.column - column.column) == 1:
            table = np.full_like(column.relative, np.nan)
            for at, row in enumerate(column.rows):
                if row in other.rows:
                    table[:, at] = other.relative[:, other.rows.index(row)]
            fixed.append((table, 0.5))
    # Small coefficients are printed to few digits; six decimals are usual.
    finest = _FINEST + 1e-6 / column.sizes

    def predict(relative: Floats) -> Predictions:
        companions = [*((table, 0.0) for table in beside(relative)), *fixed]
        return predictions(column.numbers, relative, companions, finest, 1e-5)

    told = predict(column.relative)
    found = []
    for at, place, surprise, rest in _oddest(column.numbers, column.relative, told, predict, least):
        block, index = column.shells[at]
        unit = float(column.sizes[place] * column.units[at])
        departure, spread = float(told.departure[at, place]), float(told.spread[at, place])
        expected = unit * (float(column.relative[at, place]) - departure)
        low, high = sorted((expected - 2.0 * spread * unit, expected + 2.0 * spread * unit))
        found.append(
            Oddity(
                block, index, column.rows[place], column.column, departure,
                surprise, rest, expected, low, high, len(column.numbers) - 1,
            )
        )  # fmt: skip
    return found


def oddest_of_shells(found: list[Oddity]) -> list[Oddity]:
    """Of each shell the oddest number; one slip makes its companions look odd as well."""
    best: dict[tuple[int, int], Oddity] = {}
    for oddity in found:
        key = id(oddity.block), oddity.shell
        if key not in best or oddity.surprise > best[key].surprise:
            best[key] = oddity
    return list(best.values())
