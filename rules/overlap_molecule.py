"""Overlap in a real molecule: what a program will remove, and what a field without removal meets.

These rules judge what was measured in a geometry (`Case.probes`); a plain audit has none.
"""

from collections.abc import Iterator

from overlapse.grammar.model import Severity
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.measured.overlap_words import (
    at_culprit,
    first_remedy,
    groups_of,
    ladder,
    others,
    plain,
    remedy,
    shares,
    witnesses,
)
from overlapse.rules.measured.probe import Probe
from overlapse.rules.registry import rule

_ALSO = "the smallest eigenvalue is below the limit"


@rule("overlap.molecule")
def molecule(case: Case, *, tight: float = 1e-5, vanishes: float = 1e-14) -> Iterator[Finding]:
    """The functions of a molecule are nearly linearly dependent.

    Programs diagonalise the overlap matrix and remove the combinations whose eigenvalue lies below
    a threshold of their own, between 1e-4 and 1e-8.  The number of orbitals then is smaller than
    the number of functions, differs between programs and along a path, and with it the energy: by
    up to a millihartree where a removed combination carried something.

    Formula: eigenvalues of S over normalised contracted functions; removal of those below the
    threshold; shares are the squared components of the unit eigenvector; functions to drop by
    pivoted Cholesky decomposition.

    Source: canonical orthogonalisation: P.-O. Lowdin, Adv. Quantum Chem. 5, 185 (1970); choice of
    functions: S. Lehtola, J. Chem. Phys. 151, 241102 (2019), Phys. Rev. A 101, 032504 (2020).

    Limits: tight: note below it.  vanishes: error below it, S is not positive in double precision.
    A warning is given where a program with the removal threshold of the run removes functions.

    Remedy: drop the functions named, or take a set with fewer diffuse functions.

    Bad::

        H 0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.0500 1.0
        S 1 1.00
          0.0503 1.0
        ****

    Good::

        H 0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.05 1.0
        ****

    With::

        2
        hydrogen, angstrom
        H 0.0 0.0 0.0
        H 0.0 0.0 0.74
    """
    yield from case.faults("overlap.molecule")
    for group in groups_of(case, lambda p: p.lattice is None and p.smallest < tight):
        worst = group[0]
        severity: Severity = "note"
        if worst.smallest < vanishes:
            severity = "error"
        elif worst.kept < worst.spectrum.functions:
            severity = "warning"
        yield at_culprit(
            case,
            worst,
            severity,
            f"{worst.where}: {removal(worst)}; smallest eigenvalue {worst.at_most}"
            f"{worst.smallest:.1e} ({ladder(worst)}), condition number "
            f"{worst.spectrum.condition:.1e}; mostly {shares(worst.blame[0])}"
            f"{others(group, _ALSO)}",
            measured=worst.smallest,
            limit=vanishes if severity == "error" else _limit(worst, tight),
            witnesses=witnesses(worst),
            remedy=remedy(worst),
        )


def removal(probe: Probe) -> str:
    """How many of the functions a program keeps, in words."""
    count, step = probe.spectrum.functions, plain(probe.threshold)
    if probe.kept == count:
        return f"all {count} functions stay at a removal threshold of {step}"
    gone = count - probe.kept
    functions = f"function{'s' * (gone != 1)}"
    least = "at least " if probe.at_most else ""
    return f"{least}{gone} {functions} of {count} will be removed at a threshold of {step}"


def _limit(probe: Probe, tight: float) -> float:
    return probe.threshold if probe.kept < probe.spectrum.functions else tight


