"""The systems on which limits of the outlook were chosen."""

from typing import Any

from builders import (
    Atoms,
    Basis,
    System,
    ammonia,
    benzene,
    centred,
    chain,
    cube,
    diffuse,
    doubled,
    ethene,
    even,
    octahedron,
    published,
    ring,
    squeezed,
    twins,
    water,
)
from outlook_drawn import drawn
from outlook_irregular import irregular


def calibration() -> list[System]:
    """All of them, each once."""
    found = {s.name: s for s in [*_dense(), *_others(), *irregular(), *drawn(), *_misleading()]}
    return list(found.values())


def _dense() -> list[System]:
    """Systems of many kinds, dense near the limits."""
    found: list[System] = []

    def add(name: str, atoms: Atoms, basis: Basis, **more: Any) -> None:
        found.append(System(name, atoms, basis, **more))

    # Sound sets at sound distances.
    add("water, aug-cc-pVDZ", water(), published("aug-cc-pvdz", "O", "H"))
    add("ammonia, 6-31++G**", ammonia(), published("6-31++g**", "N", "H"))
    add("benzene, 6-31++G", benzene(), published("6-31++g", "C", "H"))
    add("two waters, def2-SVPD", water() + water(2.9), published("def2-svpd", "O", "H"))
    # Near-twins of valence exponents.
    co = chain("CO", 1.13)
    for ratio in (1.15, 1.05, 1.03, 1.01):
        base = published("def2-svp", "C", "O")
        add(f"CO, twins s 0.4, {ratio}", co, twins(base, "C O", 0, 0.4, ratio))
    for ratio in (1.005, 1.001, 1.0006, 1.0003):
        base = published("cc-pvdz", "H", "F")
        add(f"HF, twins p 0.5 on F, {ratio}", chain("HF", 0.92), twins(base, "F", 1, 0.5, ratio))
    for ratio in (1.003, 1.001, 1.0005, 1.0002):
        base = published("def2-svp", "N", "H")
        add(f"ammonia, twins d 0.8 on N, {ratio}", ammonia(), twins(base, "N", 2, 0.8, ratio))
    for ratio in (1.003, 1.0006, 1.0002):
        base = published("def2-svp", "C", "H")
        atoms = centred("C", "H", 1.09)
        add(f"methane, twins s 1.1 on H, {ratio}", atoms, twins(base, "H", 0, 1.1, ratio))
    # Tight and very diffuse near-twins.
    neon = published("def2-svp", "Ne")
    for ratio in (1.001, 1.0002, 1.00005, 1.00002):
        add(f"Ne, twins s 500, {ratio}", chain(["Ne"], 1), twins(neon, "Ne", 0, 500.0, ratio))
    for exponent, ratio in (
        (60.0, 1.0002),
        (60.0, 1.00005),
        (60.0, 1.00002),
        (8.0, 1.0001),
        (8.0, 1.00004),
    ):
        base = twins(published("def2-svp", "Ar"), "Ar", 1, exponent, ratio)
        add(f"Ar, twins p {exponent:g}, {ratio}", chain(["Ar"], 1), base)
    for ratio in (1.0003, 1.0001, 1.00004):
        base = twins(published("def2-svp", "C", "O"), "O", 0, 40.0, ratio)
        add(f"CO, twins s 40 on O, {ratio}", co, base)
    for ratio in (1.03, 1.01, 1.005, 1.002):
        base = twins(published("def2-svp", "Li", "H"), "Li H", 0, 0.02, ratio)
        add(f"LiH, twins s 0.02, {ratio}", chain(["Li", "H"], 1.6), base)
    for ratio in (1.0003, 1.0001, 1.00005):
        base = twins(published("cc-pvdz", "O", "H"), "O", 1, 0.015, ratio)
        add(f"water, twins p 0.015 on O, {ratio}", water(), base)
    # Hydrogen and helium, many centres.
    for distance in (0.7, 0.55, 0.48, 0.42):
        atoms = ring("H" * 10, distance)
        add(f"ring of 10 H, {distance}", atoms, published("aug-cc-pvdz", "H"))
    for edge in (0.9, 0.7, 0.6):
        base = diffuse(published("aug-cc-pvdz", "H"), "H")
        add(f"cube of 8 H, doubly diffuse, {edge}", cube("H", "H", edge), base)
    for distance in (1.1, 0.9, 0.8, 0.7):
        base = diffuse(published("aug-cc-pvdz", "He"), "He")
        add(f"chain of 7 He, doubly diffuse, {distance}", chain(["He"] * 7, distance), base)
    for distance in (0.9, 0.6, 0.4):
        base = diffuse(published("6-31g", "He"), "He", 3)
        add(f"ring of 6 He, three more s, {distance}", ring(["He"] * 6, distance), base)
    # First row, many centres.
    for distance in (2.4, 1.9, 1.5):
        base = diffuse(published("aug-cc-pvdz", "Be"), "Be", 1, 0.4)
        add(f"chain of 3 Be, doubly diffuse, {distance}", chain(["Be"] * 3, distance), base)
    for distance in (0.7, 0.55, 0.45):
        base = published("aug-cc-pvdz", "N")
        add(f"chain of 4 N, {distance}", chain("NNNN", distance), base)
    add("cube Li4F4, 1.5", cube("Li", "F", 1.5), published("6-31+g", "Li", "F"))
    for edge in (1.5, 1.1, 0.9):
        base = diffuse(published("6-31+g", "Li", "F"), "Li F", 2, 0.35)
        add(f"ring Li2F2, two diffuse steps, {edge}", ring(["Li", "F"] * 2, edge), base)
    for factor in (0.65, 0.55, 0.48):
        base = published("6-31++g", "C", "H")
        add(f"benzene, 6-31++G, squeezed to {factor}", squeezed(benzene(), factor), base)
    for factor in (0.75, 0.6, 0.5):
        base = diffuse(published("aug-cc-pvdz", "C", "H"), "C H")
        name = f"ethene, doubly diffuse, squeezed to {factor}"
        add(name, squeezed(ethene(), factor), base)
    # One centre, long series.
    for ratio in (1.6, 1.5, 1.42):
        base = {"Be": even(0, 18, 3.0, ratio)}
        add(f"Be, 18 s falling by {ratio}", chain(["Be"], 1), base)
    for ratio in (1.45, 1.38, 1.3):
        base = {"H": [*even(0, 12, 0.8, ratio), [1, [1.0, 1.0]]]}
        add(f"H2, 12 s falling by {ratio}", chain("HH", 0.74), base)
    # Transition metals.
    for ratio in (1.002, 1.0003, 1.0001):
        base = twins(published("def2-svp", "Ti", "H"), "Ti", 2, 0.6, ratio)
        add(f"TiH4, twins d 0.6 on Ti, {ratio}", centred("Ti", "H", 1.7), base)
    for ratio in (1.0003, 1.00005):
        base = twins(published("def2-svp", "Zn"), "Zn", 0, 900.0, ratio)
        add(f"Zn, twins s 900, {ratio}", chain(["Zn"], 1), base)
    for steps in (1, 2):
        base = diffuse(published("def2-svp", "Zn", "H"), "Zn H", steps, 0.55)
        add(f"ZnH2, {steps} close diffuse steps", chain(["H", "Zn", "H"], 1.55), base)
    for ratio in (1.0008, 1.0003):
        base = twins(published("def2-svp", "Cu", "H"), "Cu", 1, 0.1, ratio)
        add(f"CuH, twins p 0.1 on Cu, {ratio}", chain(["Cu", "H"], 1.47), base)
    for ratio in (1.0003, 1.00005):
        base = twins(published("def2-svp", "Cr"), "Cr", 2, 1.2, ratio)
        add(f"Cr, unrestricted, twins d 1.2, {ratio}", chain(["Cr"], 1), base, spin=6)
    for ratio in (1.004, 1.001):
        base = twins(published("def2-svp", "Mn"), "Mn", 0, 0.06, ratio)
        add(f"Mn, unrestricted, twins s 0.06, {ratio}", chain(["Mn"], 1), base, spin=5)
    # Open shells.
    for ratio in (1.0025, 1.0008, 1.0003):
        base = twins(published("def2-svp", "O"), "O", 1, 0.35, ratio)
        add(f"O2, unrestricted, twins p 0.35, {ratio}", chain("OO", 1.21), base, spin=2)
    for distance in (0.75, 0.6, 0.5):
        base = published("aug-cc-pvdz", "H")
        add(f"chain of 7 H, unrestricted, {distance}", chain("H" * 7, distance), base, spin=1)
    # Cartesian functions.
    for factor in (1.0, 0.3):
        base = published("cc-pvtz", "N")
        atoms = squeezed(chain("NN", 1.1), factor)
        add(f"N2, Cartesian cc-pVTZ, times {factor}", atoms, base, cartesian=True)
    for ratio in (1.002, 1.0006, 1.0002):
        base = twins(published("6-31g*", "C", "O"), "C", 2, 0.7, ratio)
        add(f"CO, Cartesian, twins d 0.7 on C, {ratio}", co, base, cartesian=True)
    # General contractions and mixed sets.
    for shift in (3e-3, 1e-3, 3e-4, 1e-4):
        base = doubled(published("cc-pvdz", "O", "H"), "O", 0, shift)
        add(f"water, doubled s contraction of O, {shift:g}", water(), base)
    base = doubled(published("cc-pvdz", "C", "O"), "C", 1, 1e-4)
    add("CO, doubled p contraction of C, 0.0001", co, base)
    base = published(O="aug-cc-pvtz", H="sto-3g")
    add("water, aug-cc-pVTZ on O, STO-3G on H", water(), base)
    base = published(C="6-31g", O="aug-cc-pvdz")
    add("CO, mixed, squeezed to 0.5", squeezed(co, 0.5), base)
    for distance in (0.01, 0.001, 0.0003):
        base = published("6-31g", "H", "F")
        base["X-H"] = base["H"]
        atoms = [*chain("HF", 0.92), ("X-H", (0.0, 0.0, -distance))]
        add(f"HF, empty centre {distance} from H", atoms, base)
    return found


