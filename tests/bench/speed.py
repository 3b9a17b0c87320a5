"""How fast an audit starts and how fast layouts are read, as ratios within one run.

    python tests/bench/speed.py [--repeats N]

Start: the whole process that audits one file of 200 lines, against an interpreter that imports
numpy and lark and does nothing.  Reading: the reader of each layout, against a bare loop that
splits the same numeric rows and turns their words into floats.  Runs are interleaved and medians
are compared, so that the machine's mood cancels.
"""

import argparse
import random
import re
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from statistics import median

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import BasisSet, Block, Document, Shell
from overlapse.grammar.numbers import NUMBER
from overlapse.grammar.reading import read_text
from overlapse.grammar.source import Source


def invented(elements: int, seed: int = 7) -> Document:
    """A document like those in use: contracted s and p shells, a few lone primitives each."""
    dice = random.Random(seed)
    blocks = []
    for z in range(1, elements + 1):
        shells = []
        # 2.6 rows a shell, as in published files taken at random.
        for l, lengths in ((0, (8, 4, 1, 1)), (1, (5, 3, 1)), (2, (1, 1)), (3, (1,))):
            for n in lengths:
                tight = dice.uniform(50.0, 5000.0) if n > 1 else dice.uniform(0.05, 2.0)
                exponents = [round(tight / 4.1**k, 7) for k in range(n)]
                values = [[round(dice.uniform(0.01, 0.9), 8)] for _ in range(n)]
                shells.append(Shell((l,), exponents, values if n > 1 else [[1.0]]))
        blocks.append(Block(z, tuple(shells), None, "invented"))
    return Document(Source(""), "", (BasisSet(tuple(blocks), "invented"),))


def bare_loop(rows: list[str]) -> int:
    """Split and float rows of numbers; count the numbers."""
    count = 0
    for line in rows:
        count += len([float(word.replace("D", "E")) for word in line.split()])
    return count


def numeric_rows(text: str) -> list[str]:
    """The lines of a text, each cut down to its numbers; lines without any are left out."""
    rows = []
    for line in text.split("\n"):
        words = [word for word in re.split(r"[\s,;\"\[\]]+", line) if NUMBER.fullmatch(word)]
        if words:
            rows.append("  ".join(words))
    return rows


def ratio(
    ours: Callable[[], object],
    reference: Callable[[], object],
    repeats: int,
    clock: Callable[[], float] = time.process_time,
) -> float:
    """Median time of ours over median time of the reference, runs interleaved."""

    def timed(work: Callable[[], object]) -> float:
        start = clock()
        work()
        return clock() - start

    pairs = [(timed(ours), timed(reference)) for _ in range(repeats)]
    return median(a for a, _ in pairs) / median(b for _, b in pairs)


def start_ratio(repeats: int) -> float:
    """The whole process, against one that only imports numpy and lark."""
    text = layouts()["stars"].write(invented(12)).text
    lines = "\n".join(text.split("\n")[:200]).rsplit("****", 1)[0] + "****\n"
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "sample.basis")
        path.write_text(lines)
        command = [sys.executable, "-c", "from overlapse.lint.cli import main; main()"]

        def ours() -> None:
            subprocess.run([*command, "audit", path], capture_output=True, check=False)

        def reference() -> None:
            subprocess.run([sys.executable, "-c", "import numpy, lark"], check=True)

        ours()
        reference()
        return ratio(ours, reference, repeats, time.perf_counter)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--repeats", type=int, default=15)
    repeats = parser.parse_args().repeats
    print(
        f"audit of 200 lines, whole process / import of numpy and lark: {start_ratio(repeats):.2f}"
    )
    document = invented(86)
    print(f"{'layout':<12} {'rows':>6}  reading / bare loop")
    for name, layout in layouts().items():
        text = layout.write(document).text
        rows = numeric_rows(text)
        read_text(text, layout=name)
        found = ratio(lambda: read_text(text, layout=name), lambda: bare_loop(rows), repeats)  # noqa: B023
        print(f"{name:<12} {len(rows):>6}  {found:.2f}")


if __name__ == "__main__":
    main()
