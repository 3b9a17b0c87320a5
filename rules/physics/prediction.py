"""What the other elements of a row suggest for every number of one: several predictions, weighed.

Each column of a table (elements by places in a ladder of numbers) is predicted for each element
from all the others: by a polynomial in ln Z, and by the same polynomial together with a companion,
a neighbouring column of the same table.  Published numbers depart from their row in step: where an
element goes its own way its neighbouring exponents go along, so that a companion predicts to a few
tenths of a per cent where the polynomial alone scatters by ten.  A slip goes alone: put right, it
leaves nothing odd behind.

Formula: residual e_k and leverage h_k of the fit with one companion (Frisch and Waugh: the
companion's own residual joins the fit), departure e_k / (1 - h_k), variance s**2 / (1 - h_k) with
s**2 without the element; scatters of few degrees of freedom are moderated by those of the other
columns.
Sources: R. D. Cook, S. Weisberg, Residuals and Influence in Regression, Chapman and Hall 1982; R.
Frisch, F. V. Waugh, Econometrica 1, 387 (1933); moderation: G. K. Smyth, Stat. Appl. Genet. Mol.
Biol. 3, article 3 (2004).
"""

from collections.abc import Callable, Sequence
from functools import lru_cache
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Floats
from overlapse.rules.physics.trends import fit_through

FEWEST = 5  # elements that a prediction needs
_PRIOR = 8.0  # degrees of freedom that the other columns lend to the scatter of one


class Predictions(NamedTuple):
    """Weighed over all predictions, shapes (elements, places).

    surprise: departure in units of its spread.  departure: value less the one suggested.  spread:
    uncertainty of the suggestion.
    """

    surprise: Floats
    departure: Floats
    spread: Floats


def predictions(
    numbers: tuple[int, ...],
    values: Floats,
    companions: Sequence[tuple[Floats, float]],
    finest: float | Floats,
    stiffness: float,
    *,
    alike: bool = True,
) -> Predictions:
    """Compare each value with what the other elements suggest.

    numbers: atomic numbers, rising, at least `FEWEST`.  values: shape (elements, places).
    companions: tables of the same shape (NaN in columns that have no companion), each with the
    slope that is taken for granted until the elements tell otherwise.  finest: scatter below which
    nothing is believed, for all places or shape (places,).  stiffness: how much is needed to tell.
    alike: whether the places are of one kind, so that the scatter of one tells about the others'.
    """
    count = len(numbers)
    tables = np.array([np.zeros_like(values), *(table for table, _ in companions)])
    slopes = np.array([0.0, *(slope for _, slope in companions)])[:, None, None]
    missing = np.isnan(tables[:, 0])
    if missing.any():
        tables[np.broadcast_to(missing[:, None], tables.shape)] = 0.0
    projections, free, degree = _fits(numbers)
    # A companion uses up a part of a degree of freedom, since its slope is held.
    used = np.where(np.arange(len(tables)) > 0, 0.6, 0.0)
    free_degrees = count - 2 - degree[:, None] - used
    # From here on: shapes (degrees, tables, elements, places).
    usable = (free_degrees >= 1.0)[:, :, None] & ~missing
    residual = (values - projections @ values)[:, None]
    extra = tables - projections[:, None] @ tables
    held = stiffness * count
    size = (extra * extra).sum(axis=2, keepdims=True) + held
    slope = ((extra * residual).sum(axis=2, keepdims=True) + held * slopes) / size
    error = residual - slope * extra
    left = np.maximum(free[:, None, :, None] - extra * extra / size, 1e-3)
    departure = error / left
    total = (error * error).sum(axis=2, keepdims=True) + held * (slope - slopes) ** 2
    degrees = np.maximum(free_degrees, 0.5)[:, :, None, None]
    without = np.maximum(total - error * departure, 0.0) / degrees
    ranked = np.sort(without, axis=2)
    middle = ranked[:, :, count // 2]
    prior = np.minimum(without, middle[:, :, None])
    if alike:
        usual = _usual(middle, ranked[:, :, 0], usable)
        prior = np.maximum(usual[:, :, None, None], prior)
    variance = (_PRIOR * prior + degrees * without) / (_PRIOR + degrees) + finest**2
    shape = (-1, *values.shape)
    weight = (usable[:, :, None, :] * left / variance).reshape(shape)
    spread = 1.0 / np.sqrt(np.maximum(weight.max(axis=0), 1e-300))
    # The predictions are much alike: the best of them count more than their weight alone says.
    share = weight * np.sqrt(weight)
    whole = np.maximum(share.sum(axis=0), 1e-300)
    departed = (share * departure.reshape(shape)).sum(axis=0) / whole
    return Predictions(np.abs(departed) / spread, departed, spread)


@lru_cache(maxsize=256)
def _fits(numbers: tuple[int, ...]) -> tuple[Floats, Floats, Floats]:
    """Hat matrices of the polynomials that so many elements allow, 1 - leverages, and degrees."""
    degrees = [degree for degree in (1, 2, 3) if degree == 1 or len(numbers) - degree >= 4]
    fits = [fit_through(numbers, degree) for degree in degrees]
    return (
        np.array([hat for hat, _ in fits]),
        np.array([free for _, free in fits]),
        np.array(degrees, dtype=float),
    )


def alone(
    predict: Callable[[Floats], Predictions],
    values: Floats,
    told: Predictions,
    at: int,
    enough: float,
) -> tuple[int, float]:
    """The place of an element whose correction leaves the least surprise, and what it leaves.

    told: the predictions of the values as they stand.  enough: the part of the largest surprise
    below which what is left needs no other place.  An element that goes its own way stays odd
    whichever number is put right.
    """
    surprise = told.surprise[at]
    order = np.argsort(-surprise)[:_TRIED]
    best = (np.inf, 0)
    for place in order[surprise[order] > 0.4 * surprise[order[0]]].tolist():
        mended = values.copy()
        mended[at, place] -= told.departure[at, place]
        best = min(best, (float(predict(mended).surprise[at].max()), place))
        if best[0] < enough * surprise[order[0]]:
            break
    return best[1], best[0]


_TRIED = 2  # places of an element that are tried


def _usual(middle: Floats, least: Floats, usable: npt.NDArray[np.bool_]) -> Floats:
    """Variance that the columns of each table usually have, one of which may hold a slip.

    middle, least: of the variances of each column, shape (degrees, tables, places); the result has
    shape (degrees, tables).
    """
    counts = usable.sum(axis=2)
    # A slip is in all variances of its column but its own: with few columns the least ones tell.
    telling = np.where((counts >= 5)[:, :, None], middle, 2.0 * least)
    ranked = np.sort(np.where(usable, telling, np.inf), axis=2)
    at = np.minimum(counts // 2, ranked.shape[2] - 1)[:, :, None]
    found = np.take_along_axis(ranked, at, axis=2)[:, :, 0]
    return np.where(counts > 0, found, 0.0)


def beside(values: Floats) -> list[Floats]:
    """Each column's left and right neighbour, and their mean; NaN where there is none."""
    left, right = np.full_like(values, np.nan), np.full_like(values, np.nan)
    left[:, 1:], right[:, :-1] = values[:, :-1], values[:, 1:]
    return [left, right, 0.5 * (left + right)]
