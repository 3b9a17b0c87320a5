"""Systems for the calibration of the outlook, drawn by chance.

Kinds of molecules and sets are listed; what makes each system dependent (which exponent, how near
its twin, how far squeezed) is drawn from wide ranges, with a fixed seed, so that systems lie on
either side of the limits, far from them and near.
"""

import random
from collections.abc import Iterator

from builders import (
    Atoms,
    Basis,
    System,
    centred,
    chain,
    diffuse,
    doubled,
    even,
    published,
    ring,
    squeezed,
    twins,
)
from outlook_irregular import heap, shaken

SEED = 611

PHOSPHINE: Atoms = [
    ("P", (0.0, 0.0, 0.127)),
    *[(s, (x, y, -0.635)) for s, (x, y, _) in ring("HHH", 2.06)],
]
METHYL: Atoms = [("C", (0.0, 0.0, 0.0)), *ring("HHH", 1.87)]
FLUOROMETHANE: Atoms = [
    ("C", (0.0, 0.0, 0.0)),
    ("F", (0.0, 0.0, 1.383)),
    *[(s, (x, y, -0.36)) for s, (x, y, _) in ring("HHH", 1.79)],
]
AMINO: Atoms = [("N", (0.0, 0.0, 0.0)), ("H", (0.0, 0.803, 0.635)), ("H", (0.0, -0.803, 0.635))]
ETHYNE: Atoms = [("H", (0.0, 0.0, -1.06)), *chain("CC", 1.203), ("H", (0.0, 0.0, 2.263))]
HYPOCHLOROUS: Atoms = [("O", (0.0, 0.0, 0.0)), ("Cl", (0.0, 0.0, 1.69)), ("H", (0.94, 0.0, -0.22))]

# Name, atoms, published set, unpaired electrons; elements, l and range of exponents of the twins.
Kind = tuple[str, Atoms, str, int, str, int, tuple[float, float]]
TWINS: list[Kind] = [
    ("LiF", chain(["Li", "F"], 1.56), "def2-svp", 0, "F", 0, (0.1, 2.0)),
    ("LiF", chain(["Li", "F"], 1.56), "def2-svp", 0, "Li", 1, (0.03, 0.3)),
    ("BeH2", chain(["H", "Be", "H"], 1.33), "cc-pvdz", 0, "Be", 0, (0.02, 1.0)),
    ("BeH2", chain(["H", "Be", "H"], 1.33), "cc-pvdz", 0, "H", 1, (0.1, 1.5)),
    ("phosphine", PHOSPHINE, "def2-svp", 0, "P", 1, (0.05, 20.0)),
    ("phosphine", PHOSPHINE, "6-31g**", 0, "H", 0, (0.03, 1.0)),
    ("methyl", METHYL, "cc-pvdz", 1, "C", 1, (0.03, 5.0)),
    ("methyl", METHYL, "def2-svp", 1, "C", 0, (0.03, 50.0)),
    ("fluoromethane", FLUOROMETHANE, "def2-svp", 0, "C F", 2, (0.3, 2.0)),
    ("amino", AMINO, "6-31g*", 1, "N", 1, (0.05, 10.0)),
    ("ethyne", ETHYNE, "def2-svp", 0, "C", 1, (0.05, 3.0)),
    ("hypochlorous acid", HYPOCHLOROUS, "def2-svp", 0, "Cl", 0, (0.03, 3.0)),
    ("Cl2", chain(["Cl", "Cl"], 1.99), "def2-svp", 0, "Cl", 2, (0.2, 1.5)),
    ("SiO", chain(["Si", "O"], 1.51), "cc-pvdz", 0, "Si", 1, (0.05, 30.0)),
    ("SO", chain(["S", "O"], 1.48), "def2-svp", 2, "S", 1, (0.05, 20.0)),
    ("Ar", chain(["Ar"], 1.0), "cc-pvdz", 0, "Ar", 0, (20.0, 4000.0)),
    ("Na", chain(["Na"], 1.0), "def2-svp", 1, "Na", 0, (5.0, 1000.0)),
    ("MnH", chain(["Mn", "H"], 1.73), "def2-svp", 6, "Mn", 2, (0.1, 5.0)),
    ("CrH", chain(["Cr", "H"], 1.66), "def2-svp", 5, "Cr", 1, (0.05, 10.0)),
    ("ScF", chain(["Sc", "F"], 1.79), "def2-svp", 0, "Sc", 2, (0.05, 2.0)),
    ("CuCl", chain(["Cu", "Cl"], 2.05), "def2-svp", 0, "Cu", 0, (0.03, 100.0)),
    ("Zn", chain(["Zn"], 1.0), "def2-svp", 0, "Zn", 1, (1.0, 100.0)),
    ("Cu", chain(["Cu"], 1.0), "def2-svp", 1, "Cu", 2, (0.2, 10.0)),
]  # fmt: skip
CARTESIAN: list[Kind] = [
    ("SiO", chain(["Si", "O"], 1.51), "6-31g*", 0, "Si", 2, (0.2, 2.0)),
    ("amino", AMINO, "6-31g*", 1, "N", 2, (0.4, 2.0)),
    ("hypochlorous acid", HYPOCHLOROUS, "6-31g*", 0, "O", 0, (0.1, 10.0)),
    ("ScF", chain(["Sc", "F"], 1.79), "def2-svp", 0, "F", 2, (0.5, 2.5)),
]  # fmt: skip


