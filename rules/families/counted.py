"""What a label promises for an element, as counts of functions for each angular momentum.

For families whose sets are told apart by counts: the correlation-consistent sets follow formulas
(`consistent.json` holds their terms), the others have tables, one file for each kind of family.
"""

import json
import re
from functools import cache
from importlib.resources import files
from typing import Any, NamedTuple

from overlapse.grammar.designation import Designation
from overlapse.grammar.elements import number_of

Counts = dict[int, int]
_LETTERS = "spdfghiklmnoq"
_ENTRY = re.compile(r"(\d+)([a-z])")

# Which file holds the tables of a family.
_FILES = {
    "def2": "karlsruhe", "def": "karlsruhe", "dhf": "karlsruhe", "x2c": "karlsruhe",
    "pc-n": "jensen", "pcseg-n": "jensen", "pcSseg-n": "jensen",
    "ANO": "atomic", "ANO-RCC": "atomic", "nZaPa-NR": "atomic", "SARC": "atomic",
    "Ahlrichs": "older", "Dunning": "older", "DZP series": "older", "DFT orbital": "older",
    "Huzinaga": "older", "SP": "older", "LANL": "effective", "Stuttgart": "effective",
    "SBKJC": "effective", "CRENB": "effective", "BFD": "effective", "dyall": "dyall",
    "cc-pVXZ": "consistent",
}  # fmt: skip
# Core potentials that correlation-consistent sets were made for besides their own.
_OTHER_POTENTIALS = frozenset({"ccECP", "SDB"})
# Families whose sets need a core potential for their heavy elements, or for all.
WITH_POTENTIALS = frozenset({"LANL", "Stuttgart", "SBKJC", "CRENB", "BFD"})


class Expected(NamedTuple):
    """What an element of a set holds.

    contracted: contracted functions per l.  primitives: distinct exponents per l, None where they
    are not on record.  diffuse: the part of ``contracted`` that a prefix such as aug- adds.
    others: further revisions in circulation, as pairs of the first two.  why: a remark on an
    irregular element.
    """

    contracted: Counts
    primitives: Counts | None
    diffuse: Counts
    others: tuple[tuple[Counts, Counts | None], ...] = ()
    why: str = ""


@cache
def table(name: str) -> Any:
    """A data file of this folder, without its ending."""
    return json.loads(files("overlapse.rules.families").joinpath(f"{name}.json").read_text("utf-8"))


@cache
def within(ranges: str, z: int) -> bool:
    """Whether an element lies in a list of ranges such as "H-Ne,P-Cl,I"."""
    for part in ranges.split(","):
        first, _, last = part.partition("-")
        low, high = number_of(first), number_of(last or first)
        assert low is not None and high is not None, part
        if low <= z <= high:
            return True
    return False


def row(rows: dict[str, Any], z: int) -> Any:
    """The value of the first range that an element lies in, or None."""
    return next((value for ranges, value in rows.items() if within(ranges, z)), None)


@cache
def expected(label: Designation, z: int) -> Expected | None:
    """What a set holds for an element, or None where it is not defined or not on record."""
    if label.family == "cc-pVXZ" and not label.fitting and not label.variant:
        return _consistent(label, z)
    return _tabled(label, z)


def is_on_record(label: Designation) -> bool:
    """Whether the composition of a set is known for any element."""
    return any(expected(label, z) is not None for z in range(1, 119))


def _counts(text: str) -> Counts:
    return {_LETTERS.index(letter): int(count) for count, letter in _ENTRY.findall(text)}


def _read(text: str) -> tuple[Counts, Counts | None]:
    """Contracted and primitive counts: "(7s4p)->[3s2p]", "[3s2p]" alone, or "7s4p" for both."""
    primitives, arrow, contracted = text.partition("->")
    if arrow:
        return _counts(contracted), _counts(primitives)
    return _counts(text), None if text.startswith("[") else _counts(text)


def plus(*terms: Counts) -> Counts:
    """The sum of counts."""
    total: Counts = {}
    for term in terms:
        for l, count in term.items():
            total[l] = total.get(l, 0) + count
    return {l: count for l, count in sorted(total.items()) if count}


def _with(found: Expected, added: Counts) -> Expected:
    """The same with further functions of one primitive each."""

    def more(pair: tuple[Counts, Counts | None]) -> tuple[Counts, Counts | None]:
        return plus(pair[0], added), None if pair[1] is None else plus(pair[1], added)

    contracted, primitives = more((found.contracted, found.primitives))
    return found._replace(
        contracted=contracted, primitives=primitives, others=tuple(map(more, found.others))
    )


# ---- sets with tables


def _lookup(file: str, name: str, z: int) -> Expected | None:
    data = table(file)
    text = row(data["sets"].get(name, {}), z)
    if text is None:
        return None
    first, *others = map(_read, text.split(" | "))
    return Expected(*first, {}, tuple(others), data.get("remarks", {}).get(name, ""))


