"""Overlap in crystals, layers and chains."""

from collections.abc import Iterator

from overlapse.grammar.model import Severity
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.labels.naming import listed
from overlapse.rules.measured.overlap_words import (
    at_culprit,
    groups_of,
    ladder,
    others,
    remedy,
    shares,
    witnesses,
)
from overlapse.rules.measured.probe import Function, Lattice, Probe
from overlapse.rules.overlap_molecule import removal
from overlapse.rules.registry import rule


@rule("overlap.lattice")
def lattice(
    case: Case, *, tight: float = 1e-5, vanishes: float = 1e-14, loose: float = 0.1
) -> Iterator[Finding]:
    """The functions of a crystal, a layer or a chain are nearly linearly dependent.

    Every atom has its neighbours on all sides, so diffuse functions that are harmless in molecules
    repeat those of the neighbours here.  At some k points the smallest eigenvalue vanishes first.
    An eigenvalue that is negative is never the set's fault alone: the lattice sums were cut off too
    early.  Both are told apart: the sums are converged here, with a bound of their error, and
    repeated with fewer images.

    Formula: S_ij(k) = sum over lattice vectors T of exp(i k T) <i in cell 0 | j in cell T>;
    smallest eigenvalue at the centre of the zone and at the points of Monkhorst and Pack.

    Source: H. J. Monkhorst, J. D. Pack, Phys. Rev. B 13, 5188 (1976); diffuse functions in solids:
    M. F. Peintinger, D. Vilela Oliveira, T. Bredow, J. Comput. Chem. 34, 451 (2013); cut-off of
    0.1: common practice, no source.

    Limits: tight: note below it.  vanishes: error below it, S(k) is not positive in double
    precision.  loose: exponents below it are listed in a note (bohr**-2).  A warning is given where
    a program with the removal threshold of the run removes functions.

    Remedy: drop the functions named, or raise their exponents as sets made for solids do; where
    truncated sums are the cause, tighten the limits of the program's lattice sums.

    Bad::

        H 0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.1 1.0
        S 1 1.00
          0.04 1.0
        ****

    Good::

        H 0
        S 1 1.00
          0.5 1.0
        ****

    With::

        1
        Lattice="1.5 0 0 0 1.5 0 0 0 1.5" pbc="T T T"
        H 0.0 0.0 0.0
    """
    for group in groups_of(case, lambda p: p.lattice is not None and p.smallest < tight):
        worst = group[0]
        sums = worst.lattice
        assert sums is not None
        severity: Severity = "note"
        if worst.smallest < max(vanishes, sums.bound):
            severity = "error"
        elif worst.kept < worst.spectrum.functions:
            severity = "warning"
        point = min(sums.points, key=lambda p: p.smallest)
        k = ", ".join(f"{x:.3g}" for x in point.k)
        yield at_culprit(
            case,
            worst,
            severity,
            f"{worst.where}, k ({k}): {removal(worst)}; smallest eigenvalue {worst.smallest:.1e} "
            f"({ladder(worst)}); mostly {shares(worst.blame[0])}; {_origin(worst, sums)}"
            f"{others(group, 'the smallest eigenvalue is below the limit')}",
            measured=worst.smallest,
            limit=tight if severity == "note" else worst.threshold,
            witnesses=witnesses(worst),
            remedy=remedy(worst),
        )
    yield from _truncated(case, tight)
    yield from _listed(case, loose)


def _origin(probe: Probe, sums: Lattice) -> str:
    """Whether the set or the sums are the cause."""
    told = (
        f"the sums are converged to {sums.bound:.0e} (images within {sums.reach:.1f} bohr), so "
        "this comes from the set"
    )
    if sums.cut <= 0.0 < probe.smallest:
        told += (
            f"; sums cut at {sums.cut_at:.1f} bohr make a negative eigenvalue of it, {sums.cut:.1e}"
        )
    return told


def _truncated(case: Case, tight: float) -> Iterator[Finding]:
    """Sound sets that only a truncated sum spoils."""
    found = groups_of(
        case,
        lambda p: p.lattice is not None and p.smallest >= tight and p.lattice.cut < 0.5 * tight,
    )
    for group in found:
        worst = group[0]
        sums = worst.lattice
        assert sums is not None
        yield at_culprit(
            case,
            worst,
            "note",
            f"{worst.where}: the set is sound, smallest eigenvalue {worst.smallest:.1e}, but "
            f"lattice sums cut at {sums.cut_at:.1f} bohr instead of {sums.reach:.1f} make it "
            f"{sums.cut:.1e}",
            measured=sums.cut,
            limit=tight,
            remedy="tighten the limits of the program's lattice sums; the set can stay as it is",
        )


def _listed(case: Case, loose: float) -> Iterator[Finding]:
    """One note that lists the loose functions of this file."""
    found: dict[Function, str] = {}
    for probe in case.probes:
        for function in probe.lattice.loose if probe.lattice is not None else ():
            if function.path == case.document.path and function.exponent < loose:
                found.setdefault(function, probe.geometry)
    if not found:
        return
    first = next(iter(found))
    yield case.at_line(
        first.line,
        "note",
        f"{len(found)} function{'s' * (len(found) != 1)} used in a crystal "
        f"({found[first]}) {'have' if len(found) != 1 else 'has'} an exponent below {loose:g}: "
        f"{listed(list(map(str, found)), 8)}",
        element=first.element,
        shell=first.name,
        measured=first.exponent,
        limit=loose,
        remedy="such functions are often left out or raised for solids; see what they do to the "
        "smallest eigenvalue before doing so",
    )
