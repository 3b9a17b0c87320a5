"""Overlap matrices and their condition, as ratios within one run.

    python tests/bench/overlap.py [--large] [--threads 1,2]

Dense matrices of water molecules against PySCF's overlap (extra `oracle`); growth of the cost of
the sparse form from 50 to 300 molecules; verdict and ladder against all eigenvalues.  ``--large``
takes matrices of about 5,000 functions and 150 molecules instead of about 2,000 and 50.  Each
number of threads is a process of its own; repeats are interleaved and medians compared.
"""

import argparse
import os
import subprocess
import sys
import time
import tracemalloc
from collections.abc import Callable
from math import log
from pathlib import Path
from statistics import median

import numpy as np

from overlapse.grammar.model import Block
from overlapse.grammar.reading import read
from overlapse.rules.physics.blocks import sparse_overlap
from overlapse.rules.physics.inertia import counts_below
from overlapse.rules.physics.integrals import memory_needed, overlap
from overlapse.rules.physics.placed import Placed, lay_out
from overlapse.rules.physics.spectrum import largest, smallest, spectrum

ANGSTROM = 1.0 / 0.529177210903


def waters(count: int, blocks: dict[str, Block], seed: int = 3) -> list[Placed]:
    """Molecules turned at random, on a grid of the density of the liquid (3.1 angstrom)."""
    dice = np.random.default_rng(seed)
    side = int(np.ceil(count ** (1 / 3)))
    grid = np.stack(np.meshgrid(*[np.arange(side)] * 3, indexing="ij"), axis=-1).reshape(-1, 3)
    # Cut as round as it goes, so that surfaces compare.
    order = np.argsort(np.linalg.norm(grid - (side - 1) / 2, axis=1), kind="stable")
    shape = np.array([[0.0, 0.0, 0.0], [0.0, 0.757, 0.587], [0.0, -0.757, 0.587]])
    atoms = []
    for centre in grid[order[:count]] * 3.1:
        turn = np.linalg.qr(dice.normal(size=(3, 3)))[0]
        places = (shape @ turn + centre + dice.normal(size=3) * 0.1) * ANGSTROM
        for symbol, (x, y, z) in zip("OHH", places.tolist(), strict=True):
            atoms.append(Placed(blocks[symbol], (x, y, z)))
    return atoms


def flake(rings: int, block: Block) -> list[Placed]:
    """Carbon atoms of a piece of graphene, hexagons in a square of ``rings`` by ``rings``."""
    bond = 1.42 * ANGSTROM
    across, along = bond * np.array([3.0**0.5, 0.0]), bond * np.array([3.0**0.5 / 2, 1.5])
    atoms = []
    for i in range(rings):
        for j in range(rings):
            for shift in (0.0, bond):
                x, y = i * across + j * along + np.array([0.0, shift])
                atoms.append(Placed(block, (float(x), float(y), 0.0)))
    return atoms


def timed(
    repeats: int, *works: Callable[[], object], clock: Callable[[], float] = time.perf_counter
) -> list[float]:
    """Median seconds of each, run in turns."""
    seconds: list[list[float]] = [[] for _ in works]
    for _ in range(repeats):
        for taken, work in zip(seconds, works, strict=True):
            start = clock()
            work()
            taken.append(clock() - start)
    return [median(taken) for taken in seconds]


def dense(folder: Path, count: int, repeats: int) -> None:
    from pyscf import gto

    for name in ("def2-svp", "def2-tzvpd"):
        blocks = {block.symbol: block for block in read(folder / f"{name}.dat").blocks}
        atoms = waters(count, blocks)
        places = [(atom.block.symbol, atom.position) for atom in atoms]
        molecule = gto.M(atom=places, unit="B", basis=name, verbose=0)
        overlap(atoms)
        ours, its = timed(
            repeats, lambda a=atoms: overlap(a), lambda m=molecule: m.intor("int1e_ovlp")
        )
        n = len(lay_out(atoms).atom)
        print(
            f"  dense, {count} waters, {name}, n = {n}: {ours:.2f} s,"
            f" library {its:.2f} s: {its / ours:.1f} times as fast"
        )
        tracemalloc.start()
        overlap(atoms)
        peak = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        print(
            f"    peak of memory {peak / (8 * n * n):.2f} times the matrix"
            f" (estimated {memory_needed(n) / (8 * n * n):.2f})"
        )


