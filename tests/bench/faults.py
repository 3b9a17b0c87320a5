"""How many slips of published sets are found, by whom, and how often sound numbers are suspected.

    python tests/bench/faults.py [--cases N] [--seed S] [--kinds WORD,...] [--energies] ...

Slips are planted one at a time (`tests/planting.py`) in published sets, the files bundled with
PySCF cut down to H-Kr.  A slip counts as found when a finding that the sound set does not have
names its element, and for a single number also its shell.  Printed per kind of slip: the share
found, and behind the stroke the share found as warning or error, by family and together; which
rules found it; how often the proposed number is right; and for the sound sets the findings per 100
blocks, for those that are planted in and for others that no limit was chosen on.
"""

import argparse
import inspect
import time
from collections import Counter, defaultdict
from collections.abc import Iterable
from concurrent.futures import ProcessPoolExecutor
from functools import cache
from typing import NamedTuple

from planting import SLIPS, Published, bundled, new_findings, planted

from overlapse.lint.engine import FileAudit, judge
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rules

FAMILIES = {
    "Pople": "3-21G 4-31G 6-31G 6-31Gs 6-31+Gs 6-31++Gss 6-311G 6-311++Gss",
    "cc": "cc-pvdz cc-pvtz cc-pvqz aug-cc-pvdz aug-cc-pvtz",
    "def2": "def2-svp def2-tzvp def2-tzvpp def2-svpd def2-tzvpd def2-qzvp",
    "pc": "pc-1 pc-2 pc-3 pcseg-1 pcseg-2 aug-pc-1",
}
# Sets of sound numbers that no limit was chosen on.
OTHERS = (
    "6-31++G 6-311Gss 3-21Gs cc-pv5z aug-cc-pvqz cc-pvtz-dk cc-pvdpdz aug-cc-pwcvtz def2-qzvpp "
    "def2-tzvppd ma-def2-tzvp pcseg-3 aug-pcseg-2 aug-pc-3 pc-4 tzv dzp tzp qzp roos-dz ano"
)
GROUPS = {
    "gross": (
        "exponent x10 or /10", "coefficient sign", "row lost", "shell lost", "shell twice",
        "elements exchanged", "neighbour's block copied", "columns exchanged",
    ),
    "exponent 10 %, 30 %, digits": (
        "exponent 30 %", "exponent 10 %", "exponent digits exchanged",
    ),
    "all numbers 10 % to 30 %": ("exponent 30 %", "exponent 10 %", "coefficient 10 %"),
    "coefficient 3 %": ("coefficient 3 %",),
    "coefficient 1 %": ("coefficient 1 %",),
}  # fmt: skip


class Outcome(NamedTuple):
    """One planted slip: kind, family, rules that found it by severity, and the proposal."""

    kind: str
    family: str
    rules: frozenset[str]
    loud: frozenset[str]
    proposed: bool | None
    told: str


class Job(NamedTuple):
    kind: str
    family: str
    name: str
    seed: str
    energies: bool


def published(name: str) -> Published:
    is_pople = "-31" in name or name.startswith("3-21")
    return bundled(f"pople-basis/{name}" if is_pople else name)


@cache
def clean(name: str, energies: bool) -> FileAudit:
    return published(name).judged(**options(energies))


def options(energies: bool) -> dict[str, bool]:
    """Asks for energies where the engine has them; says so where it does not."""
    if not energies:
        return {}
    if "energies" not in inspect.signature(judge).parameters:
        raise SystemExit("this engine judges without energies")
    return {"energies": True}


def run(job: Job) -> Outcome | None:
    members = published(job.name)
    slip = planted(members, job.kind, job.seed)
    if slip is None:
        return None
    after = members.judged(slip.text, **options(job.energies))
    found = new_findings(clean(job.name, job.energies), after, slip)
    proposed = None
    if slip.true is not None and found:
        values = [f.expected for f in found if isinstance(f.expected, float)]
        proposed = any(abs(v - slip.true) <= 0.01 * abs(slip.true) for v in values)
    return Outcome(
        job.kind,
        job.family,
        frozenset(f.rule for f in found),
        frozenset(f.rule for f in found if f.severity != "note"),
        proposed,
        f"{job.name}: {slip.told}",
    )


