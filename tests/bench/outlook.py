"""How well outlooks foretell what a self-consistent field without removal meets.

    python tests/bench/outlook.py [--set NAME] [--runs FILE] [--out FILE]

Every system of the sets calibration, judging, second and named is run through PySCF without and
with removal (`hosts`, about ten seconds each on average) and through `foresee`.  Results are kept
in FILE (JSON), so that another measure can be tried on the same calculations.  Printed: a table,
and counts of

- strict agreement: "fails" is said just where the plain host failed; "strained" counts as not;
- lenient agreement: "strained" is right whatever happens, since it says that noise decides;
- agreement in three classes: a system fails if three of the four hosts do, is strained if one or
  two do or if a field took half as many cycles again as with removal (and two more), else is safe;
- failures called safe: any host failed.

The same is counted for the smallest eigenvalue alone, with the limits used without a field, and for
the one limit that is best on the calibration set.
"""

import argparse
import json
import sys
from collections import Counter
from collections.abc import Callable
from dataclasses import asdict
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import outlook_second
import outlook_sets
from builders import System, placed
from hosts import Run, Truth, truth_of

from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.outlook import FAILS, SMALL, STRAINED, TINY, Outlook, foresee
from overlapse.rules.physics.placed import lay_out

BEST = 4e-9  # of the smallest eigenvalue: fewest wrong calls of failure on the calibration set
SETS = {
    "calibration": outlook_sets.calibration,
    "judging": outlook_sets.judging,
    "second": outlook_second.second,
    "named": outlook_sets.named,
}


class Row(NamedTuple):
    """One system: what was foretold, what its smallest eigenvalue alone says, what happened."""

    name: str
    functions: int
    smallest: float
    outlook: Outlook
    alone: str
    truth: Truth


def foretold(system: System) -> tuple[int, float, Outlook]:
    """Functions, smallest eigenvalue, and outlook, from our own integrals."""
    atoms, nuclei = placed(system)
    s, t, functions = overlap(atoms), kinetic(atoms), lay_out(atoms)
    empty = [k for k, z in enumerate(nuclei) if not z]
    found = foresee(atoms, s, t, functions, empty=empty, charge=system.charge, unpaired=system.spin)
    return len(s), float(np.linalg.eigvalsh(s)[0]), found


def kept(path: Path | None) -> dict[str, Any]:
    return json.loads(path.read_text()) if path is not None and path.exists() else {}


def truth(system: System, known: dict[str, Any], path: Path | None) -> Truth:
    """What the hosts say, from the file of earlier runs where it is there."""
    if system.name not in known:
        known[system.name] = asdict(truth_of(system))
        if path is not None:
            path.write_text(json.dumps(known))
    found = known[system.name]
    runs = {name: Run(**run) for name, run in found["runs"].items()}
    reference, again = Run(**found["removed"]), Run(**found["removed_turned"])
    return Truth(reference, again, found["orbitals"], found["explained"], runs)


def happened(truth: Truth) -> str:
    """The class of what happened, by the vote of the hosts."""
    failures = sum(truth.failures.values())
    if failures >= 3:
        return "fails"
    return "strained" if failures or truth.laboured else "safe"


def by_eigenvalue(smallest: float) -> str:
    return "fails" if smallest < TINY else "strained" if smallest < SMALL else "safe"


def counts(rows: list[Row], say: Callable[[Row], str]) -> dict[str, int]:
    """The counts named in the module's docstring."""
    return {
        "strict": sum((say(r) == "fails") == r.truth.failed for r in rows),
        "lenient": sum(say(r) == "strained" or (say(r) == "fails") == r.truth.failed for r in rows),
        "three classes": sum(say(r) == happened(r.truth) for r in rows),
        "failures called safe": sum(
            say(r) == "safe" and any(r.truth.failures.values()) for r in rows
        ),
        "called strained": sum(say(r) == "strained" for r in rows),
    }


def line(row: Row) -> str:
    """A row of the table, markdown."""
    votes = "".join("F" if failed else "." for failed in row.truth.failures.values())
    plain = row.truth.runs["general"]
    shift = plain.energy - row.truth.removed.energy
    cells = (
        row.name,
        str(row.functions),
        f"{row.smallest:.1e}",
        f"{row.outlook.measure:.1e}",
        row.outlook.level,
        happened(row.truth),
        votes,
        f"{row.truth.removed.cycles}",
        f"{plain.cycles}" if plain.converged else "-",
        f"{shift:+.1e}",
    )
    return "| " + " | ".join(cells) + " |"


HEAD = (
    "| system | functions | smallest | measure | foretold | happened | hosts | cycles with removal "
    "| without | energy less that with removal |\n" + "|---" * 10 + "|"
)


def report(title: str, rows: list[Row]) -> str:
    """The table of a set and its counts, markdown."""
    sound = [row for row in rows if row.truth.settled]
    text = [f"### {title}: {len(sound)} systems", "", HEAD, *map(line, sound), ""]
    for row in rows:
        if row not in sound:
            pair = (row.truth.removed, row.truth.removed_turned)
            ends = " and ".join(f"{run.energy:.6f}" if run.converged else "no end" for run in pair)
            text.append(
                f"Left out, the field with removal has no single solution ({ends}): {row.name}.  "
            )
    text += ["| judged by | " + " | ".join(counts(sound, lambda r: r.outlook.level)) + " |"]
    text += ["|---" * 6 + "|"]
    for name, say in (
        ("measure", lambda r: r.outlook.level),
        (f"smallest eigenvalue, {TINY:g} and {SMALL:g}", lambda r: r.alone),
        (f"smallest eigenvalue, {BEST:g}", lambda r: "fails" if r.smallest < BEST else "safe"),
    ):
        found = counts(sound, say)
        cells = [f"{v} ({100 * v / len(sound):.0f} %)" for v in found.values()]
        text.append(f"| {name} | " + " | ".join(cells) + " |")
    pairs = Counter((row.outlook.level, happened(row.truth)) for row in sound)
    text += [
        "",
        "Foretold and happened: "
        + ", ".join(f"{said} and {met} {count}" for (said, met), count in sorted(pairs.items()))
        + ".",
        "",
    ]
    wrong = [row for row in sound if (row.outlook.level == "fails") != row.truth.failed]
    band = [row.name for row in wrong if row.outlook.level == "strained"]
    if band:
        text.append(f"Foretold strained, and the plain host fails: {'; '.join(band)}.  ")
    text += [
        f"Against the plain host: {row.name}, foretold {row.outlook.level}: {row.outlook.reason}.  "
        for row in wrong
        if row.outlook.level != "strained"
    ]
    return "\n".join(text)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--set", choices=SETS, action="append")
    parser.add_argument("--runs", type=Path)
    parser.add_argument("--out", type=Path)
    arguments = parser.parse_args()
    known, texts = kept(arguments.runs), []
    texts.append(f"Limits of the measure: strained above {STRAINED:.1e}, fails above {FAILS:.1e}.")
    for name in arguments.set or SETS:
        rows = []
        for system in SETS[name]():
            print(system.name, file=sys.stderr)
            met = truth(system, known, arguments.runs)
            functions, smallest, found = foretold(system)
            rows.append(Row(system.name, functions, smallest, found, by_eigenvalue(smallest), met))
        texts.append(report(name, rows))
    text = "\n\n".join(texts) + "\n"
    if arguments.out is not None:
        arguments.out.write_text(text)
    print(text)


if __name__ == "__main__":
    main()
