"""Screening in ratios within one run: python tests/bench/screening.py

The probe of bonded pairs against reading the same file, and a scan on two processes against one.
Needs PySCF for its bundled sets (extra ``oracle``).
"""

import os
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


def scan(frames: int = 160, waters: int = 16) -> None:
    """Gain of a second process in a scan of water clusters.

    By wall time, which other work on the machine spoils, and by processor time: what two processes
    with a processor each would gain.
    """
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
    measure_all(found[:1], made, Wanted(), jobs=1)  # tables that stay
    wall, worked = [], []
    for jobs in (1, 2):
        start, before = time.perf_counter(), _processor()
        measure_all(found, made, Wanted(), jobs=jobs)
        wall.append(time.perf_counter() - start)
        worked.append(_processor() - before)
    print(
        f"{frames} frames of {found[0].functions} functions: {wall[0]:.1f} s on one process"
        f" ({worked[0]:.1f} s of processors), {wall[1]:.1f} s on two ({worked[1]:.1f} s):"
        f" gain {wall[0] / wall[1]:.2f}, {2.0 * worked[0] / worked[1]:.2f} if each had a processor"
    )


def _processor() -> float:
    """Processor time of this process and of those that it started and that have ended, seconds."""
    times = os.times()
    return times.user + times.system + times.children_user + times.children_system


if __name__ == "__main__":
    pairs()
    scan()
