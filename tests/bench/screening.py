"""Screening in ratios within one run: python tests/bench/screening.py

The probe of bonded pairs against reading the same file, and a scan on two processes against one.
Needs PySCF for its bundled sets (extra ``oracle``).
"""

import time
from collections.abc import Callable
from pathlib import Path
from statistics import median

import numpy as np
import pyscf

from overlapse.grammar.geometry import read_bytes
from overlapse.grammar.reading import read
from overlapse.lint.choices import shelf
from overlapse.lint.scanning import measure_all
from overlapse.lint.screening import tasks
from overlapse.rules.case import Case
from overlapse.rules.measured.probing import Wanted
from overlapse.rules.registry import rules

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"
SETS = ("sto-3g.dat", "cc-pvdz.dat", "def2-tzvp.dat", "def2-qzvpp.dat", "aug-cc-pvtz.dat")


def _cost(work: Callable[[], object], clock: Callable[[], float], repeats: int = 7) -> float:
    taken = []
    for _ in range(repeats):
        start = clock()
        work()
        taken.append(clock() - start)
    return median(taken)


def pairs() -> None:
    """CPU time of overlap.pair and of all rules, over that of reading."""
    print("set                 reading ms   overlap.pair   all rules   (over reading)")
    known = rules()
    for name in SETS:
        document = read(FOLDER / name)
        reading = _cost(lambda name=name: read(FOLDER / name), time.process_time)
        pair = _cost(lambda d=document: Case(d).judge(known["overlap.pair"]), time.process_time)
        whole = _cost(
            lambda d=document: [Case(d).judge(rule) for rule in known.values()],
            time.process_time,
            3,
        )
        ratios = f"{pair / reading:>12.2f} {whole / reading:>12.1f}"
        print(f"{name:<20}{reading * 1e3:>10.1f} {ratios}")


def _water(turn: np.ndarray, place: tuple[float, float, float]) -> list[str]:
    atoms = np.array([[0.0, 0.0, 0.1173], [0.0, 0.7572, -0.4692], [0.0, -0.7572, -0.4692]])
    rows = zip("OHH", atoms @ turn.T + np.array(place), strict=True)
    return [f"{symbol} {x:.6f} {y:.6f} {z:.6f}" for symbol, (x, y, z) in rows]


def scan(frames: int = 24, waters: int = 16) -> None:
    """Wall time of a scan of water clusters, two processes over one."""
    random = np.random.default_rng(7)
    text = ""
    for _ in range(frames):
        rows: list[str] = []
        for k in range(waters):
            turn, _ = np.linalg.qr(random.normal(size=(3, 3)))
            rows += _water(turn, (3.0 * (k % 2), 3.0 * (k // 2 % 2), 3.0 * (k // 4)))
        text += f"{len(rows)}\nwaters\n" + "\n".join(rows) + "\n"
    made = shelf([read(FOLDER / "aug-cc-pvdz.dat")])
    found, _ = tasks(made, [read_bytes(text.encode(), "waters.xyz")])
    one = _cost(lambda: measure_all(found, made, Wanted(), jobs=1), time.perf_counter, 1)
    two = _cost(lambda: measure_all(found, made, Wanted(), jobs=2), time.perf_counter, 1)
    print(
        f"{frames} frames of {found[0].functions} functions: {one:.1f} s on one process, ", end=""
    )
    print(f"two take {two / one:.2f} of that")


if __name__ == "__main__":
    pairs()
    scan()