def _others() -> list[System]:
    """Other systems of the same kinds."""
    found: list[System] = []

    def add(name: str, atoms: Atoms, basis: Basis, **more: Any) -> None:
        found.append(System(name, atoms, basis, **more))

    # Sound sets at sound distances.
    add(
        "silane, cc-pVTZ on Si, cc-pVDZ on H",
        centred("Si", "H", 1.48),
        published(Si="cc-pvtz", H="cc-pvdz"),
    )
    add(
        "hydrogen cyanide, aug-cc-pVDZ",
        [("H", (0, 0, -1.07)), *chain("CN", 1.16)],
        published("aug-cc-pvdz", "H", "C", "N"),
    )
    add(
        "butadiyne, 6-31++G**",
        [
            ("H", (0, 0, -1.06)),
            ("C", (0, 0, 0)),
            ("C", (0, 0, 1.21)),
            ("C", (0, 0, 2.58)),
            ("C", (0, 0, 3.79)),
            ("H", (0, 0, 4.85)),
        ],
        published("6-31++g**", "H", "C"),
    )
    # Near-twins of valence exponents.
    for ratio in (1.02, 1.006, 1.002):
        base = published("def2-svp", "Si", "H")
        add(
            f"silane, twins s 0.15 on all, {ratio}",
            centred("Si", "H", 1.48),
            twins(base, "Si H", 0, 0.15, ratio),
        )
    for ratio in (1.0012, 1.0006, 1.0003):
        base = twins(published("cc-pvdz", "N"), "N", 2, 0.6, ratio)
        add(f"N2, twins d 0.6, {ratio}", chain("NN", 1.1), base)
    for ratio in (1.0015, 1.0005, 1.0002):
        base = twins(published("6-31g", "Cl", "H"), "Cl", 1, 0.3, ratio)
        add(f"HCl, twins p 0.3 on Cl, {ratio}", chain(["H", "Cl"], 1.28), base)
    for ratio in (1.005, 1.0015, 1.0007):
        base = twins(published("cc-pvdz", "F"), "F", 0, 0.7, ratio)
        add(f"F2, twins s 0.7, {ratio}", chain("FF", 1.41), base)
    base = twins(published("cc-pvtz", "B", "H"), "B", 3, 0.55, 1.001)
    add("borane, twins f 0.55 on B, 1.001", [("B", (0, 0, 0)), *ring("HHH", 2.06)], base)
    # Tight and diffuse near-twins.
    for ratio in (1.0002, 1.00006, 1.00002):
        base = twins(published("def2-svp", "Mg"), "Mg", 0, 2500.0, ratio)
        add(f"Mg, twins s 2500, {ratio}", chain(["Mg"], 1), base)
    for ratio in (1.0002, 1.00007, 1.00003):
        base = twins(published("cc-pvdz", "Ne"), "Ne", 1, 90.0, ratio)
        add(f"Ne, twins p 90, {ratio}", chain(["Ne"], 1), base)
    base = twins(published("def2-svp", "S", "H"), "S", 0, 120.0, 1.0001)
    add(
        "hydrogen sulphide, twins s 120 on S, 1.0001",
        [("S", (0, 0, 0)), ("H", (0, 0.97, 0.93)), ("H", (0, -0.97, 0.93))],
        base,
    )
    for ratio in (1.0025, 1.0007, 1.0003):
        base = twins(published("def2-svp", "Na", "H"), "Na", 0, 0.012, ratio)
        add(f"NaH, twins s 0.012 on Na, {ratio}", chain(["Na", "H"], 1.89), base)
    for ratio in (1.002, 1.0005):
        base = twins(published("def2-svp", "C", "H"), "C", 1, 0.03, ratio)
        add(f"ethene, twins p 0.03 on C, {ratio}", ethene(), base)
    # Hydrogen and helium, many centres.
    for distance in (0.95, 0.8, 0.7, 0.6):
        add(f"chain of 8 H, {distance}", chain("H" * 8, distance), published("aug-cc-pvdz", "H"))
    for radius in (0.5, 0.3):
        base = diffuse(published("aug-cc-pvdz", "H"), "H")
        add(f"octahedron of 6 H, doubly diffuse, {radius}", octahedron("H", radius), base)
    for distance in (0.75, 0.6, 0.45):
        base = diffuse(published("6-31g**", "He"), "He", 2, 0.35)
        add(f"ring of 7 He, two more s and p, {distance}", ring(["He"] * 7, distance), base)
    base = diffuse(published("aug-cc-pvdz", "He"), "He")
    for edge in (1.1, 0.8):
        add(f"cube of 8 He, doubly diffuse, {edge}", cube("He", "He", edge), base)
    # First and second row, many centres.
    for distance in (1.7, 1.3, 1.1):
        base = published("aug-cc-pvdz", "Li")
        add(f"chain of 4 Li, {distance}", chain(["Li"] * 4, distance), base)
    for distance in (0.8, 0.55, 0.45):
        base = published("aug-cc-pvdz", "C", "O")
        add(f"chain O C C O, {distance}", chain("OCCO", distance), base)
    for edge in (1.35, 1.0):
        base = published("6-31+g", "Mg", "O")
        add(f"cube Mg4O4, {edge}", cube("Mg", "O", edge), base)
    for factor in (0.75, 0.4):
        base = diffuse(published("def2-svpd", "C", "N", "H"), "C N H", 2, 0.4)
        atoms = [("H", (0.0, 0.0, -1.07)), *chain("CN", 1.16)]
        add(
            f"hydrogen cyanide, def2-SVPD and two diffuse steps, squeezed to {factor}",
            squeezed(atoms, factor),
            base,
        )
    base = published("aug-cc-pvdz", "O", "H")
    add("two waters, aug-cc-pVDZ, squeezed to 0.35", squeezed(water() + water(2.9), 0.35), base)
    # One centre, long series.
    for ratio in (1.6, 1.5, 1.43):
        base = {"Ne": [*even(0, 18, 14.0, ratio), *even(1, 6, 5.0, 2.6)]}
        add(f"Ne, 18 s falling by {ratio} and p", chain(["Ne"], 1), base)
    for ratio in (1.42, 1.36, 1.32):
        base = {"He": even(0, 12, 1.2, ratio)}
        add(f"He2, 12 s falling by {ratio}", chain(["He"] * 2, 1.5), base)
    # Transition metals.
    for ratio in (1.0018, 1.0004, 1.00015):
        base = twins(published("def2-svp", "Cu", "F"), "Cu", 2, 0.8, ratio)
        add(f"CuF, twins d 0.8 on Cu, {ratio}", chain(["Cu", "F"], 1.75), base)
    for ratio in (1.01, 1.003):
        base = twins(published("def2-svp", "Sc", "H"), "Sc", 0, 0.05, ratio)
        add(f"ScH3, twins s 0.05 on Sc, {ratio}", [("Sc", (0, 0, 0)), *ring("HHH", 3.14)], base)
    base = twins(published("def2-svp", "Fe"), "Fe", 0, 1500.0, 1.0001)
    add("Fe, unrestricted, twins s 1500, 1.0001", chain(["Fe"], 1), base, spin=4)
    base = twins(published("def2-svp", "V"), "V", 1, 0.15, 1.0006)
    add("V, unrestricted, twins p 0.15, 1.0006", chain(["V"], 1), base, spin=5)
    # Open shells.
    for ratio in (1.002, 1.0008, 1.0004):
        base = twins(published("cc-pvdz", "O", "H"), "O", 0, 0.2, ratio)
        add(f"OH, unrestricted, twins s 0.2 on O, {ratio}", chain("OH", 0.97), base, spin=1)
    base = published("aug-cc-pvdz", "H")
    for distance in (0.7, 0.55):
        add(f"chain of 9 H, unrestricted, {distance}", chain("H" * 9, distance), base, spin=1)
    # Cartesian functions.
    for ratio in (1.0015, 1.0007, 1.0004):
        base = twins(published("6-31g*", "F", "H"), "F", 2, 0.9, ratio)
        add(f"HF, Cartesian, twins d 0.9 on F, {ratio}", chain("HF", 0.92), base, cartesian=True)
    base = published("cc-pvtz", "O", "H")
    add("OH anion, Cartesian cc-pVTZ, 0.5", chain("OH", 0.5), base, cartesian=True, charge=-1)
    # General contractions and mixed sets.
    for shift in (2e-3, 5e-4, 2e-4):
        base = doubled(published("cc-pvdz", "N", "H"), "N", 0, shift)
        add(f"ammonia, doubled s contraction of N, {shift:g}", ammonia(), base)
    for shift in (1e-3, 2e-4):
        base = doubled(published("cc-pvdz", "Ar"), "Ar", 1, shift)
        add(f"Ar, doubled p contraction, {shift:g}", chain(["Ar"], 1), base)
    base = published("6-31+g*", "O", "H")
    base["X-O"] = base["O"]
    for distance in (0.3, 0.17, 0.1):
        add(
            f"water, empty centre {distance} from O",
            [*water(), ("X-O", (distance, 0.0, 0.0))],
            base,
        )
    return found


