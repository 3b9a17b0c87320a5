"""Kill the program at random moments while it writes: no file may be lost or half-written.

    python tests/bench/kills.py [--kills N] [--seed S]

A third of the kills (SIGKILL) meet `overlapse mend --write` as a whole, a third its writing alone,
over and over, a third the keeping of results.  After each kill a mended file must hold its old or
its new content, byte for byte, and the database of results must be sound and give what was put in
it, or nothing.  Printed is how many kills met a write in progress.  Needs a system with fork.
"""

import argparse
import os
import random
import signal
import sqlite3
import sys
import tempfile
import time
from collections.abc import Callable
from contextlib import redirect_stdout
from io import StringIO
from pathlib import Path
from typing import NamedTuple

sys.path.insert(0, str(Path(__file__).parent))

from speed import invented

from overlapse.grammar.layouts import layouts
from overlapse.lint.atomic import write_bytes
from overlapse.lint.cache import FILE, Cache, plain
from overlapse.lint.commands.mend import mend
from overlapse.lint.engine import FileAudit, audit_text
from overlapse.lint.mending import mend as mended
from overlapse.lint.settings import Settings


class Toll(NamedTuple):
    """kills: how many there were.  caught: how many met a write in progress.  harm: what broke."""

    kills: int
    caught: int
    harm: list[str]


def killed(action: Callable[[], object], after: float) -> None:
    """Run an action in a process of its own and kill that after some seconds, if it still runs."""
    process = os.fork()
    if process == 0:
        try:
            with redirect_stdout(StringIO()):
                action()
        finally:
            os._exit(0)
    time.sleep(after)
    os.kill(process, signal.SIGKILL)
    os.waitpid(process, 0)


def _contents() -> tuple[bytes, bytes]:
    """A text with slips that can be mended safely, and the same mended."""
    text = layouts()["stars"].write(invented(3)).text
    lines = text.split("\n")
    at = next(k for k, line in enumerate(lines) if line.startswith(" ") and "0." in line)
    lines[at] = lines[at].replace("0.", "O.", 1)
    old = "\r\n".join(lines[:9]).encode() + b"\n" + "\n".join(lines[9:]).encode()
    new = mended(old, "own.basis", Settings()).data
    assert new != old
    return old, new


def mending(kills: int, dice: random.Random, folder: Path, whole: bool) -> Toll:
    """Kills while a file is mended; ``whole``: the command with all it does, else writing alone."""
    old, new = _contents()
    path = folder / "own.basis"

    def once() -> None:
        mend.main(["--write", str(path)], standalone_mode=False)

    def over_and_over() -> None:
        while True:
            write_bytes(path, new)
            write_bytes(path, old)

    path.write_bytes(old)
    start = time.perf_counter()
    try:
        with redirect_stdout(StringIO()):
            once()
    except SystemExit:
        pass
    lasts = (time.perf_counter() - start) * 1.5
    assert path.read_bytes() == new
    caught, harm = 0, []
    for _ in range(kills):
        path.write_bytes(old)
        os.chmod(path, 0o640)
        killed(once if whole else over_and_over, dice.uniform(0.0, lasts if whole else 0.01))
        if not path.exists() or path.read_bytes() not in (old, new):
            harm.append("a mended file is neither old nor new")
        elif path.stat().st_mode & 0o777 != 0o640:
            harm.append("a mended file has another mode")
        others = [other for other in folder.iterdir() if other != path]
        caught += bool(others)
        for other in others:
            other.unlink()
    return Toll(kills, caught, harm)


def keeping(kills: int, dice: random.Random, folder: Path) -> Toll:
    """Kills while results are kept."""
    audit = audit_text(_contents()[0].decode(), "own.basis", settings=Settings())
    wanted = plain(audit)
    caught, harm = 0, []
    for kill in range(kills):

        def put(start: int = kill * 1_000_000) -> None:
            cache = Cache(folder)
            while True:
                cache.put((f"key {start + more}", audit) for more in range(50))
                start += 50

        killed(put, dice.uniform(0.0, 0.02))
        caught += any(folder.glob(f"{FILE}-journal"))
        harm += list(_harm_in(folder, wanted, kill))
        if kill % 200 == 199:
            (folder / FILE).unlink(missing_ok=True)
    return Toll(kills, caught, harm)


def _harm_in(folder: Path, wanted: object, kill: int) -> list[str]:
    cache = Cache(folder)
    found: FileAudit | None = cache.get(f"key {kill * 1_000_000}", "own.basis", Settings())
    cache.close()
    if found is not None and plain(found) != wanted:
        return ["a kept result is not what was put there"]
    if not (folder / FILE).exists():
        return []
    connection = sqlite3.connect(folder / FILE)
    (verdict,) = connection.execute("PRAGMA quick_check").fetchone()
    counts = connection.execute("SELECT COUNT(*) % 50 FROM results").fetchone()
    connection.close()
    if verdict != "ok":
        return [f"the database of results is damaged: {verdict}"]
    return [] if counts == (0,) else ["half of a batch of results was kept"]


def trial(kills: int, seed: int) -> dict[str, Toll]:
    """All kinds of kills, a third each."""
    dice = random.Random(seed)
    each = kills // 3
    with tempfile.TemporaryDirectory() as name:
        places = [Path(name, part) for part in ("whole", "writing", "results")]
        for place in places:
            place.mkdir()
        return {
            "mend --write": mending(each, dice, places[0], True),
            "writing alone": mending(each, dice, places[1], False),
            "keeping results": keeping(kills - 2 * each, dice, places[2]),
        }


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--kills", type=int, default=10_000)
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    harmed = 0
    for name, toll in trial(options.kills, options.seed).items():
        print(f"{name:<16} {toll.kills} kills, {toll.caught} met a write, {len(toll.harm)} harmed")
        for harm in sorted(set(toll.harm)):
            print(f"  {harm}")
        harmed += len(toll.harm)
    sys.exit(bool(harmed))


if __name__ == "__main__":
    main()
