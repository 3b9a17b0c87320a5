"""Systems on which outlooks are judged; they took no part in any choice.

Drawn by chance like those of `outlook_drawn`, with another seed: other molecules, atoms and sets.
Nothing is left out afterwards.
"""

import random
from collections.abc import Iterator

from builders import (
    Atoms,
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
from outlook_drawn import Kind, chance, twinned
from outlook_irregular import heap, shaken

SEED = 20407

SILYL: Atoms = [("Si", (0.0, 0.0, 0.0)), *[(s, (x, y, 0.45)) for s, (x, y, _) in ring("HHH", 2.42)]]
ALANE: Atoms = [("Al", (0.0, 0.0, 0.0)), *ring("HHH", 2.73)]
BORON_FLUORIDE: Atoms = [("B", (0.0, 0.0, 0.0)), *ring("FFF", 2.26)]
PHOSPHINO: Atoms = [("P", (0.0, 0.0, 0.0)), ("H", (0.0, 1.02, 0.99)), ("H", (0.0, -1.02, 0.99))]
NITROUS: Atoms = [*chain("NN", 1.13), ("O", (0.0, 0.0, 2.315))]
CYANOGEN_CHLORIDE: Atoms = [*chain("NC", 1.16), ("Cl", (0.0, 0.0, 2.79))]
DIMER: Atoms = [*chain("HF", 0.92), ("H", (0.0, 0.3, 3.6)), ("F", (0.0, 0.0, 2.73))]
METHANOL: Atoms = [
    ("C", (0.0, 0.0, 0.0)), ("O", (0.0, 0.0, 1.42)), ("H", (0.91, 0.0, 1.74)),
    ("H", (1.03, 0.0, -0.36)), ("H", (-0.51, 0.89, -0.36)), ("H", (-0.51, -0.89, -0.36)),
]  # fmt: skip

TWINS: list[Kind] = [
    ("NaCl", chain(["Na", "Cl"], 2.36), "def2-svp", 0, "Na", 0, (0.01, 0.3)),
    ("NaCl", chain(["Na", "Cl"], 2.36), "cc-pvdz", 0, "Cl", 1, (0.03, 10.0)),
    ("alane", ALANE, "def2-svp", 0, "Al", 1, (0.03, 1.0)),
    ("alane", ALANE, "6-31g*", 0, "H", 0, (0.02, 2.0)),
    ("boron trifluoride", BORON_FLUORIDE, "6-31g", 0, "F", 1, (0.1, 5.0)),
    ("N2O", NITROUS, "def2-svp", 0, "N O", 0, (0.08, 1.0)),
    ("cyanogen chloride", CYANOGEN_CHLORIDE, "def2-svp", 0, "C N", 1, (0.05, 1.0)),
    ("methanol", METHANOL, "6-31g*", 0, "O", 0, (0.05, 200.0)),
    ("methanol", METHANOL, "def2-svp", 0, "H", 0, (0.02, 1.5)),
    ("hydrogen fluoride dimer", DIMER, "cc-pvdz", 0, "F", 1, (0.02, 2.0)),
    ("silyl", SILYL, "def2-svp", 1, "Si", 1, (0.03, 3.0)),
    ("phosphino", PHOSPHINO, "cc-pvdz", 1, "P", 2, (0.1, 1.5)),
    ("NF", chain("NF", 1.32), "def2-svp", 2, "F", 1, (0.1, 20.0)),
    ("BO", chain("BO", 1.2), "cc-pvdz", 1, "B", 0, (0.03, 5.0)),
    ("MgO", chain(["Mg", "O"], 1.75), "def2-svp", 0, "O", 1, (0.05, 3.0)),
    ("HBr", chain(["H", "Br"], 1.41), "def2-svp", 0, "Br", 1, (0.05, 30.0)),
    ("P", chain("P", 1.0), "cc-pvdz", 3, "P", 1, (1.0, 100.0)),
    ("Kr", chain(["Kr"], 1.0), "def2-svp", 0, "Kr", 2, (1.0, 50.0)),
    ("Ca", chain(["Ca"], 1.0), "def2-svp", 0, "Ca", 0, (0.01, 500.0)),
    ("CaO", chain(["Ca", "O"], 1.82), "def2-svp", 0, "Ca", 1, (0.05, 2.0)),
    ("ScH", chain(["Sc", "H"], 1.78), "def2-svp", 0, "Sc", 1, (0.03, 3.0)),
    ("VO", chain(["V", "O"], 1.59), "def2-svp", 3, "V", 2, (0.1, 3.0)),
    ("MnF", chain(["Mn", "F"], 1.84), "def2-svp", 6, "F", 0, (0.1, 10.0)),
    ("ZnS", chain(["Zn", "S"], 2.05), "def2-svp", 0, "Zn", 2, (0.1, 5.0)),
    ("CuH", chain(["Cu", "H"], 1.46), "def2-svp", 0, "H", 0, (0.03, 1.0)),
    ("Mn", chain(["Mn"], 1.0), "def2-svp", 5, "Mn", 1, (0.5, 50.0)),
]  # fmt: skip
CARTESIAN: list[Kind] = [
    ("methanol", METHANOL, "6-31g*", 0, "C O", 2, (0.3, 2.0)),
    ("phosphino", PHOSPHINO, "6-31g*", 1, "P", 1, (0.05, 5.0)),
    ("N2O", NITROUS, "6-31g*", 0, "O", 2, (0.3, 2.0)),
    ("VO", chain(["V", "O"], 1.59), "def2-svp", 3, "O", 0, (0.1, 10.0)),
    ("alane", ALANE, "6-31g*", 0, "Al", 2, (0.1, 1.0)),
]  # fmt: skip


def judging() -> list[System]:
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


def _sound() -> Iterator[System]:
    """Published sets at sound distances."""
    yield System("methanol, def2-SVPD", METHANOL, published("def2-svpd", "C", "O", "H"))
    yield System("NF, aug-cc-pVDZ", chain("NF", 1.32), published("aug-cc-pvdz", "N", "F"), spin=2)
    yield System("ZnS, def2-TZVP", chain(["Zn", "S"], 2.05), published("def2-tzvp", "Zn", "S"))


def _crowded(dice: random.Random) -> Iterator[System]:
    """Squeezed molecules, heaps, chains and rings, with diffuse functions."""

    def factor(low: float, high: float) -> float:
        return round(dice.uniform(low, high), 2)

    for symbol, count, family, low, high in (
        ("H", 7, "aug-cc-pvdz", 0.7, 1.6),
        ("He", 4, "aug-cc-pvdz", 0.5, 1.2),
        ("Li", 4, "6-31+g", 1.0, 2.5),
        ("C", 3, "6-31+g", 0.6, 1.5),
    ):
        edge = factor(low, high)
        atoms = heap(symbol, count, edge, dice.randrange(1000))
        base = diffuse(published(family, symbol), symbol, 1, 0.4)
        spin = count % 2 if symbol == "H" else 0
        yield System(f"heap of {count} {symbol}, a diffuse step, {edge}", atoms, base, spin=spin)
    for count, low, high in ((5, 0.5, 0.9), (8, 0.65, 1.0)):
        distance = factor(low, high)
        atoms = shaken(ring("H" * count, distance), 0.03, dice.randrange(1000))
        base = diffuse(published("aug-cc-pvdz", "H"), "H", count == 5, 0.4)
        yield System(f"ring of {count} H, shaken, {distance}", atoms, base, spin=count % 2)
    distance = factor(0.9, 1.8)
    base = diffuse(published("6-31+g", "Be"), "Be", 2, 0.45)
    yield System(f"chain of 4 Be, two steps, {distance}", chain(["Be"] * 4, distance), base)
    distance = factor(0.9, 1.8)
    base = diffuse(published("6-31+g", "Na", "F"), "Na F", 1, 0.4)
    yield System(f"ring Na2F2, a step, {distance}", ring(["Na", "F"] * 2, distance), base)
    for name, atoms, family, steps, spin, cartesian in (
        ("methanol", METHANOL, "6-31++g", 2, 0, False),
        ("N2O", NITROUS, "6-31+g*", 2, 0, True),
        ("silyl", SILYL, "def2-svpd", 1, 1, False),
        ("methane", centred("C", "H", 1.09), "aug-cc-pvdz", 1, 0, False),
        ("ScH", chain(["Sc", "H"], 1.78), "def2-svpd", 2, 0, False),
    ):
        times = factor(0.45, 0.95)
        symbols = " ".join(dict.fromkeys(s for s, _ in atoms))
        base = diffuse(published(family, *symbols.split()), symbols, steps, 0.4)
        kind = "Cartesian, " if cartesian else ""
        yield System(
            f"{name}, {kind}{family} and {steps} steps, times {times}",
            squeezed(atoms, times),
            base,
            spin=spin,
            cartesian=cartesian,
        )


def _series(dice: random.Random) -> Iterator[System]:
    """Long even-tempered series on one centre and on two."""
    for symbol, count, spin, s, p in (
        ("O", 1, 2, 14, 9),
        ("Ar", 1, 0, 18, 12),
        ("Li", 2, 0, 12, 4),
    ):
        ratio = round(dice.uniform(1.4, 1.75), 3)
        middle = {"O": 8.0, "Ar": 30.0, "Li": 2.0}[symbol]
        shells = [*even(0, s, middle, ratio), *even(1, p, 0.3 * middle, ratio)]
        name = f"{symbol}{count if count > 1 else ''}, {s} s and {p} p falling by {ratio}"
        yield System(name, chain([symbol] * count, 2.67), {symbol: shells}, spin=spin)


def _contracted(dice: random.Random) -> Iterator[System]:
    """Second columns that hardly differ from the first."""
    for name, atoms, symbol, l, spin in (
        ("NF", chain("NF", 1.32), "N", 1, 2),
        ("alane", ALANE, "Al", 1, 0),
        ("BO", chain("BO", 1.2), "O", 0, 1),
    ):
        shift = chance(dice, 1e-4, 1e-2)
        base = doubled(published("cc-pvdz", *dict.fromkeys(s for s, _ in atoms)), symbol, l, shift)
        text = f"{name}, doubled {'sp'[l]} contraction of {symbol}, {shift:g}"
        yield System(text, atoms, base, spin=spin)


def _mixed(dice: random.Random) -> Iterator[System]:
    """Empty centres, and different sets on the atoms."""
    for name, near, symbol in (
        ("hydrogen fluoride dimer", DIMER, "F"),
        ("BO", chain("BO", 1.2), "B"),
    ):
        distance = chance(dice, 0.01, 0.4)
        base = published("6-31+g*", *dict.fromkeys(s for s, _ in near))
        base[f"X-{symbol}"] = base[symbol]
        x, y, z = next(place for s, place in near if s == symbol)
        atoms = [*near, (f"X-{symbol}", (x + distance, y, z))]
        yield System(
            f"{name}, empty centre {distance:g} from {symbol}", atoms, base, spin=int(name == "BO")
        )
    exponent, apart = chance(dice, 0.05, 1.0), chance(dice, 3e-5, 5e-3)
    base = twins(published(Zn="def2-svp", S="aug-cc-pvdz"), "S", 1, exponent, 1.0 + apart)
    name = f"ZnS, def2-SVP on Zn, aug-cc-pVDZ on S, twins p {exponent:g}, {1.0 + apart:.6g}"
    yield System(name, chain(["Zn", "S"], 2.05), base)
    times = round(dice.uniform(0.45, 0.95), 2)
    base = diffuse(published(C="cc-pvtz", O="6-31+g", H="aug-cc-pvdz"), "O H", 1, 0.4)
    name = f"methanol, three sets and a diffuse step, times {times}"
    yield System(name, squeezed(METHANOL, times), base)
