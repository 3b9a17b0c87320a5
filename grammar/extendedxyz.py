"""The comment line of an XYZ frame: free text, or pairs of the extended form.

Extended XYZ writes ``key=value`` pairs there: ``Lattice`` (nine numbers, the vectors one after the
other), ``pbc`` (three truth values), ``Properties`` (names, kinds and numbers of the columns).
Source: the specification kept at github.com/libAtoms/extxyz.  A unit is taken from ``units=bohr``
and from the bare words bohr and angstrom.
"""

import re
from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from overlapse.grammar.geometry import Unit
from overlapse.grammar.model import Fault, Span
from overlapse.grammar.numbers import read_number

_PAIR = re.compile(
    r"""(?P<key>[A-Za-z_][\w-]*)\s*=\s*(?:"(?P<q>[^"]*)"|'(?P<a>[^']*)'|\{(?P<b>[^}]*)\}|"""
    r"""\[(?P<c>[^\]]*)\]|(?P<w>\S*))"""
)
_WORD = re.compile(r"[^\W\d_]+(?:\.[^\W\d_]\.)?", re.U)
_UNIT_WORDS: dict[str, Unit] = {
    **dict.fromkeys(("bohr", "bohrs", "bohrradius", "a.u.", "au"), "bohr"),
    **dict.fromkeys(("angstrom", "angstroms", "ångström", "ångstrom", "ang", "angs"), "angstrom"),
}
# As bare words of a title these could mean something else: gold, for one.
_ONLY_IN_PAIRS = frozenset(("au", "a.u.", "ang", "angs"))
_UNIT_KEYS = ("unit", "units", "length_unit", "length_units")
_TRUTH = {"t": True, "true": True, "1": True, "f": False, "false": False, "0": False}


class Columns(NamedTuple):
    """Which columns of a row (0-based) hold the atom's name and the first coordinate."""

    name: int = 0
    position: int = 1


class Comment(NamedTuple):
    """What a comment line says; ``unit`` None where it is silent, lattice as printed."""

    lattice: tuple[float, ...] | None = None
    periodic: tuple[bool, bool, bool] = (False, False, False)
    columns: Columns = Columns()
    unit: Unit | None = None
    faults: tuple[Fault, ...] = ()


def read_comment(line: str, offset: int) -> Comment:
    """Read a comment line that begins at ``offset`` of the text."""
    pairs: dict[str, tuple[str, Span]] = {}
    for match in _PAIR.finditer(line):
        group = next((g for g in "qabcw" if match[g] is not None), "w")
        span = (offset + match.start(group), offset + max(match.end(group), match.start(group) + 1))
        pairs.setdefault(match["key"].lower(), (match[group], span))
    faults: list[Fault] = []
    lattice = _lattice(*pairs["lattice"], faults) if "lattice" in pairs else None
    periodic = (True, True, True)
    if "pbc" in pairs:
        periodic = _periodic(*pairs["pbc"], faults) or periodic
        if any(periodic) and "lattice" not in pairs:
            faults.append(_fault("pbc is given without a Lattice", pairs["pbc"][1]))
    if lattice is None:
        periodic = (False, False, False)
    columns = _columns(*pairs["properties"], faults) if "properties" in pairs else Columns()
    unit = _unit(line, pairs, offset, faults)
    return Comment(lattice, periodic, columns, unit, tuple(faults))


def _fault(message: str, span: Span, rule: str = "form.syntax", remedy: str = "") -> Fault:
    return Fault(rule, message, span, remedy=remedy or "write the comment line as the form asks")


def _lattice(text: str, span: Span, faults: list[Fault]) -> tuple[float, ...] | None:
    words = text.replace(",", " ").replace("[", " ").replace("]", " ").split()
    values = [read_number(word) for word in words]
    bad = next((k for k, value in enumerate(values) if value.value is None or value.slip), None)
    if bad is not None:
        message = f"a number of the Lattice, {words[bad]!r}, {values[bad].slip}"
        faults.append(_fault(message, span, "form.number", "write nine numbers"))
        return None
    numbers = [float(value.value or 0.0) for value in values]
    if len(numbers) == 3:
        a, b, c = numbers
        numbers = [a, 0.0, 0.0, 0.0, b, 0.0, 0.0, 0.0, c]
    if len(numbers) != 9:
        message = f"a Lattice has nine numbers, not {len(numbers)}"
        faults.append(_fault(message, span, "form.count", "give three vectors of three numbers"))
        return None
    table = np.array(numbers).reshape(3, 3)
    with np.errstate(over="ignore", invalid="ignore"):
        lengths = np.linalg.norm(table, axis=1)
    if not np.isfinite(lengths).all():
        faults.append(_fault("the numbers of the Lattice are out of range", span))
        return None
    if not lengths.all() or abs(np.linalg.det(table / lengths[:, None])) < 1e-6:
        faults.append(_fault("the vectors of the Lattice lie in one plane", span))
        return None
    return tuple(numbers)


def _periodic(text: str, span: Span, faults: list[Fault]) -> tuple[bool, bool, bool] | None:
    flags = [_TRUTH.get(word.lower()) for word in text.replace(",", " ").split()]
    if len(flags) == 3 and None not in flags:
        return bool(flags[0]), bool(flags[1]), bool(flags[2])
    faults.append(_fault(f"pbc is three of T and F, not {text!r}", span))
    return None


def _columns(text: str, span: Span, faults: list[Fault]) -> Columns:
    """Columns from ``name:kind:number`` triples: species (or Z) and pos are needed."""
    parts = text.split(":")
    starts: dict[str, int] = {}
    column = 0
    sound = len(parts) % 3 == 0
    for name, count in zip(parts[::3], parts[2::3], strict=False):
        starts[name.lower()] = column
        sound = sound and count.isdecimal()
        column += int(count) if count.isdecimal() else 0
    called = next((starts[key] for key in ("species", "symbols", "z") if key in starts), None)
    if not sound or called is None or "pos" not in starts:
        faults.append(
            _fault("Properties does not say where species and pos (three numbers) stand", span)
        )
        return Columns()
    return Columns(called, starts["pos"])


def _unit(
    line: str, pairs: dict[str, tuple[str, Span]], offset: int, faults: list[Fault]
) -> Unit | None:
    for key in _UNIT_KEYS:
        if key in pairs:
            word, span = pairs[key]
            if (unit := _UNIT_WORDS.get(word.lower())) is None:
                message = f"{word!r} is no unit of length known here"
                faults.append(_fault(message, span, remedy="write units=bohr or units=angstrom"))
            return unit
    told = list(_bare_units(line))
    if len({unit for unit, _ in told}) > 1:
        start, end = told[1][1]
        span = (offset + start, offset + end)
        faults.append(_fault("the comment line names two units of length", span))
    return told[0][0] if told else None


def _bare_units(line: str) -> Iterator[tuple[Unit, Span]]:
    for match in _WORD.finditer(_PAIR.sub(lambda pair: " " * len(pair[0]), line)):
        word = match[0].lower()
        if word in _UNIT_WORDS and word not in _ONLY_IN_PAIRS:
            yield _UNIT_WORDS[word], match.span()