def jobs(kinds: Iterable[str], cases: int, seed: str, energies: bool) -> list[Job]:
    """``cases`` slips of each kind, the families and their sets in turn."""
    sets = {family: names.split() for family, names in FAMILIES.items()}
    found = []
    for kind in kinds:
        for case in range(cases):
            family = list(sets)[case % len(sets)]
            names = sets[family]
            name = names[case // len(sets) % len(names)]
            found.append(Job(kind, family, name, f"{seed}-{case}", energies))
    return found


# ---- tables


def share(outcomes: list[Outcome]) -> str:
    if not outcomes:
        return "-"
    count = len(outcomes)
    found = sum(bool(o.rules) for o in outcomes)
    loud = sum(bool(o.loud) for o in outcomes)
    return f"{100 * found / count:.0f} / {100 * loud / count:.0f}"


def print_rates(outcomes: list[Outcome]) -> None:
    print("| planted | cases | all | " + " | ".join(FAMILIES) + " |")
    print("|---" * (3 + len(FAMILIES)) + "|")
    by_kind = {kind: [o for o in outcomes if o.kind == kind] for kind in SLIPS}
    groups = {
        f"**{name}**": [o for kind in kinds for o in by_kind[kind]]
        for name, kinds in GROUPS.items()
    }
    for name, of_kind in {**by_kind, **groups}.items():
        if of_kind:
            cells = [share([o for o in of_kind if o.family == family]) for family in FAMILIES]
            print(f"| {name} | {len(of_kind)} | {share(of_kind)} | " + " | ".join(cells) + " |")


def print_witnesses(outcomes: list[Outcome]) -> None:
    print("\nShare of the slips that each rule found (several may find one):")
    for kind in SLIPS:
        of_kind = [o for o in outcomes if o.kind == kind]
        counts = Counter(rule for o in of_kind for rule in o.rules)
        parts = [f"{rule} {100 * n / len(of_kind):.0f}" for rule, n in counts.most_common()]
        if of_kind:
            print(f"- {kind}: {', '.join(parts) or 'none'}")


def print_proposals(outcomes: list[Outcome]) -> None:
    told = [o for o in outcomes if o.proposed is not None]
    if told:
        right = sum(bool(o.proposed) for o in told)
        print(
            f"\nSingle wrong numbers found: {len(told)}; the number proposed lies within 1 % of "
            f"the true one in {100 * right / len(told):.0f} %"
        )


def is_heuristic(finding: Finding) -> bool:
    """Whether a finding comes from reasoning about numbers, not from form or labels."""
    what = rules()[finding.rule].explanation.what.lower()
    return what.startswith("suspect") or finding.rule.startswith(("primitive", "contraction"))


def print_clean(title: str, names: Iterable[str], energies: bool, listed: bool) -> None:
    notes: Counter[str] = Counter()
    loud: Counter[str] = Counter()
    blocks = 0
    for name in names:
        blocks += len(published(name).blocks)
        for finding in clean(name, energies).findings:
            # The one note that a whole set is printed unnormalised suspects no number.
            if is_heuristic(finding) and "unnormalised" not in finding.message:
                (notes if finding.severity == "note" else loud)[finding.rule] += 1
                if listed:
                    print(f"  {name}: {finding.element} {finding.shell} {finding.severity} "
                          f"{finding.rule}: {finding.message}")  # fmt: skip
    print(f"\n{title}: {blocks} sound blocks; per 100 of them")
    for kind, counts in (("notes", notes), ("warnings and errors", loud)):
        parts = [f"{rule} {100 * n / blocks:.2f}" for rule, n in counts.most_common()]
        print(f"- {kind}: {100 * counts.total() / blocks:.2f} ({', '.join(parts) or 'none'})")


def main() -> None:
    parser = argparse.ArgumentParser(description="Rates at which planted slips are found.")
    parser.add_argument("--cases", type=int, default=50, help="slips of each kind")
    parser.add_argument("--seed", default="tarn")
    parser.add_argument("--kinds", default="", help="only kinds that contain one of these words")
    parser.add_argument("--energies", action="store_true", help="judge with atomic energies")
    parser.add_argument("--processes", type=int, default=1)
    parser.add_argument("--missed", action="store_true", help="list the slips not found")
    parser.add_argument("--suspected", action="store_true", help="list findings in sound sets")
    given = parser.parse_args()
    words = [word for word in given.kinds.split(",") if word]
    kinds = [kind for kind in SLIPS if not words or any(word in kind for word in words)]
    print(f"seed {given.seed!r}, {given.cases} cases of each kind, energies: {given.energies}\n")
    start = time.perf_counter()
    with ProcessPoolExecutor(given.processes) as pool:
        todo = jobs(kinds, given.cases, given.seed, given.energies)
        outcomes = [o for o in pool.map(run, todo, chunksize=10) if o is not None]
    print_rates(outcomes)
    print_witnesses(outcomes)
    print_proposals(outcomes)
    if given.missed:
        missed: defaultdict[str, list[str]] = defaultdict(list)
        for outcome in outcomes:
            if not outcome.rules:
                missed[outcome.kind].append(outcome.told)
        for kind, told in missed.items():
            print(f"\nmissed, {kind}:", *told, sep="\n  ")
    planted_in = [name for names in FAMILIES.values() for name in names.split()]
    print_clean("Sets planted in", planted_in, given.energies, given.suspected)
    print_clean("Other sets", OTHERS.split(), given.energies, given.suspected)
    print(f"\n{time.perf_counter() - start:.0f} s")


if __name__ == "__main__":
    main()