def drawn() -> list[System]:
    dice = random.Random(SEED)
    return [
        *_sound(),
        *twinned(dice, TWINS, cartesian=False),
        *twinned(dice, CARTESIAN, cartesian=True),
        *_crowded(dice),
        *_series(dice),
        *_contracted(dice),
        *_mixed(dice),
    ]


def chance(dice: random.Random, low: float, high: float) -> float:
    """A number by chance, all powers of ten alike; three digits."""
    return float(f"{low * (high / low) ** dice.random():.3g}")


def _sound() -> Iterator[System]:
    """Published sets at sound distances."""
    yield System("LiF, aug-cc-pVDZ", chain(["Li", "F"], 1.56), published("aug-cc-pvdz", "Li", "F"))
    yield System("phosphine, 6-31++G**", PHOSPHINE, published("6-31++g**", "P", "H"))
    yield System(
        "MnH, def2-TZVP", chain(["Mn", "H"], 1.73), published("def2-tzvp", "Mn", "H"), spin=6
    )


def twinned(
    dice: random.Random,
    kinds: list[Kind],
    cartesian: bool,
) -> Iterator[System]:
    """One system for each kind, with a pair of near-twins."""
    for name, atoms, family, spin, symbols, l, (low, high) in kinds:
        exponent, apart = chance(dice, low, high), chance(dice, 3e-5, 5e-3)
        base = published(family, *dict.fromkeys(s for s, _ in atoms))
        yield System(
            f"{name}, {'Cartesian, ' if cartesian else ''}twins {'spdf'[l]} {exponent:g} on "
            f"{symbols}, {1 + apart:.6g}",
            atoms,
            twins(base, symbols, l, exponent, 1.0 + apart),
            spin=spin,
            cartesian=cartesian,
        )


