"""Systems for the calibration of the outlook, few of them symmetric."""

import random

from builders import (
    Atoms,
    Basis,
    System,
    chain,
    diffuse,
    doubled,
    even,
    published,
    ring,
    squeezed,
    twins,
    water,
)


def shaken(atoms: Atoms, most: float, seed: int) -> Atoms:
    """Every coordinate moved by up to ``most`` angstrom."""
    dice = random.Random(seed)

    def shift() -> float:
        return dice.uniform(-most, most)

    return [(s, (x + shift(), y + shift(), z + shift())) for s, (x, y, z) in atoms]


def heap(symbol: str, count: int, edge: float, seed: int) -> Atoms:
    """Atoms at random in a cube, none closer to another than a third of its edge."""
    dice = random.Random(seed)
    found: Atoms = []
    while len(found) < count:
        x, y, z = (dice.uniform(0.0, edge) for _ in range(3))
        if all(
            (x - a) ** 2 + (y - b) ** 2 + (z - c) ** 2 > (edge / 3.0) ** 2 for _, (a, b, c) in found
        ):
            found.append((symbol, (x, y, z)))
    return found


FORMALDEHYDE: Atoms = [
    ("O", (0.0, 0.0, 1.205)), ("C", (0.0, 0.0, 0.0)),
    ("H", (0.0, 0.943, -0.587)), ("H", (0.0, -0.943, -0.587)),
]  # fmt: skip
PEROXIDE: Atoms = [
    ("O", (0.0, 0.73, -0.05)), ("O", (0.0, -0.73, -0.05)),
    ("H", (0.84, 0.88, 0.42)), ("H", (-0.84, -0.88, 0.42)),
]  # fmt: skip


def irregular() -> list[System]:
    """Rings and heaps with chance positions, and molecules."""
    found: list[System] = []

    def add(name: str, atoms: Atoms, basis: Basis, **more: object) -> None:
        found.append(System(name, atoms, basis, **more))  # type: ignore[arg-type]

    add("hydrogen peroxide, aug-cc-pVDZ", PEROXIDE, published("aug-cc-pvdz", "O", "H"))
    for distance in (0.65, 0.52, 0.45):
        atoms = shaken(ring("H" * 10, distance), 0.004, 1)
        add(f"ring of 10 H, shaken, {distance}", atoms, published("aug-cc-pvdz", "H"))
    for edge in (1.6, 1.2, 0.9):
        base = diffuse(published("aug-cc-pvdz", "H"), "H", 2, 0.4)
        add(f"heap of 6 H, triply diffuse, {edge}", heap("H", 6, edge, 2), base)
    for edge in (1.5, 1.1, 0.8):
        base = diffuse(published("6-31g**", "He"), "He", 3, 0.5)
        add(f"heap of 6 He, three close s and p, {edge}", heap("He", 6, edge, 3), base)
    for ratio in (1.008, 1.002, 1.0006):
        base = twins(published("def2-svp", "O", "C", "H"), "C H", 0, 0.25, ratio)
        add(f"formaldehyde, twins s 0.25 on C and H, {ratio}", FORMALDEHYDE, base)
    for ratio in (1.0012, 1.0004):
        base = twins(published("cc-pvdz", "O", "H"), "O", 1, 0.9, ratio)
        add(f"hydrogen peroxide, twins p 0.9 on O, {ratio}", PEROXIDE, base)
    for ratio in (1.001, 1.0003):
        base = twins(published("def2-svp", "P", "N"), "P", 2, 0.9, ratio)
        add(f"PN, twins d 0.9 on P, {ratio}", chain("PN", 1.49), base)
    for ratio in (1.0003, 1.00008):
        base = twins(published("def2-svp", "C", "S"), "S", 0, 25.0, ratio)
        add(f"CS, twins s 25 on S, {ratio}", chain("CS", 1.53), base)
    for ratio in (1.001, 1.0003):
        base = twins(published("6-31g", "N", "O"), "N O", 1, 0.05, ratio)
        add(f"NO, unrestricted, twins p 0.05, {ratio}", chain("NO", 1.15), base, spin=1)
    for ratio in (1.0008, 1.0002):
        base = twins(published("def2-svp", "Ni", "H"), "Ni", 2, 2.0, ratio)
        add(f"NiH, unrestricted, twins d 2 on Ni, {ratio}", chain(["Ni", "H"], 1.48), base, spin=1)
    for ratio in (1.004, 1.0012):
        base = twins(published("def2-svp", "Zn", "F"), "Zn", 0, 0.09, ratio)
        add(f"ZnF2, twins s 0.09 on Zn, {ratio}", chain(["F", "Zn", "F"], 1.74), base)
    for factor in (0.6, 0.45):
        base = diffuse(published("6-31+g", "C", "O", "H"), "C O H", 3, 0.5)
        name = f"formaldehyde, 6-31+G and three steps, times {factor}"
        add(name, squeezed(FORMALDEHYDE, factor), base)
    for distance in (1.9, 1.5):
        base = diffuse(published("6-31+g", "Li", "H"), "Li H", 1, 0.4)
        add(f"chain LiHLiHLiH, a diffuse step, {distance}", chain(["Li", "H"] * 3, distance), base)
    for ratio in (1.001, 1.0004):
        base = twins(published("6-31g*", "B", "F"), "B", 2, 0.5, ratio)
        add(f"BF, Cartesian, twins d 0.5 on B, {ratio}", chain("BF", 1.26), base, cartesian=True)
    for ratio in (1.55, 1.45):
        base = {"C": [*even(0, 16, 6.0, ratio), *even(1, 10, 1.0, ratio)]}
        add(f"C, unrestricted, 16 s and 10 p falling by {ratio}", chain("C", 1), base, spin=2)
    base = doubled(published("cc-pvdz", "F", "H"), "F", 1, 4e-4)
    add("HF, doubled p contraction of F, 0.0004", chain("HF", 0.92), base)
    for distance in (0.25, 0.15):
        base = published("6-31++g", "O", "H")
        base["X-H"] = base["O"]
        atoms = [*water(), ("X-H", (distance, 0.1, 0.05))]
        add(f"water, empty centre with functions of O, {distance}", atoms, base)
    return found