def growth(folder: Path, repeats: int) -> None:
    for name in ("def2-svp", "def2-tzvpd"):
        blocks = {block.symbol: block for block in read(folder / f"{name}.dat").blocks}
        sizes = (50, 300)
        clusters = [waters(size, blocks) for size in sizes]
        for drop in (1e-8, 1e-12):
            sparse_overlap(clusters[0], drop=drop)
            small, large = timed(
                repeats,
                *(lambda c=c, d=drop: sparse_overlap(c, drop=d) for c in clusters),
                clock=time.process_time,  # one thread works; others may want the machine
            )
            fill = [sparse_overlap(c, drop=drop).matrix for c in clusters]
            shares = [matrix.nnz / matrix.shape[0] ** 2 for matrix in fill]
            power = log(large / small) / log(sizes[1] / sizes[0])
            elements = log(fill[1].nnz / fill[0].nnz) / log(sizes[1] / sizes[0])
            print(
                f"  sparse, {name}, dropped below {drop:g}: 50 waters {small:.2f} s, 300 waters"
                f" {large:.2f} s: n**{power:.2f} (elements kept n**{elements:.2f},"
                f" {shares[0]:.0%} and {shares[1]:.0%})"
            )


def condition(folder: Path, large: bool, repeats: int) -> None:
    triple = {block.symbol: block for block in read(folder / "def2-tzvpd.dat").blocks}
    augmented = {block.symbol: block for block in read(folder / "aug-cc-pvtz.dat").blocks}
    count, rings = (86, 7) if large else (35, 5)
    systems = {
        f"{count} waters, def2-TZVPD": waters(count, triple),
        f"flake of {2 * rings**2} carbon atoms, aug-cc-pVTZ": flake(rings, augmented["C"]),
    }
    for title, atoms in systems.items():
        matrix = overlap(atoms)
        found = spectrum(matrix)
        exact = np.linalg.eigvalsh(matrix)
        right = all(count == (exact < step).sum() for step, count in found.below.items())
        steps = [step for step in found.below if step > found.smallest]
        works: dict[str, Callable[[], object]] = {
            "smallest, largest, condition": lambda m=matrix: (smallest(m), largest(m)),
            "one count": lambda m=matrix: counts_below(m, [1e-6]),
            f"{len(steps)} counts": lambda m=matrix, s=steps: counts_below(m, s),
            "whole spectrum": lambda m=matrix: spectrum(m),
        }
        every, *others = timed(repeats, lambda m=matrix: np.linalg.eigvalsh(m), *works.values())
        print(
            f"  {title}, n = {len(matrix)}: smallest {found.smallest:.2e} (all eigenvalues:"
            f" {exact[0]:.2e}), below {list(found.below.values())},"
            f" {'as' if right else 'NOT as'} by all eigenvalues, which take {every:.2f} s"
        )
        for what, seconds in zip(works, others, strict=True):
            print(f"    {what}: {every / seconds:.1f} times as fast")


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--large", action="store_true")
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--threads", default="1,2")
    parser.add_argument("--only", choices=("dense", "growth", "condition"))
    chosen = parser.parse_args()
    if "," in chosen.threads:
        for threads in chosen.threads.split(","):
            print(f"threads: {threads}", flush=True)
            environment = {**os.environ, "OMP_NUM_THREADS": threads}
            again = [*sys.argv, "--threads", threads]
            subprocess.run([sys.executable, *again], env=environment, check=True)
        return
    import pyscf

    folder = Path(pyscf.__file__).parent / "gto" / "basis"
    if chosen.only in (None, "dense"):
        dense(folder, 150 if chosen.large else 50, chosen.repeats)
    if chosen.only in (None, "growth"):
        growth(folder, chosen.repeats)
    if chosen.only in (None, "condition"):
        condition(folder, chosen.large, chosen.repeats)


if __name__ == "__main__":
    main()
