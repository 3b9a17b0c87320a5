"""How many wrong numbers an atom's energy finds, and how often it proposes the true one.

    python tests/bench/stationarity.py [--cases N] [--seed S] [--elements C,O,...] [--sound]

Single numbers of the occupied s, p and d functions are changed one at a time in published sets, the
files bundled with PySCF.  Only `energy.stationary` looks at them, at the element at fault.  Printed
for each kind of change and family: the share found (a finding at the right shell) and behind the
stroke as a warning; then how often the number itself was named, and how often the proposed value
lies within 1 % of the true one.  With --sound, the findings of all energy rules in the sound sets
per 100 blocks instead.
"""

import argparse
import random
import time
from collections import Counter, defaultdict
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import NamedTuple

import pyscf

from overlapse.grammar.model import Block, Document, Shell
from overlapse.grammar.reading import read
from overlapse.rules.atomic.atoms import Atom, Number, atom_of
from overlapse.rules.atomic.energies import Ensemble, ensembles
from overlapse.rules.atomic.energy_judged import at_atom
from overlapse.rules.atomic.stationary import Steps
from overlapse.rules.case import Case
from overlapse.rules.registry import rules

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"
FAMILIES = {
    "Pople": "sto-3g pople-basis/3-21G pople-basis/4-31G pople-basis/6-31Gs pople-basis/6-311Gss",
    "cc": "cc-pvdz cc-pvtz cc-pvqz aug-cc-pvdz aug-cc-pvtz",
    "def2": "def2-svp def2-tzvp def2-tzvpp def2-svpd def2-qzvp",
    "pc": "pc-1 pc-2 pc-3 pcseg-1 pcseg-2",
}
Change = Callable[[float, random.Random], float | None]


def times(factor: float) -> Change:
    return lambda value, _: value * factor


def exchanged(value: float, dice: random.Random) -> float | None:
    """Two neighbouring digits among the first five exchanged."""
    word = f"{abs(value):.6g}"
    if "e" in word:
        return None
    pairs = [
        at
        for at in range(min(5, len(word) - 1))
        if word[at].isdigit() and word[at + 1].isdigit() and word[at] != word[at + 1]
    ]
    if not pairs:
        return None
    at = dice.choice(pairs)
    turned = float(word[:at] + word[at + 1] + word[at] + word[at + 2 :])
    return turned if value > 0 else -turned


KINDS: dict[str, tuple[bool, list[Change]]] = {
    "exponent x10 or /10": (True, [times(10.0), times(0.1)]),
    "exponent 30 %": (True, [times(1.3), times(0.7)]),
    "exponent 10 %": (True, [times(1.1), times(0.9)]),
    "exponent digits exchanged": (True, [exchanged]),
    "coefficient sign": (False, [times(-1.0)]),
    "coefficient 10 %": (False, [times(1.1), times(0.9)]),
    "coefficient 3 %": (False, [times(1.03), times(0.97)]),
    "coefficient 1 %": (False, [times(1.01), times(0.99)]),
}


class Outcome(NamedTuple):
    found: bool
    loud: bool
    named: bool
    near: bool
    told: str = ""


class Judge:
    """A published set whose atoms are computed once; one of them is exchanged for each change."""

    def __init__(self, name: str, elements: set[str]) -> None:
        self.document: Document = read(FOLDER / f"{name}.dat")
        self.case = Case(self.document, energies=True)
        (self.ensemble,) = ensembles(self.case)[:1]
        self.atoms = [a for a in self.ensemble.atoms if not elements or a.block.symbol in elements]
        self.limits = rules()["energy.stationary"].limits

    def planted(self, kind: str, dice: random.Random) -> Outcome | None:
        is_exponent, changes = KINDS[kind]
        atom = dice.choice(self.atoms)
        number = dice.choice([n for n in atom.numbers if (n.column is None) == is_exponent])
        true = atom.value(number)
        value = dice.choice(changes)(true, dice)
        if value is None:
            return None
        wrong = atom_of(changed(atom.block, number, float(f"{value:.7g}")))
        if wrong is None:
            return Outcome(False, False, False, False)
        others = [wrong if each is atom else each for each in self.ensemble.atoms]
        ensemble = Ensemble(self.ensemble.members, others)
        known = self.ensemble.ground_steps
        ensemble.__dict__["ground_steps"] = {
            id(each.block): known[id(each.block)] for each in others if id(each.block) in known
        } | {id(wrong.block): own for own in [steps(wrong)] if own is not None}
        return self.judged(ensemble, wrong, number, true)

    def judged(self, ensemble: Ensemble, wrong: Atom, number: Number, true: float) -> Outcome:
        found = list(at_atom(self.case, ensemble, wrong, ensemble.steps(wrong), **self.limits))
        name = wrong.block.names[number.shell]
        here = [f for f in found if (f.shell or name).partition("/")[0] == name]
        named = [f for f in here if f.measured == wrong.value(number)]
        what = "exponent" if number.column is None else f"coefficient {number.column + 1}"
        own = ensemble.steps(wrong)
        others = len(ensemble.others(wrong)) if own is not None else 0
        return Outcome(
            bool(here),
            any(f.severity == "warning" for f in here),
            bool(named),
            any(abs(float(f.expected or 0.0) / true - 1.0) < 0.01 for f in named),
            f"{wrong.block.symbol} {name} {what} of row {number.row + 1}, {true:g} made "
            f"{wrong.value(number):g}; {others} neighbours; {departure(ensemble, own):.0f}",
        )


