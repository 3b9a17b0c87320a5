"""The periodic table as a grid of 18 columns: where each element stands."""

from overlapse.grammar.elements import PERIODS, period_of

_APART = ((57, 71, 9), (89, 103, 10))  # lanthanum and actinium series, in rows of their own
COLUMNS = 18


def cell_of(z: int) -> tuple[int, int]:
    """Row and column, counted from 1, of the element with atomic number ``z``.

    Rows 9 and 10 hold the two series that are set apart; row 8 is empty.  The groups are those of
    the IUPAC table of 2022.
    """
    for first, last, row in _APART:
        if first <= z <= last:
            return row, z - first + 4
    period = period_of(z)
    begin, end = PERIODS[period - 1]
    place = z - begin + 1
    left = 1 if period == 1 else 2  # elements before the gap
    return period, place if place <= left else COLUMNS - (end - z)
