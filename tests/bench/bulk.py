"""A folder of many files: on one core, on all, and a second time.

    python tests/bench/bulk.py [--files N] [--samples FOLDER] [--processes P]

The files are invented sets in all layouts, or those of a folder under new names.  Printed are the
times of whole `overlapse audit` processes: cold on one core and on P, warm (nothing changed), and
the peak memory of the parent.  Bars: P cores at least 0.85 P times as fast as one, warm at least 20
times as fast as cold on P cores, parent below 300 MB.
"""

import argparse
import os
import random
import shutil
import subprocess
import sys
import tempfile
import time
from pathlib import Path
from typing import NamedTuple

sys.path.insert(0, str(Path(__file__).parent))

from speed import invented

from overlapse.grammar.layouts import layouts
from overlapse.lint.cache import FILE

_PROGRAM = """
import resource, sys
from overlapse.lint.cli import main
try:
    main()
finally:
    own = resource.getrusage(resource.RUSAGE_SELF)
    others = resource.getrusage(resource.RUSAGE_CHILDREN)
    used = [each.ru_utime + each.ru_stime for each in (own, others)]
    print(*used, own.ru_maxrss, file=sys.stderr)
"""


# Small folders would be audited with energies, which large ones are not.
_AUDIT = ("audit", "--report", "lines", "--no-energies")


class Run(NamedTuple):
    """seconds: from start to end.  own, others: processor seconds of the parent and of the other
    processes.  memory: peak of the parent, in MB.  report: what it wrote.
    """

    seconds: float
    own: float
    others: float
    memory: float
    report: bytes

    def told(self) -> str:
        return (
            f"{self.seconds:8.1f} s  (processor: parent {self.own:.1f} s, others "
            f"{self.others:.1f} s; parent's memory {self.memory:.0f} MB)"
        )


def fill(folder: Path, files: int, samples: Path | None) -> int:
    """Make the files; return their size in bytes."""
    dice = random.Random(3)
    size = 0
    if samples is None:
        writers = list(layouts().values())
        texts = [
            writers[k % len(writers)].write(invented(dice.randint(2, 12), seed=k)).text.encode()
            for k in range(12 * len(writers))
        ]
    else:
        texts = [path.read_bytes() for path in sorted(samples.rglob("*")) if path.is_file()]
    for number in range(files):
        part = folder / f"{number // 500:03d}"
        part.mkdir(exist_ok=True)
        data = texts[number % len(texts)]
        # No two files are the same, so that no result can be used twice.
        if number >= len(texts):
            data += b"\n" * (number // len(texts))
        (part / f"set-{number:05d}.txt").write_bytes(data)
        size += len(data)
    return size


def run(folder: Path, cache: Path, *arguments: str) -> Run:
    """One audit of the folder as a process of its own."""
    start = time.perf_counter()
    done = subprocess.run(
        [sys.executable, "-c", _PROGRAM, *_AUDIT, *arguments, str(folder)],
        env={**os.environ, "XDG_CACHE_HOME": str(cache)},
        capture_output=True,
        check=False,
    )
    seconds = time.perf_counter() - start
    if done.returncode not in (0, 1):
        raise SystemExit(done.stderr.decode())
    own, others, memory = map(float, done.stderr.split()[-3:])
    return Run(seconds, own, others, memory / 1024, done.stdout)


def clear(cache: Path) -> None:
    """Forget the results that are kept in a cache folder."""
    for path in cache.rglob(f"{FILE}*"):
        path.unlink()


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--files", type=int, default=10_000)
    parser.add_argument("--samples", type=Path)
    parser.add_argument("--processes", type=int, default=2)
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as name:
        folder, cache, few = (Path(name, part) for part in ("files", "cache", "few"))
        for made in (folder, cache, few):
            made.mkdir()
        size = fill(folder, options.files, options.samples)
        print(f"{options.files} files, {size / 1e6:.0f} MB")
        many = str(options.processes)
        # Grammars are compiled once per machine, which is no part of the work.
        fill(few, min(options.files, 300), options.samples)
        run(few, cache, "--no-cache", "--processes", "1")
        one = run(folder, cache, "--processes", "1")
        shutil.rmtree(few)
        clear(cache)
        print(f"cold, 1 process    {one.told()}", flush=True)
        cold = run(folder, cache, "--processes", many)
        print(f"cold, {many} processes  {cold.told()}", flush=True)
        warm = run(folder, cache, "--processes", many)
        print(f"warm               {warm.told()}")
        if not one.report == cold.report == warm.report:
            raise SystemExit("the reports differ")
        print(f"{many} processes / 1: {one.seconds / cold.seconds:.2f} times as fast")
        idle = one.own / max(cold.own + cold.others / options.processes, cold.own)
        print(f"  at most {idle:.2f} on an idle machine, by processor seconds")
        print(f"warm / cold:   {cold.seconds / warm.seconds:.1f} times as fast")


if __name__ == "__main__":
    main()
