"""Overlap near a removal threshold: the number of functions is a matter of chance there."""

from collections.abc import Iterator
from itertools import pairwise

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.measured.overlap_words import (
    at_culprit,
    first_remedy,
    groups_of,
    others,
    plain,
    witnesses,
)
from overlapse.rules.measured.probe import NEAR, Probe
from overlapse.rules.registry import rule

_AWAY = "set the threshold away from the eigenvalue and state it with the results"


@rule("overlap.edge")
def edge(case: Case) -> Iterator[Finding]:
    """An eigenvalue lies at a removal threshold, so that chance decides how many functions stay.

    A small change of the geometry, or another program with nearly the same threshold, removes one
    function more or less.  Energies then jump by up to a millihartree: curves get a step,
    optimisations oscillate, differences between programs are taken for errors.

    Formula: eigenvalues of S between a third of the threshold and three times it; number of those
    below it in the frames of one molecule.

    Source: canonical orthogonalisation: P.-O. Lowdin, Adv. Quantum Chem. 5, 185 (1970); that counts
    differ between programs: common practice, no source.

    Remedy: drop the functions named for the whole series, or set the threshold away from the
    eigenvalue and state it with the results.

    Bad::

        H 0
        S 1 1.00
          0.5 1.0
        S 1 1.00
          0.0500 1.0
        S 1 1.00
          0.0505 1.0
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
    crossed = list(_crossings(case))
    told = {id(probe) for series, _, _ in crossed for probe in series}
    for series, low, high in crossed:
        yield _crossing(case, series, low, high)
    for group in groups_of(case, lambda p: p.near > 0 and id(p) not in told):
        first = group[0]
        step = plain(first.threshold)
        yield at_culprit(
            case,
            first,
            "warning",
            f"{first.where}: {first.near} eigenvalue{'s' * (first.near != 1)} within a factor "
            f"{NEAR:.0f} of the removal threshold {step}: chance decides how many of the "
            f"{first.spectrum.functions} functions stay{others(group, 'the same')}",
            measured=_nearest(first),
            limit=first.threshold,
            witnesses=witnesses(first),
            remedy=f"{first_remedy(first)}; or {_AWAY}",
        )


def _nearest(probe: Probe) -> float:
    """The eigenvalue closest to the threshold, of those that were looked into."""
    values = [small.value for small in probe.blame if small.value > 0.0]
    near = [v for v in values if probe.threshold / NEAR <= v < probe.threshold * NEAR]
    return min(near or values, key=lambda v: max(v / probe.threshold, probe.threshold / v))


def _crossings(case: Case) -> Iterator[tuple[list[Probe], Probe, Probe]]:
    """Series of frames of one molecule in which the number of functions kept changes.

    With the frames that keep fewest and most.  A series belongs to the file of its worst culprit.
    """
    series: dict[tuple[object, ...], list[Probe]] = {}
    for probe in case.probes:
        key = (probe.formula, probe.spectrum.functions, probe.spherical, probe.files)
        series.setdefault(key, []).append(probe)
    for members in series.values():
        low = min(members, key=lambda probe: (probe.kept, probe.smallest))
        high = max(members, key=lambda probe: probe.kept)
        culprit = low.culprit
        if low.kept < high.kept and culprit is not None and culprit.path == case.document.path:
            yield members, low, high


def _crossing(case: Case, series: list[Probe], low: Probe, high: Probe) -> Finding:
    count = low.spectrum.functions
    changes = sum(one.kept != two.kept for one, two in pairwise(series))
    return at_culprit(
        case,
        low,
        "warning",
        f"{len(series)} frames of {low.formula}: between {low.kept} ({low.where}) and {high.kept} "
        f"({high.where}) of {count} functions stay at a removal threshold of "
        f"{plain(low.threshold)}; the number changes {changes} time{'s' * (changes != 1)} along "
        "them",
        measured=low.kept,
        limit=high.kept,
        witnesses=witnesses(low),
        remedy=f"{first_remedy(low)}; or {_AWAY}",
    )
