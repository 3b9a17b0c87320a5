"""How well outlooks foretell what a self-consistent field without removal meets.

    python tests/bench/outlook.py [--set NAME] [--runs FILE] [--out FILE]

Every system of the sets calibration and judging is run through PySCF without and with removal
(`hosts`, about ten seconds each on average) and through `foresee`.  Runs are kept in FILE (JSON),
so that another measure can be tried on the same calculations.

What happened is decided by the hosts alone.  A system is unsettled, and is not judged, if the two
runs with removal do not converge to one energy: then the field has several solutions whatever is
removed.  Of the others each

- fails if at least three of the four hosts without removal fail;
- is strained if one or two do, or if a host took half as many cycles again as with removal, and
  two more;
- is safe otherwise.

Printed: a table, and counts of

- strict agreement: the outlook is what happened;
- agreement: where two or three of four hosts fail they disagree among themselves on whether the
  field fails or is strained, and either outlook is right;
- failing or not: whether "fails" was foretold where, and only where, the plainest host (the
  generalised eigenvalue problem as it stands) fails, which is what one program alone would show;
- failures called safe: any host failed.

The same is counted for the field of the electron gas, which is what large molecules get, and for
the smallest eigenvalue alone with the limits used without a field.
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
from builders import System, placed
from hosts import Run, Truth, truth_of
from outlook_calibration import calibration
from outlook_judging import judging

from overlapse.rules.physics.integrals import kinetic, overlap
from overlapse.rules.physics.outlook import FAILS, SMALL, STRAINED, TINY, Level, Outlook, foresee
from overlapse.rules.physics.placed import lay_out

SETS = {"calibration": calibration, "judging": judging}


class Row(NamedTuple):
    """One system: what was foretold, also by the electron gas, and what the hosts met."""

    name: str
    functions: int
    smallest: float
    outlook: Outlook
    gas: Outlook
    truth: Truth

    @property
    def happened(self) -> Level:
        """The class of what happened, by the vote of the hosts."""
        failures = sum(self.truth.failures.values())
        if failures >= 3:
            return "fails"
        return "strained" if failures or self.truth.laboured else "safe"

    @property
    def right(self) -> tuple[Level, ...]:
        """The outlooks that agree with it."""
        if sum(self.truth.failures.values()) in (2, 3):
            return ("strained", "fails")
        return (self.happened,)


def foretold(system: System) -> tuple[int, float, Outlook, Outlook]:
    """Functions, smallest eigenvalue, and outlooks, from our own integrals."""
    atoms, nuclei = placed(system)
    s, t, functions = overlap(atoms), kinetic(atoms), lay_out(atoms)
    empty = [k for k, z in enumerate(nuclei) if not z]
    both = [
        foresee(
            atoms,
            s,
            t,
            functions,
            empty=empty,
            charge=system.charge,
            unpaired=system.spin,
            exchange=exchange,
        )
        for exchange in (True, False)
    ]
    return len(s), float(np.linalg.eigvalsh(s)[0]), both[0], both[1]


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


def by_eigenvalue(smallest: float) -> Level:
    return "fails" if smallest < TINY else "strained" if smallest < SMALL else "safe"


def counts(rows: list[Row], say: Callable[[Row], Level]) -> dict[str, int]:
    """The counts named in the module's docstring."""
    return {
        "strict agreement": sum(say(r) == r.happened for r in rows),
        "agreement": sum(say(r) in r.right for r in rows),
        "failing or not": sum((say(r) == "fails") == r.truth.failures["general"] for r in rows),
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
    runs = row.truth.runs.values()
    counted = " ".join(str(run.cycles) if run.converged else "-" for run in runs)
    cells = (
        row.name,
        str(row.functions),
        f"{row.smallest:.1e}",
        f"{row.outlook.measure:.1e}",
        row.outlook.level,
        row.happened,
        votes,
        f"{row.truth.removed.cycles}",
        counted,
        f"{shift:+.1e}",
    )
    return "| " + " | ".join(cells) + " |"


HEAD = (
    "| system | functions | smallest | noise | foretold | happened | hosts | cycles with removal "
    "| without | energy less that with removal |\n" + "|---" * 10 + "|"
)


def report(title: str, rows: list[Row]) -> str:
    """The table of a set and its counts, markdown."""
    sound = [row for row in rows if row.truth.settled]
    loose = [row for row in rows if not row.truth.settled]
    text = [
        f"### {title}: {len(rows)} systems, {len(loose)} of them unsettled",
        "",
        HEAD,
        *map(line, sound),
        "",
    ]
    for row in loose:
        pair = (row.truth.removed, row.truth.removed_turned)
        ends = " and ".join(f"{run.energy:.6f}" if run.converged else "no end" for run in pair)
        votes = sum(row.truth.failures.values())
        text.append(
            f"Unsettled (with removal: {ends}): {row.name}, foretold {row.outlook.level}, without "
            f"removal {votes} of 4 hosts away from the first of these.  "
        )
    methods: tuple[tuple[str, Callable[[Row], Level]], ...] = (
        ("outlook", lambda r: r.outlook.level),
        ("outlook with the field of the electron gas", lambda r: r.gas.level),
        (
            f"smallest eigenvalue, {TINY:g} and {SMALL:g}",
            lambda r: by_eigenvalue(r.smallest),
        ),
    )
    tallies = [(name, counts(sound, say)) for name, say in methods]
    text += ["", "| judged by | " + " | ".join(tallies[0][1]) + " |", "|---" * 6 + "|"]
    for name, found in tallies:
        cells = [f"{v} ({100 * v / len(sound):.1f} %)" for v in found.values()]
        text.append(f"| {name} | " + " | ".join(cells) + " |")
    pairs = Counter((row.outlook.level, row.happened) for row in sound)
    told = ", ".join(f"{said} and {met} {count}" for (said, met), count in sorted(pairs.items()))
    text += ["", f"Foretold and happened: {told}.", ""]
    text += [
        f"{'Hosts divided' if row.outlook.level in row.right else 'Disagreement'}: {row.name}, "
        f"foretold {row.outlook.level}, {row.happened}: {row.outlook.reason}.  "
        for row in sound
        if row.outlook.level != row.happened
    ]
    return "\n".join(text)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--set", choices=SETS, action="append")
    parser.add_argument("--runs", type=Path)
    parser.add_argument("--out", type=Path)
    arguments = parser.parse_args()
    known, texts = kept(arguments.runs), []
    texts.append(
        f"Limits of noise: strained above {STRAINED:.1e} hartree in the energy, fails above "
        f"{FAILS:.1e} in the gradient."
    )
    for name in arguments.set or SETS:
        rows = []
        for system in SETS[name]():
            print(system.name, file=sys.stderr)
            met = truth(system, known, arguments.runs)
            rows.append(Row(system.name, *foretold(system), met))
        texts.append(report(name, rows))
    text = "\n\n".join(texts) + "\n"
    if arguments.out is not None:
        arguments.out.write_text(text)
    print(text)


if __name__ == "__main__":
    main()