@rule("overlap.outlook")
def outlook(case: Case) -> Iterator[Finding]:
    """A self-consistent field without removal of combinations will be strained or will fail.

    This is another question than how many functions a program removes.  Where the smallest
    eigenvalue comes near the rounding of the integrals, the field is decided by noise: it takes
    more cycles, or converges to a wrong energy, or runs away by thousands of hartree.

    Formula: noise of energy and gradient, eps sqrt(T) (p / lambda)**2 and eps sqrt(T) p**(3/2) /
    lambda**2 for a combination of eigenvalue lambda and kinetic energy T that holds p electrons in
    a rough Hartree-Fock field; strained above 1.5e-8 hartree of the first, failing above 1e-4 of
    the second (`overlapse.rules.physics.outlook`).

    Source: calibrated on fields of small systems, computed without and with removal; see
    tests/bench/.

    Remedy: drop the functions named, or make sure that the program removes them.

    Bad::

        H 0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.05 1.0
        S 1 1.00
          0.0500001 1.0
        ****

    Good::

        H 0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.05 1.0
        ****

    With::

        2
        hydrogen, angstrom
        H 0.0 0.0 0.0
        H 0.0 0.0 0.74
    """
    for group in groups_of(case, lambda p: p.outlook.level != "safe" and not p.fitting):
        # Which is the worst is for the outlook to say, not for the smallest eigenvalue.
        group.sort(key=lambda probe: probe.outlook.level != "fails")
        worst = group[0]
        fails = worst.outlook.level == "fails"
        told = "is predicted to fail" if fails else "will be strained"
        yield at_culprit(
            case,
            worst,
            "error" if fails else "warning",
            f"{worst.where}: a self-consistent field without removal {told}: "
            f"{worst.outlook.reason}{others(group, 'the outlook is not safe')}",
            measured=worst.outlook.measure,
            limit=worst.outlook.limit,
            witnesses=witnesses(worst, 1),
            remedy=f"{first_remedy(worst)}; or make sure that the program removes combinations",
        )


@rule("overlap.cartesian")
def cartesian(case: Case, *, tight: float = 1e-5, times: float = 10.0) -> Iterator[Finding]:
    """Near linear dependence comes from Cartesian functions alone.

    A Cartesian d shell holds an s function of the same exponent, an f shell three p functions, and
    these are what nearly repeats other s and p functions.  With spherical functions the same set is
    sound in the same molecule.

    Formula: (l+1)(l+2)/2 Cartesian against 2l+1 spherical functions; smallest eigenvalue of S both
    ways.

    Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
    chapter 6; that the choice moves the smallest eigenvalue: tests/published.

    Limits: tight: smallest eigenvalue below which Cartesian functions are looked at.  times: by
    this factor spherical functions must be better, and above the limit, for them to be the cause.

    Remedy: use spherical functions, or leave out the s or p function that is repeated.

    Bad::

        basis "H_invented" CARTESIAN
        H S
         1.0 1.0
        H S
         0.5 1.0
        H S
         0.25 1.0
        H S
         0.12 1.0
        H S
         0.06 1.0
        H D
         0.7 1.0
        H D
         0.35 1.0
        H D
         0.17 1.0
        H D
         0.09 1.0
        end

    Good::

        basis "H_invented" SPHERICAL
        H S
         1.0 1.0
        H S
         0.5 1.0
        H S
         0.25 1.0
        H S
         0.12 1.0
        H S
         0.06 1.0
        H D
         0.7 1.0
        H D
         0.35 1.0
        H D
         0.17 1.0
        H D
         0.09 1.0
        end

    With::

        2
        hydrogen, angstrom
        H 0.0 0.0 0.0
        H 0.0 0.0 0.74
    """
    for group in groups_of(case, lambda p: p.smallest < tight):
        found = [
            (probe, probe.counterpart)
            for probe in group
            if probe.counterpart is not None
            and probe.counterpart.smallest >= max(tight, times * probe.smallest)
        ]
        if not found:
            continue
        worst, spherical = found[0]
        yield at_culprit(
            case,
            worst,
            "warning" if worst.kept < worst.spectrum.functions else "note",
            f"{worst.where}: smallest eigenvalue {worst.smallest:.1e} with Cartesian functions, "
            f"{spherical.smallest:.1e} with spherical ones: the contaminants alone are the cause",
            measured=worst.smallest,
            limit=spherical.smallest,
            witnesses=witnesses(worst, 1),
            remedy="use spherical functions, or leave out the s or p function that is repeated",
        )