def _misleading() -> list[System]:
    """Systems that misled simple limits."""
    found: list[System] = []
    for ratio in (1.1, 1.01, 1.001, 1.0001, 1.00001):
        base = twins(published("def2-svp", "O", "H"), "O H", 0, 0.3, ratio)
        found.append(System(f"water, twins s 0.3 on all, {ratio}", water(), base))
    for distance in (1.0, 0.8, 0.6):
        base = published("aug-cc-pvdz", "H")
        found.append(System(f"chain of 10 H, {distance}", chain("H" * 10, distance), base))
    found.append(System("water, aug-cc-pVTZ", water(), published("aug-cc-pvtz", "O", "H")))
    for ratio in (1.0005, 1.0001, 1.00005):
        base = twins(published("def2-svp", "Ne"), "Ne", 0, 900.0, ratio)
        found.append(System(f"Ne, twins s 900, {ratio}", chain(["Ne"], 1.0), base))
    for distance in (1.2, 1.0, 0.87):
        base = diffuse(published("aug-cc-pvdz", "He"), "He")
        found.append(
            System(f"chain of 8 He, doubly diffuse, {distance}", chain(["He"] * 8, distance), base)
        )
    for distance in (0.7, 0.5, 0.42):
        base = published("aug-cc-pvdz", "N")
        found.append(System(f"chain of 4 N, {distance}", chain("NNNN", distance), base))
    base = diffuse(published("aug-cc-pvdz", "He"), "He")
    found.append(System("cube of 8 He, doubly diffuse, 0.9", cube("He", "He", 0.9), base))
    return found
