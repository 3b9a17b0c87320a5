"""What the rules about real geometries say: numbers, culprits and remedies in words."""

from collections.abc import Callable, Iterator, Sequence

from overlapse.grammar.model import Severity
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.labels.naming import listed
from overlapse.rules.measured.probe import Dropped, Function, Probe, Share, Small

_DIFFUSE = 0.4  # bohr**-2; outermost functions below this are what augmentation adds
HARMLESS = 1e-4  # hartree: what functions may be worth that are dropped without a second thought
_SEASONAL = (
    "leave out outermost functions, those of H and of the highest l first (seasonal augmentation: "
    "E. Papajak, D. G. Truhlar, J. Chem. Theory Comput. 7, 10 (2011))"
)


def groups_of(case: Case, use: Callable[[Probe], bool]) -> list[list[Probe]]:
    """Probes by geometry, those whose first culprit stands in this file, the worst first."""
    groups: dict[str, list[Probe]] = {}
    for probe in case.probes:
        culprit = probe.culprit
        if culprit is not None and culprit.path == case.document.path and use(probe):
            groups.setdefault(probe.geometry, []).append(probe)
    return [sorted(group, key=lambda probe: probe.smallest) for group in groups.values()]


def at_culprit(
    case: Case, probe: Probe, severity: Severity, message: str, **details: object
) -> Finding:
    """A finding at the shell with the largest share in the smallest eigenvalue."""
    culprit = probe.culprit
    assert culprit is not None
    told = {"element": culprit.element, "shell": culprit.name, **details}
    return case.at_line(culprit.line, severity, message, **told)


def ladder(probe: Probe) -> str:
    """How many eigenvalues lie below each step."""
    told = [f"{count} below {step:.0e}" for step, count in probe.spectrum.below.items() if count]
    return ", ".join(told).replace("e-0", "e-") or "none below 1e-4"


def plain(value: float) -> str:
    """A limit as it is usually written: 1e-6, 3e-7, 2.5e-6."""
    return (
        f"{value:.2g}"
        if value >= 0.001
        else f"{value:.1e}".replace(".0e", "e").replace("e-0", "e-")
    )


def shares(small: Small, most: int = 3) -> str:
    """Who makes up a combination: C s-4 (0.0469) 61 %, H s-3 (0.0297) 30 %."""
    return ", ".join(_share(share) for share in small.kinds[:most])


def _share(share: Share) -> str:
    return f"{share.function} {100.0 * share.weight:.0f} %"


def witnesses(probe: Probe, most: int = 3) -> tuple[str, ...]:
    """The smallest eigenvalues with their culprits, as evidence."""
    told = [f"eigenvalue {small.value:.1e}: {shares(small)}" for small in probe.blame[:most]]
    return tuple(told)


def others(group: Sequence[Probe], what: str) -> str:
    """How many more frames of a geometry share the trouble, "" for none."""
    more = len(group) - 1
    return f"; {what} in {more} more frame{'s' * (more != 1)} of it" if more else ""


def remedy(probe: Probe) -> str:
    """What would help, the surest first."""
    return "; or ".join(_all_remedies(probe)) or "take one of the functions named out"


def first_remedy(probe: Probe) -> str:
    """The surest help alone, for findings beside the one that tells all."""
    return next(_all_remedies(probe), "take one of the functions named out")


def _all_remedies(probe: Probe) -> Iterator[str]:
    yield from _remedies(probe)
    if not probe.drop and probe.kept < probe.spectrum.functions:
        yield f"--prune {plain(10.0 * probe.threshold)} names functions to drop"


def _remedies(probe: Probe) -> Iterator[str]:
    counterpart = probe.counterpart
    if counterpart is not None and counterpart.smallest > 10.0 * max(probe.smallest, 0.0):
        yield f"use spherical functions: smallest eigenvalue {plain(counterpart.smallest)}"
    if probe.drop:
        told = f"drop {dropped(probe.drop)}"
        if probe.after is not None:
            left = probe.after
            told += f": {left.functions} functions stay, smallest eigenvalue {plain(left.smallest)}"
            told += f"; that costs {worth(left.loss)}" if left.loss is not None else ""
        yield told
    kinds: Sequence[Function] = [
        share.function for small in probe.blame[:3] for share in small.kinds if share.weight > 0.1
    ]
    if any(kind.outermost and kind.exponent < _DIFFUSE for kind in kinds):
        yield _SEASONAL


def worth(loss: float) -> str:
    """The energy that is lost without the functions that are dropped."""
    if loss < 1e-6:
        return "less than 1e-6 hartree, as estimated"
    return f"about {loss:.0e} hartree, as estimated".replace("e-0", "e-")


def dropped(parts: Sequence[Dropped], most: int = 6) -> str:
    """Functions to drop, in a row: C s-4 (0.0469), H s-3 (0.0297) of atoms 4, 5.

    A shared shell that goes with both its parts is told once.
    """
    groups: dict[tuple[str, str, int], list[Function]] = {}
    for part in parts:
        key = (part.function.element, part.function.name, part.atom)
        groups.setdefault(key, []).append(part.function)
    atoms: dict[Function, list[int]] = {}
    for (_, _, atom), members in groups.items():
        first = members[0] if len(members) == 1 else members[0]._replace(letter="")
        atoms.setdefault(first, []).append(atom)
    return listed([f"{function}{_of(sorted(at))}" for function, at in atoms.items()], most)


def _of(atoms: Sequence[int]) -> str:
    """Of which atoms; nothing where it is all of their element."""
    if 0 in atoms:
        return ""
    return f" of atom{'s' * (len(atoms) > 1)} {listed([str(atom) for atom in atoms], 8)}"
