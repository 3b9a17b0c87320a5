"""Suspicions of other rules that an atom's energy contradicts.

What falls out of a row of the periodic table, or out of the spacing in a shell, is an indication
only: some published elements go their own way.  Where the energy feels the number well enough, it
decides.  If the number had to change by y (of its logarithm), the departures of the atom's steps
would hold y times the pattern of that number (see `stationary`); they hold x times it, with a
standard error s.
"""

from collections.abc import Iterator
from math import log

import numpy as np

from overlapse.rules.atomic.atoms import Number
from overlapse.rules.atomic.energies import Ensemble
from overlapse.rules.atomic.stationary import TELLING, Steps, Usual
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding

_INDICATIONS = ("primitive.trend", "primitive.gap", "contraction.trend")
_MOST = 0.4  # change of a logarithm up to which second derivatives foretell what a slip does
_TIMES = 6.0  # standard errors that the energy has to be away from what is suspected
_PART = 0.3  # of the change suspected: so much the energy may ask for itself


def cleared(case: Case, ensemble: Ensemble) -> Iterator[Finding]:
    """Notes of other rules about numbers that the energies of these atoms find in order."""
    notes = [
        finding
        for rule in _INDICATIONS
        for finding in case.found.get(rule, ())
        if finding.severity == "note" and isinstance(finding.expected, float)
    ]
    if not notes:
        return
    for atom in ensemble.atoms:
        about = [finding for finding in notes if finding.element == atom.block.symbol]
        own = ensemble.steps(atom) if about else None
        if own is None:
            continue
        expected = ensemble.usual(own)
        if ensemble.relativistic and expected.others < 3:
            continue
        places = _places(own)
        for finding in about:
            number = places.get((finding.line, finding.column))
            if number is not None and _contradicts(own, expected, number, finding):
                yield finding


def _places(own: Steps) -> dict[tuple[int, int], Number]:
    """The numbers that the energy feels, by line and column."""
    found = {}
    for number in own.numbers:
        shell = own.atom.block.shells[number.shell]
        if shell.cells is not None:
            place = shell.place(number.row, number.column)
            found[place.line, place.column] = number
    return found


def _contradicts(own: Steps, expected: Usual, number: Number, finding: Finding) -> bool:
    """Whether the energy asks for much less than the change that a finding suggests."""
    assert isinstance(finding.expected, float)
    ratio = finding.expected / own.atom.value(number)
    if number.column is not None:
        wanted = ratio - 1.0
    elif ratio > 0.0:
        wanted = log(ratio)
    else:
        return False
    wanted = float(np.clip(wanted, -_MOST, _MOST))
    away = expected.chi(own.gradient)
    pattern = own.curvature[own.numbers.index(number)] / (expected.stiffness * expected.scatter)
    length = float(pattern @ pattern)
    if length == 0.0:
        return False
    found = float(pattern @ away) / length
    left = max(float(away @ away) - found * found * length, 0.0)
    error = ((1.0 + left / min(len(own.numbers), TELLING)) / length) ** 0.5
    return abs(wanted - found) > _TIMES * error and abs(found) < _PART * abs(wanted)
