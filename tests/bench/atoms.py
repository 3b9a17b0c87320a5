"""Time of Hartree-Fock atoms against those of PySCF in the same run.

    python tests/bench/atoms.py [--set cc-pvtz] [--repeats 3]

All elements H-Kr of a published set on one core, evenly spread electrons in both, which is the one
convention that both have; then the ground terms, and the whole of the energy rules on the file.
"""

import argparse
import os
import time
from collections.abc import Callable
from pathlib import Path

os.environ["OMP_NUM_THREADS"] = "1"  # before numpy is loaded

from pyscf import gto, lib
from pyscf.scf import atom_hf

from overlapse.grammar.model import Block
from overlapse.grammar.reading import read
from overlapse.rules.atomic.atoms import MEMORY, atom_of
from overlapse.rules.case import Case
from overlapse.rules.physics.atom import solve
from overlapse.rules.physics.configuration import Coupling, configuration
from overlapse.rules.physics.radial import Integrals
from overlapse.rules.registry import rules

FOLDER = Path(gto.__file__).parent / "basis"


def ours(blocks: list[Block], coupling: Coupling) -> dict[str, float]:
    found = {}
    for block in blocks:
        atom = atom_of(block)
        assert atom is not None
        integrals = Integrals(atom.exponents, configuration(block.atomic_number, coupling))
        found[block.symbol] = solve(integrals, atom.functions).energy
    return found


def theirs(molecules: dict[str, gto.Mole]) -> dict[str, float]:
    return {s: atom_hf.get_atm_nrhf(molecule)[s][0] for s, molecule in molecules.items()}


def least(work: Callable[[], dict[str, float]], repeats: int) -> tuple[float, dict[str, float]]:
    times = []
    for _ in range(repeats):
        start = time.process_time()
        found = work()
        times.append(time.process_time() - start)
    return min(times), found


def main() -> None:
    parser = argparse.ArgumentParser(description="Time of Hartree-Fock atoms, H-Kr.")
    parser.add_argument("--set", default="cc-pvtz")
    parser.add_argument("--repeats", type=int, default=3)
    given = parser.parse_args()
    lib.num_threads(1)
    document = read(FOLDER / f"{given.set}.dat")
    blocks = [b for b in document.sets[0].blocks if atom_of(b) is not None]
    molecules = {
        b.symbol: gto.M(
            atom=f"{b.symbol} 0 0 0", basis=given.set, spin=b.atomic_number % 2, verbose=0
        )
        for b in blocks
    }
    # Only occupied l play a part in such an atom; PySCF carries the others along.
    own_time, own = least(lambda: ours(blocks, "fraction"), given.repeats)
    other_time, other = least(lambda: theirs(molecules), given.repeats)
    term_time, _ = least(lambda: ours(blocks, "term"), given.repeats)
    worst = {s: abs(own[s] - other[s]) for s in own}
    apart = [s for s, difference in worst.items() if difference > 1e-5]
    print(f"{given.set}, {len(blocks)} elements, CPU time of one core")
    print(f"evenly spread electrons: {own_time:.2f} s")
    print(f"the same by PySCF:       {other_time:.2f} s, ratio {other_time / own_time:.1f}")
    print(f"ground terms:            {term_time:.2f} s")
    agreeing = [d for s, d in worst.items() if s not in apart]
    print(f"largest difference: {max(agreeing):.1e} hartree")
    if apart:
        print(f"other occupations of 4s and 3d in PySCF, not compared: {', '.join(apart)}")
    MEMORY.clear()
    start = time.process_time()
    case = Case(document, energies=True)
    found = [f for n, r in rules().items() if n.startswith("energy.") for f in case.judge(r)]
    print(
        f"all energy rules on the file: {time.process_time() - start:.2f} s, {len(found)} findings"
    )


if __name__ == "__main__":
    main()
