"""What an atom's quantities should be by those of its neighbours in the row, and how surely."""

import numpy as np

from overlapse.grammar.model import Floats


def _spread(sizes: Floats) -> Floats:
    """Scatter from departures, shape (m, n); one of the neighbours may be wrong itself."""
    ordered = np.sort(sizes, axis=0)
    found: Floats = 1.5 * ordered[-2 if len(ordered) > 3 else -1]
    return found


def by_medians(here: int, z: Floats, table: Floats) -> tuple[Floats, Floats]:
    """Line through the quantities of neighbours by medians, and their scatter about it.

    here: nuclear charge of the atom.  z: those of the neighbours, shape (m,).  table: their
    quantities, shape (m, n).

    Source: P. K. Sen, J. Am. Stat. Assoc. 63, 1379 (1968).
    """
    first, second = np.triu_indices(len(z), 1)
    apart = z[first] != z[second]  # an element may be given twice
    first, second = first[apart], second[apart]
    slopes = (table[second] - table[first]) / (z[second] - z[first])[:, None]
    slope = np.median(slopes, axis=0) if len(slopes) else np.zeros(table.shape[1])
    level = np.median(table - slope * z[:, None], axis=0)
    spread = _spread(np.abs(table - slope * z[:, None] - level))
    beyond = max(0.0, float(z.min()) - here, here - float(z.max()))
    return level + slope * here, spread * (1.0 + beyond) + 0.5 * beyond * np.abs(slope)


def by_squares(here: int, z: Floats, table: Floats) -> tuple[Floats, Floats]:
    """Parabola through the quantities of neighbours by least squares, and their scatter about it.

    A line where there are fewer than five.  Each neighbour is compared with the parabola through
    the others.  Arguments as for `by_medians`.

    Source: R. D. Cook, S. Weisberg, Residuals and Influence in Regression, Chapman and Hall 1982.
    """
    powers = np.vander((z - here) / len(z), 3 if len(z) > 4 else 2)
    inverse = np.linalg.pinv(powers)
    fitted = inverse @ table
    free = np.maximum(1.0 - np.einsum("ij,ji->i", powers, inverse), 1e-3)
    spread = _spread(np.abs(table - powers @ fitted) / free[:, None])
    reach = max(1.0, float(np.linalg.norm(inverse[-1])))
    return fitted[-1], spread * reach


def by_both(here: int, z: Floats, table: Floats) -> tuple[Floats, Floats]:
    """Between line and parabola, whose difference adds to the scatter; arguments as above."""
    line, parabola = by_medians(here, z, table), by_squares(here, z, table)
    centre = 0.5 * (line[0] + parabola[0])
    spread = np.hypot(0.5 * (line[1] + parabola[1]), 0.5 * np.abs(line[0] - parabola[0]))
    return centre, spread