def _tabled(label: Designation, z: int) -> Expected | None:
    if label.fitting:
        return _fitting(label, z)
    file = _FILES.get(label.family)
    if file is None:
        return None
    whole = _lookup(file, str(label), z)
    if whole is not None or not label.augmentation or label.family == "cc-pVXZ":
        return whole
    found = _lookup(file, label.name, z)
    if found is None:
        return None
    return _augmented(found, label, z, found.contracted)


def _fitting(label: Designation, z: int) -> Expected | None:
    found = _lookup("fitting", str(label), z)
    if label.family != "def2" or label.fitting not in ("JFIT", "JKFIT"):
        return found
    # One auxiliary set serves the whole family and goes by the name of each of its sets.
    shared = _lookup("fitting", f"def2-universal-{label.fitting}", z)
    if found is None or shared is None:
        return found or shared
    return found._replace(others=(*found.others, (shared.contracted, shared.primitives)))


# ---- correlation-consistent sets


def _consistent(label: Designation, z: int) -> Expected | None:
    if label.potential in _OTHER_POTENTIALS:
        return _lookup("borrowed", str(label), z)
    data = table("consistent")
    whole = str(label.but(augmentation="", tight=False))
    bare = label.but(augmentation="", tight=False, core_valence="")
    found = _lookup("consistent", whole, z)
    valence = _lookup("consistent", str(bare), z)
    if found is None or valence is None:
        valence = _by_formula(label, z)
        if valence is None:
            return None
        core = _core(label, z)
        if core is None:
            return None
        found = _with(valence, core)
        if core and label.zeta > 4:
            # From quintuple zeta on the core functions take over exponents of the valence set.
            found = found._replace(primitives=None)
    if label.tight and within(data["tight"], z):
        found = _with(found, {2: 1})
    return _excepted(label, z, _augmented(found, label, z, valence.contracted))


def _by_formula(label: Designation, z: int) -> Expected | None:
    data = table("consistent")
    terms = row(data["rows_with_potential" if label.potential else "rows"], z)
    if terms is None or label.potential not in ("", "PP"):
        return None
    if not label.potential and not within(data["elements"].get(str(label.zeta), "H"), z):
        return None
    counts: Counts = {}
    for l in range(label.zeta + 3):
        own = terms.get("spd"[l]) if l < 3 else None
        counts[l] = label.zeta + (terms["beyond"] - l if own is None else own)
        if l == 1 and label.zeta >= 4:
            counts[l] = label.zeta + terms.get("p_from_quadruple", own)
    counts = {l: count for l, count in counts.items() if count > 0}
    plain = str(Designation("cc-pVXZ", zeta=label.zeta, potential=label.potential))
    text = None if label.relativity and z == 20 else row(data["primitives"].get(plain, {}), z)
    primitives = [_counts(part) for part in text.split(" | ")] if text else [None]
    others = tuple((counts, part) for part in primitives[1:])
    return Expected(counts, primitives[0], {}, others)


def _core(label: Designation, z: int) -> Counts | None:
    """Tight functions of a core-valence set; None for elements that it is not defined for."""
    n, data = label.zeta, table("consistent")
    if not label.core_valence or z <= 2:
        return {}
    metals = data["core_of_metals"]["potential" if label.potential else "all_electron"]
    if label.core_valence == "wC" and within(metals, z):
        return {l: min(2, n - 1) if l < 3 else 1 for l in range(n + 2)}
    reach = row(data["core"], z)
    if reach is None:
        return None
    tight = {l: min(n - 1, n + reach - l) for l in range(n + reach)}
    return {l: count for l, count in tight.items() if count > 0}


_MONTHS = ("jul", "jun", "may", "apr", "mar", "feb")


def _diffuse(label: Designation, z: int, valence: Counts) -> Counts:
    """Diffuse functions that a prefix adds, by the angular momenta of the valence set."""
    prefix = label.augmentation
    if prefix in ("maug", "ma"):
        return {0: 1, 1: 1} if z > 2 else {}
    if prefix in _MONTHS:
        top = max(valence) - _MONTHS.index(prefix)
        return {l: 1 for l in valence if l <= top} if z > 2 else {}
    each = {"aug": 1, "d-aug": 2, "t-aug": 3, "q-aug": 4}.get(prefix, 0)
    return dict.fromkeys(valence, each) if each else {}


def _augmented(found: Expected, label: Designation, z: int, valence: Counts) -> Expected:
    if not label.augmentation:
        return found
    diffuse = _diffuse(label, z, valence)
    whole = _with(found, diffuse)._replace(diffuse=diffuse)
    if label.augmentation == "ma" and z == 2:
        # Left as it is by the rule, but the files in circulation carry the functions.
        more = _with(found, {0: 1, 1: 1})
        whole = whole._replace(others=(*whole.others, (more.contracted, more.primitives)))
    return whole


def _excepted(label: Designation, z: int, found: Expected) -> Expected:
    """What departs from the formula, as published."""
    for entry in table("consistent")["exceptions"]:
        if str(label) in entry["sets"] and within(entry["elements"], z):
            if "is" in entry:
                return found._replace(
                    contracted=_counts(entry["is"]), primitives=None, others=(), why=entry["why"]
                )
            other = (_counts(entry["also"]), None)
            return found._replace(others=(*found.others, other), why=entry["why"])
    return found