def _crowded(dice: random.Random) -> Iterator[System]:
    """Squeezed molecules and heaps, with diffuse functions."""
    aug = published("aug-cc-pvdz", "H", "He", "C")
    for symbol, count, low, high in (("H", 5, 0.6, 1.5), ("H", 6, 0.6, 1.5), ("He", 5, 0.7, 1.6)):
        edge = round(dice.uniform(low, high), 2)
        base: Basis = diffuse(aug, symbol, 1, 0.4)
        name = f"heap of {count} {symbol}, doubly diffuse, {edge}"
        yield System(
            name,
            heap(symbol, count, edge, dice.randrange(1000)),
            base,
            spin=count % 2 if symbol == "H" else 0,
        )
    for count in (6, 9):
        distance = round(dice.uniform(0.6, 1.1), 2)
        atoms = shaken(chain("H" * count, distance), 0.02, dice.randrange(1000))
        yield System(f"chain of {count} H, shaken, {distance}", atoms, aug, spin=count % 2)
    for steps in (1, 2):
        factor = round(dice.uniform(0.4, 0.9), 2)
        base = diffuse(published("6-31+g", "C", "H"), "C H", steps, 0.4)
        name = f"ethyne, 6-31+G and {steps} diffuse steps, times {factor}"
        yield System(name, squeezed(ETHYNE, factor), base)
    factor = round(dice.uniform(0.45, 0.9), 2)
    base = diffuse(published("def2-svpd", "C", "H"), "C H", 1, 0.4)
    name = f"methyl, def2-SVPD and a diffuse step, times {factor}"
    yield System(name, squeezed(METHYL, factor), base, spin=1)
    factor = round(dice.uniform(0.45, 0.9), 2)
    base = diffuse(published("6-31++g*", "C", "F", "H"), "C F", 2, 0.4)
    name = f"fluoromethane, Cartesian 6-31++G* and two steps, times {factor}"
    yield System(name, squeezed(FLUOROMETHANE, factor), base, cartesian=True)
    factor = round(dice.uniform(0.55, 0.95), 2)
    base = diffuse(published("def2-svpd", "Ti", "H"), "H", 2, 0.4)
    name = f"TiH4, def2-SVPD and two steps on H, times {factor}"
    yield System(name, squeezed(centred("Ti", "H", 1.7), factor), base)


def _series(dice: random.Random) -> Iterator[System]:
    """Long even-tempered series on one centre."""
    for symbol, spin, s, p in (("N", 3, 15, 9), ("Li", 1, 16, 0), ("Mg", 0, 20, 9)):
        ratio = round(dice.uniform(1.4, 1.75), 3)
        shells = [*even(0, s, 20.0 if symbol == "Mg" else 6.0, ratio), *even(1, p, 2.0, ratio)]
        yield System(
            f"{symbol}, {s} s and {p} p falling by {ratio}",
            chain([symbol], 1.0),
            {symbol: shells},
            spin=spin,
        )


def _contracted(dice: random.Random) -> Iterator[System]:
    """Second columns that hardly differ from the first."""
    for name, atoms, symbol, l, spin in (
        ("methyl", METHYL, "C", 0, 1),
        ("LiF", chain(["Li", "F"], 1.56), "F", 1, 0),
        ("BeH2", chain(["H", "Be", "H"], 1.33), "Be", 0, 0),
    ):
        shift = chance(dice, 1e-4, 1e-2)
        base = doubled(published("cc-pvdz", *dict.fromkeys(s for s, _ in atoms)), symbol, l, shift)
        text = f"{name}, doubled {'sp'[l]} contraction of {symbol}, {shift:g}"
        yield System(text, atoms, base, spin=spin)


def _mixed(dice: random.Random) -> Iterator[System]:
    """Different sets on the atoms, and empty centres."""
    for symbol, near in (("N", AMINO), ("Li", chain(["Li", "F"], 1.56))):
        distance = chance(dice, 0.02, 0.5)
        base = published("def2-svp", *dict.fromkeys(s for s, _ in near))
        base[f"X-{symbol}"] = base[symbol]
        atoms = [*near, (f"X-{symbol}", (distance, 0.0, 0.0))]
        name = f"{'amino' if symbol == 'N' else 'LiF'}, empty centre {distance:g} from {symbol}"
        yield System(name, atoms, base, spin=int(symbol == "N"))
    factor = round(dice.uniform(0.4, 0.9), 2)
    base = diffuse(published(H="aug-cc-pvtz", C="6-31+g*"), "C", 2, 0.4)
    yield System(
        f"ethyne, aug-cc-pVTZ on H, 6-31+G* and two steps on C, times {factor}",
        squeezed(ETHYNE, factor),
        base,
    )
    factor = round(dice.uniform(0.5, 1.0), 2)
    base = diffuse(published(Cu="def2-svp", Cl="aug-cc-pvdz"), "Cu Cl", 1, 0.4)
    yield System(
        f"CuCl, def2-SVP on Cu, aug-cc-pVDZ on Cl, a step, times {factor}",
        chain(["Cu", "Cl"], factor * 2.05),
        base,
    )
