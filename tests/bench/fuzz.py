"""Damage texts at random and judge them: nothing may raise, hang or take memory without bound.

    python tests/bench/fuzz.py [--inputs N] [--seed S] [--samples FOLDER]

Samples are texts of all layouts: written from invented documents, and files of a folder where one
is given.  Each input is a stretch of a sample with a few byte-level mutations, read by content (one
in four: as a layout chosen at random) and judged by all rules.  Reported are exceptions and
warnings, inputs that take more than 20 times their layout's median time per byte (measured three
times), and inputs whose peak of memory is above 50 times their size and a megabyte that does not
depend on it (one input in 50 is traced).
"""

import argparse
import random
import sys
import time
import tracemalloc
import warnings
from collections.abc import Iterator
from concurrent.futures import ProcessPoolExecutor
from os import cpu_count
from pathlib import Path
from statistics import median
from typing import NamedTuple

sys.path.insert(0, str(Path(__file__).parent))

from speed import invented

from overlapse.grammar.layouts import layouts, names
from overlapse.grammar.reading import read_bytes
from overlapse.lint.engine import judge
from overlapse.lint.settings import Settings

LONGEST = 4_000  # bytes of one input
HANG, SLOWEST = 20.0, 0.2  # times the median time per byte; and seconds that are no hang
GREED, FIXED = 50, 1_000_000  # bytes of memory per byte, and without any
CHARACTERS = b"0123456789.+-eEdD*$@/:,;()[]{}\"'!#= \t\r\nSPDFspdfOlCHN\x00\xff\xc2\xa0"


class Outcome(NamedTuple):
    """What one input did: its layout as read, seconds per byte, and trouble, if any."""

    layout: str
    pace: float
    trouble: str


def samples(folder: Path | None) -> list[bytes]:
    """Texts to damage."""
    found = [layout.write(invented(8)).text.encode() for layout in layouts().values()]
    if folder is not None:
        found += [path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()]
    return found


def damaged(sample: bytes, dice: random.Random) -> bytes:
    """A stretch of a sample with one to five mutations."""
    start = dice.randrange(max(1, len(sample) - LONGEST)) if dice.random() < 0.7 else 0
    if start:
        start = sample.find(b"\n", start) + 1
    data = bytearray(sample[start : start + dice.randrange(200, LONGEST)])
    for _ in range(dice.randint(1, 5)):
        _mutate(data, dice)
    return bytes(data)


def _mutate(data: bytearray, dice: random.Random) -> None:
    at = dice.randrange(len(data) + 1)
    kind = dice.randrange(7)
    piece = data[at : at + dice.randrange(1, 200)]
    if kind == 0 and at < len(data):
        data[at] = dice.choice(CHARACTERS)
    elif kind == 1:
        data[at:at] = bytes(dice.choice(CHARACTERS) for _ in range(dice.randint(1, 6)))
    elif kind == 2:
        del data[at : at + len(piece)]
    elif kind == 3:
        data[at:at] = piece * dice.randint(1, 5)
    elif kind == 4:
        lines = data.split(b"\n")
        dice.shuffle(lines)
        data[:] = b"\n".join(lines)
    elif kind == 5:
        lines = data.split(b"\n")
        del lines[dice.randrange(len(lines))]
        data[:] = b"\n".join(lines)
    elif kind == 6:
        data[at:at] = dice.choice(
            (b"1e999", b"nan", b"9" * 30, b"****", b"\xef\xbb\xbf", b"-", b"0")
        )


def run_one(data: bytes, layout: str | None) -> str:
    """Judge an input; the layout it was read as."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        document = read_bytes(data, "damaged", layout=layout)
        judge(document, settings=Settings())
    return document.layout


def measure(data: bytes, layout: str | None, traced: bool) -> Outcome:
    if traced:
        tracemalloc.start()
    start = time.process_time()
    try:
        read_as = run_one(data, layout)
    except Exception as failure:  # the very thing that is looked for
        return Outcome("", 0.0, f"{type(failure).__name__}: {failure}")
    finally:
        spent = time.process_time() - start
        peak = tracemalloc.get_traced_memory()[1] if traced else 0
        tracemalloc.stop()
    trouble = f"peak of {peak:,} bytes" if peak > GREED * len(data) + FIXED else ""
    return Outcome(read_as, -1.0 if traced else spent / max(1, len(data)), trouble)


def batch(seed: int, count: int, folder: Path | None) -> list[tuple[bytes, str | None, Outcome]]:
    """Outcomes worth keeping: all troubles, and the pace of everything."""
    dice = random.Random(seed)
    texts = samples(folder)
    found = []
    for text in texts[: len(names())]:
        run_one(text, None)  # whatever is loaded once is loaded now
    for number in range(count):
        data = damaged(dice.choice(texts), dice)
        layout = dice.choice(names()) if dice.random() < 0.25 else None
        outcome = measure(data, layout, number % 50 == 0)
        if outcome.trouble:
            # Tables that are loaded once, when first needed, are no greed of this input.
            outcome = measure(data, layout, number % 50 == 0)
        telling = outcome.trouble or outcome.pace * len(data) > SLOWEST
        found.append((data if telling else b"", layout, outcome))
    return found


def hangs(
    found: list[tuple[bytes, str | None, Outcome]],
) -> Iterator[tuple[bytes, str | None, float]]:
    """Inputs that stay slow when they are measured again, and by how much."""
    paces: dict[str, list[float]] = {}
    for _, _, outcome in found:
        if outcome.pace >= 0.0 and not outcome.trouble:
            paces.setdefault(outcome.layout, []).append(outcome.pace)
    usual = {layout: median(values) for layout, values in paces.items()}
    for data, layout, outcome in found:
        if data and not outcome.trouble and outcome.pace > HANG * usual[outcome.layout]:
            again = min(measure(data, layout, False).pace for _ in range(3))
            if again > HANG * usual[outcome.layout]:
                yield data, layout, again / usual[outcome.layout]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--inputs", type=int, default=20_000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--samples", type=Path)
    parser.add_argument("--keep", type=Path, help="folder for the inputs in trouble")
    options = parser.parse_args()
    size = 1_000
    seeds = range(options.seed, options.seed + -(-options.inputs // size))
    begun = time.perf_counter()
    found: list[tuple[bytes, str | None, Outcome]] = []
    with ProcessPoolExecutor(cpu_count()) as pool:
        jobs = [pool.submit(batch, seed * 7919, size, options.samples) for seed in seeds]
        for job in jobs:
            found += job.result()
    print(f"{len(found):,} inputs in {time.perf_counter() - begun:.0f} s")
    counts: dict[str, int] = {}
    for _, _, outcome in found:
        counts[outcome.layout or "none"] = counts.get(outcome.layout or "none", 0) + 1
    print("read as:", ", ".join(f"{name} {count}" for name, count in sorted(counts.items())))
    troubles = [(data, layout, outcome) for data, layout, outcome in found if outcome.trouble]
    slow = list(hangs(found))
    print(f"{len(troubles)} in trouble, {len(slow)} slow")
    if options.keep:
        options.keep.mkdir(parents=True, exist_ok=True)
        for number, (data, _, _) in enumerate(troubles):
            (options.keep / f"trouble-{number}").write_bytes(data)
    for data, layout, outcome in troubles[:10]:
        print(f"  {outcome.trouble} (layout {layout}): {data[:300]!r}")
    for data, layout, times in slow[:10]:
        print(f"  {times:.0f} times the median (layout {layout}): {data[:300]!r}")
    sys.exit(1 if troubles or slow else 0)


if __name__ == "__main__":
    main()