def steps(atom: Atom) -> Steps | None:
    from overlapse.rules.atomic.stationary import steps_of

    return steps_of(atom)


def departure(ensemble: Ensemble, own: Steps | None) -> float:
    """Root of chi squared of an atom's gradient."""
    if own is None:
        return float("nan")
    return float((ensemble.usual(own).chi(own.gradient) ** 2).sum()) ** 0.5


def changed(block: Block, number: Number, value: float) -> Block:
    old = block.shells[number.shell]
    exponents, coefficients = old.exponents.copy(), old.coefficients.copy()
    if number.column is None:
        exponents[number.row] = value
    else:
        coefficients[number.row, number.column] = value
    shells = list(block.shells)
    shells[number.shell] = Shell(old.angular, exponents, coefficients, old.line)
    return replace(block, shells=tuple(shells))


def print_table(outcomes: dict[tuple[str, str], list[Outcome]]) -> None:
    columns = [*FAMILIES, "all"]
    for title, of in (
        ("found / as warning", lambda o: (o.found, o.loud)),
        ("number named / proposed within 1 % of the true one", lambda o: (o.named, o.near)),
    ):
        print(f"\n{title}, per cent\n\n| changed | " + " | ".join(columns) + " |")
        print("|---" * (len(columns) + 1) + "|")
        for kind in KINDS:
            cells = []
            for column in columns:
                some = [
                    o
                    for (k, family), found in outcomes.items()
                    if k == kind and column in (family, "all")
                    for o in found
                ]
                shares = [
                    100 * sum(part) / max(1, len(some)) for part in zip(*map(of, some), strict=True)
                ]
                cells.append(" / ".join(f"{s:.0f}" for s in shares) + f" ({len(some)})")
            print(f"| {kind} | " + " | ".join(cells) + " |")
    every = [o for found in outcomes.values() for o in found if o.found]
    near = sum(o.near for o in every)
    print(f"\nof {len(every)} found, proposed within 1 %: {100 * near / max(1, len(every)):.0f} %")


def print_sound(names: list[str]) -> None:
    counts: Counter[tuple[str, str]] = Counter()
    blocks = 0
    for name in names:
        start = time.perf_counter()
        case = Case(read(FOLDER / f"{name}.dat"), energies=True)
        found = [f for n, r in rules().items() if n.startswith("energy.") for f in case.judge(r)]
        atoms = sum(len(ensemble.atoms) for ensemble in ensembles(case))
        blocks += atoms
        print(f"{name}: {atoms} atoms, {time.perf_counter() - start:.1f} s", flush=True)
        for f in found:
            counts[f.severity, f.rule] += 1
            print(f"    {f.severity} {f.rule} {f.element} {f.shell}: {f.message} {f.witnesses}")
    print(f"\n{blocks} sound blocks; per 100 of them:")
    for (severity, name), count in sorted(counts.items()):
        print(f"- {severity} {name}: {100 * count / blocks:.2f}")


def main() -> None:
    parser = argparse.ArgumentParser(description="Wrong numbers found by the atom's energy.")
    parser.add_argument("--cases", type=int, default=10, help="changes of each kind in each set")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--elements", default="C,O,Si,Fe,Zn,Kr", help="empty for all")
    parser.add_argument("--sets", default="", help="only these, separated by commas")
    parser.add_argument("--kinds", default="", help="only kinds that contain one of these words")
    parser.add_argument("--missed", action="store_true", help="list the changes not found")
    parser.add_argument("--sound", action="store_true")
    given = parser.parse_args()
    wanted = {name for name in given.sets.split(",") if name}
    sets = {
        f: [n for n in names.split() if not wanted or n in wanted] for f, names in FAMILIES.items()
    }
    if given.sound:
        print_sound(
            [name for names in sets.values() for name in names]
            + sorted(wanted - {n for ns in sets.values() for n in ns})
        )
        return
    dice = random.Random(given.seed)
    kinds = [k for k in KINDS if any(word in k for word in given.kinds.split(","))]
    print(f"seed {given.seed}, {given.cases} changes of each kind in each set")
    outcomes: defaultdict[tuple[str, str], list[Outcome]] = defaultdict(list)
    start = time.perf_counter()
    for family, names in sets.items():
        for name in names:
            judge = Judge(name, {e for e in given.elements.split(",") if e})
            for kind in kinds:
                for _ in range(given.cases):
                    outcome = judge.planted(kind, dice)
                    if outcome is not None:
                        outcomes[kind, family].append(outcome)
                        if given.missed and not outcome.found:
                            print(f"  missed, {kind}: {outcome.told}")
            print(f"{name}: {time.perf_counter() - start:.0f} s", flush=True)
    print_table(outcomes)


if __name__ == "__main__":
    main()
