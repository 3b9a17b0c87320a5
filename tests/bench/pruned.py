"""What pruning at 1e-7 does to the smallest eigenvalue and to the energy.

    python tests/bench/pruned.py [--out FILE]

Each system's functions are pruned in three ways: single functions, whole contracted functions atom
by atom, and whole contracted functions on all atoms of an element.  PySCF then solves the field in
what is left.  Energies are compared with those of all functions: with removal of the eigenvectors
of S below 1e-7, which is what a program does that does not prune, and without any removal where
that converges.  "Moved" is the second where there is one, else the first.  Near-twins come
apart from the others, since the removal itself costs them the derivative of a function, and so do
systems squeezed beyond any real distance.
"""

import argparse
import sys
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from builders import System, placed, places
from hosts import TOLERANCE, Run, field_of, general, removed, solved
from outlook_calibration import calibration

from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.placed import lay_out
from overlapse.rules.physics.pruning import chosen, shells_to_drop
from overlapse.rules.physics.worth import worth_of

PRUNING = 1e-7
SETS = {
    "Many centres": (
        "chain of 10 H, 1.0", "chain of 10 H, 0.8", "chain of 8 H, 0.95", "chain of 8 H, 0.8",
        "chain of 7 H, unrestricted, 0.75", "ring of 10 H, 0.7",
        "chain of 7 He, doubly diffuse, 0.9", "benzene, 6-31++G, squeezed to 0.55",
        "ring Li2F2, two diffuse steps, 1.5", "ring Li2F2, two diffuse steps, 1.1",
    ),
    "Near-twins": (
        "water, twins s 0.3 on all, 1.01", "water, twins s 0.3 on all, 1.0001",
        "Ne, twins s 500, 1.00005", "CO, doubled p contraction of C, 0.0001",
    ),
    "Beyond real distances": (
        "benzene, 6-31++G, squeezed to 0.48", "chain of 8 H, 0.7",
        "cube of 8 He, doubly diffuse, 0.8",
    ),
}  # fmt: skip


def within(system: System, molecule: Any, eri: Any, kept: Any) -> Run:
    """The field in some of the functions, indices in the oracle's order."""
    field = field_of(system, molecule, eri)
    s = field.get_ovlp()
    values, vectors = np.linalg.eigh(s[np.ix_(kept, kept)])
    x = np.zeros((len(s), len(kept)))
    x[kept] = vectors / np.sqrt(values)
    field.check_linear_dependency = lambda *_, **__: x
    return solved(field)


class Pruned(NamedTuple):
    """One way of pruning one system: row of the table, smallest eigenvalue after, energy moved."""

    way: str
    row: str
    smallest: float
    moved: float


def ways_of(system: System) -> list[Pruned]:
    """A system pruned in all three ways."""
    atoms, _ = placed(system)
    matrix, functions, place = overlap(atoms), lay_out(atoms), np.array(places(system))
    molecule = system.molecule()
    there = molecule.intor("int1e_ovlp")[np.ix_(place, place)]
    if not system.cartesian and np.abs(there - matrix).max() > 1e-10:
        raise ValueError(f"{system.name}: functions are not in the order expected")
    eri = molecule.intor("int2e", aosym="s8")
    reference = removed(system, molecule, eri)[0]
    whole = general(system, molecule, eri)
    worth = worth_of(
        atoms, matrix, kinetic(atoms), charge=system.charge, unpaired=system.spin or None
    )
    ways = {
        "functions": chosen(matrix, PRUNING),
        "shells, atom by atom": shells_to_drop(matrix, functions, atoms, PRUNING, "atom").kept,
        "shells of the element": shells_to_drop(
            matrix, functions, atoms, PRUNING, cost=None if worth is None else worth.loss
        ).kept,
    }
    found: list[Pruned] = []
    for way, kept in ways.items():
        left = matrix[np.ix_(kept, kept)]
        after = float(np.linalg.eigvalsh(left)[0])
        end = within(system, molecule, eri, place[kept])
        cells = (
            system.name,
            way,
            f"{len(matrix)} to {len(kept)}",
            f"{np.linalg.eigvalsh(matrix)[0]:.1e}",
            f"{after:.1e}",
            f"{end.energy:.6f}" if end.converged else "-",
            f"{end.energy - reference.energy:+.1e}",
            f"{end.energy - whole.energy:+.1e}" if whole.converged else "-",
            f"{worth.loss(kept):.1e}" if worth is not None else "-",
        )
        against = whole if whole.converged else reference
        moved = abs(end.energy - against.energy)
        found.append(Pruned(way, "| " + " | ".join(cells) + " |", after, moved))
    return found


HEAD = (
    "| system | pruned by | functions | smallest before | after | energy "
    "| less that with removal | less that of all functions | foretold |\n" + "|---" * 9 + "|"
)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--out", type=Path)
    arguments = parser.parse_args()
    known = {system.name: system for system in calibration()}
    text = [f"Pruning at {PRUNING:g}, fields to {TOLERANCE:g} hartree."]
    for title, names in SETS.items():
        text += ["", f"### {title}", "", HEAD]
        found: list[Pruned] = []
        for name in names:
            print(name, file=sys.stderr)
            found += ways_of(known[name])
        text += [pruned.row for pruned in found]
        text.append("")
        for way in dict.fromkeys(pruned.way for pruned in found):
            some = [pruned for pruned in found if pruned.way == way]
            text.append(
                f"Pruned by {way}: smallest eigenvalue at least "
                f"{min(pruned.smallest for pruned in some):.1e}; energy moved by "
                f"{max(pruned.moved for pruned in some):.1e} hartree at most.  "
            )
    if arguments.out is not None:
        arguments.out.write_text("\n".join(text) + "\n")
    print("\n".join(text))


if __name__ == "__main__":
    main()
