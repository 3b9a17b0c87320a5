"""Facts of the periodic table that basis sets rest on: symbols, rows, occupied shells."""

from functools import cache

_SYMBOLS = (
    "H He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K Ca Sc Ti V Cr Mn Fe Co Ni Cu Zn Ga Ge As Se "
    "Br Kr Rb Sr Y Zr Nb Mo Tc Ru Rh Pd Ag Cd In Sn Sb Te I Xe Cs Ba La Ce Pr Nd Pm Sm Eu Gd Tb "
    "Dy Ho Er Tm Yb Lu Hf Ta W Re Os Ir Pt Au Hg Tl Pb Bi Po At Rn Fr Ra Ac Th Pa U Np Pu Am Cm "
    "Bk Cf Es Fm Md No Lr Rf Db Sg Bh Hs Mt Ds Rg Cn Nh Fl Mc Lv Ts Og"
).split()

_NUMBERS = {symbol.lower(): z for z, symbol in enumerate(_SYMBOLS, 1)}
# Systematic names that files made before the permanent ones still carry (IUPAC 1979).
_NUMBERS |= {
    symbol: z for z, symbol in enumerate("uun uuu uub uut uuq uup uuh uus uuo".split(), 110)
}

# First and last atomic number of each period.
PERIODS = ((1, 2), (3, 10), (11, 18), (19, 36), (37, 54), (55, 86), (87, 118))


def symbol_of(z: int) -> str:
    """Symbol of the element with atomic number ``z`` (1 to 118)."""
    return _SYMBOLS[z - 1]


def number_of(symbol: str) -> int | None:
    """Atomic number of a symbol in any letter case, or None."""
    return _NUMBERS.get(symbol.lower())


def period_of(z: int) -> int:
    """Row of the periodic table, 1 to 7."""
    return next(row for row, (_, last) in enumerate(PERIODS, 1) if z <= last)


@cache
def row_of(z: int) -> tuple[int, int]:
    """First and last atomic number of the stretch of similar neighbours that ``z`` lies in.

    Basis families change their composition at these borders: s block, d block, f block and p
    block of each period (common practice, no source).
    """
    for first, last in (
        (1, 2),
        (3, 4),
        (5, 10),
        (11, 12),
        (13, 18),
        (19, 20),
        (21, 30),
        (31, 36),
        (37, 38),
        (39, 48),
        (49, 54),
        (55, 56),
        (57, 71),
        (72, 80),
        (81, 86),
        (87, 88),
        (89, 103),
        (104, 118),
    ):
        if first <= z <= last:
            return first, last
    raise ValueError(f"no element has the atomic number {z}")


# Order in which the subshells of neutral atoms fill (Madelung), with the ground states that depart
# from it in a way that changes which subshells are occupied at all (NIST atomic ground states).
_ORDER = (
    (1, 0),
    (2, 0),
    (2, 1),
    (3, 0),
    (3, 1),
    (4, 0),
    (3, 2),
    (4, 1),
    (5, 0),
    (4, 2),
    (5, 1),
    (6, 0),
    (4, 3),
    (5, 2),
    (6, 1),
    (7, 0),
    (5, 3),
    (6, 2),
    (7, 1),
)
_DEPARTURES: dict[int, tuple[tuple[int, int], tuple[int, int] | None]] = {
    # atomic number: (subshell left empty, subshell occupied instead)
    46: ((5, 0), None),  # Pd 4d10
    57: ((4, 3), (5, 2)),  # La 5d1
    89: ((5, 3), (6, 2)),  # Ac 6d1
    90: ((5, 3), (6, 2)),  # Th 6d2
    103: ((6, 2), (7, 1)),  # Lr 7p1
}
_ALSO_OPEN = {58: (5, 2), 64: (5, 2), 91: (6, 2), 92: (6, 2), 93: (6, 2), 96: (6, 2)}


@cache
def subshells(z: int) -> tuple[tuple[int, int], ...]:
    """Subshells (n, l) that hold electrons in the neutral atom's ground state, in filling order."""
    filled: list[tuple[int, int]] = []
    left = z
    for n, l in _ORDER:
        if left <= 0:
            break
        filled.append((n, l))
        left -= 2 * (2 * l + 1)
    if z in _DEPARTURES:
        empty, instead = _DEPARTURES[z]
        filled = [subshell for subshell in filled if subshell != empty]
        if instead is not None:
            filled.append(instead)
    if z in _ALSO_OPEN:
        filled.append(_ALSO_OPEN[z])
    return tuple(filled)


@cache
def occupied(z: int) -> dict[int, int]:
    """Number of occupied subshells for each l of the neutral atom: carbon {0: 2, 1: 1}."""
    counts: dict[int, int] = {}
    for _, l in subshells(z):
        counts[l] = counts.get(l, 0) + 1
    return counts


@cache
def core(z: int) -> dict[int, int]:
    """As `occupied`, but only the subshells below the valence of the row.

    The core is the noble gas before, and in the p block of a period also the d (and f) subshells
    that filled within that period; behind the f block the f subshell alone.
    """
    period = period_of(z)
    counts = dict(occupied(PERIODS[period - 2][1])) if period > 1 else {}
    filled = occupied(z)
    in_p_block = any(low <= z <= high for low, high in ((31, 36), (49, 54), (81, 86), (113, 118)))
    behind_f_block = 72 <= z <= 86 or 104 <= z <= 118
    if in_p_block:
        counts[2] = filled[2]
    if behind_f_block:
        counts[3] = filled[3]
    return counts


@cache
def valence(z: int) -> dict[int, int]:
    """As `occupied`, but only the subshells that are not of the `core`: carbon {0: 1, 1: 1}."""
    inner = core(z)
    return {l: n - inner.get(l, 0) for l, n in occupied(z).items() if n > inner.get(l, 0)}


# Subshells that a potential for this many electrons replaces.
_REPLACED = {
    0: {}, 2: {0: 1}, 10: {0: 2, 1: 1}, 18: {0: 3, 1: 2}, 28: {0: 3, 1: 2, 2: 1},
    36: {0: 4, 1: 3, 2: 1}, 46: {0: 4, 1: 3, 2: 2}, 54: {0: 5, 1: 4, 2: 2},
    60: {0: 4, 1: 3, 2: 2, 3: 1}, 68: {0: 5, 1: 4, 2: 2, 3: 1}, 78: {0: 5, 1: 4, 2: 3, 3: 1},
    92: {0: 5, 1: 4, 2: 3, 3: 2},
}  # fmt: skip


def replaced_by(electrons: int) -> dict[int, int] | None:
    """Subshells per l that a core of so many electrons holds, or None for an unusual count."""
    return _REPLACED.get(electrons)


def usual_cores() -> tuple[int, ...]:
    """The core sizes that `replaced_by` knows, small to large."""
    return tuple(_REPLACED)
