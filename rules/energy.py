"""Atoms: is each block's energy possible, does contraction cost what it should, is it stationary?

These rules compute Hartree-Fock atoms, so they run only where energies are wanted.
"""

from collections.abc import Iterator

from overlapse.rules.case import Case
from overlapse.rules.energies import Ensemble, ensembles
from overlapse.rules.energy_told import column_finding, number_finding
from overlapse.rules.explained import Verdict, explain
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule


@rule("energy.stationary")
def stationary(
    case: Case, *, times: float = 8.0, clear: float = 25.0, alone: float = 15.0
) -> Iterator[Finding]:
    """Suspect: the energy of an atom would fall if one number were another.

    Sets are made for the energy of atoms: exponents and coefficients are varied until it is least,
    or columns are the atom's own orbitals.  So at the true numbers the first derivatives vanish, or
    are what they are for the neighbours in the row, often to a hundredth of a per cent.  A wrong
    number moves them all, in a pattern of its own; the number whose correction alone explains the
    pattern is named, with the value that it should have.  Functions that hold no electrons do not
    show, and loose ones show little.

    Formula: step of a number x: -(dE/dx) / (d2E/dx2), orbitals relaxed, in units of the scatter of
    the same place in the neighbours; chi**2 is their sum of squares.

    Source: P. Pulay, Mol. Phys. 17, 197 (1969) (derivatives of the energy by the functions); S.
    Huzinaga, J. Chem. Phys. 42, 1293 (1965) (exponents by the energy of atoms).

    Limits: times: how many standard errors a correction must be to be told, beside three
    neighbours or more.  clear: how many make it a warning without another witness.  alone: how many
    an element without neighbours needs.

    Remedy: compare the number with the original publication.

    Bad::

        He 0
        S 3 1.00
          38.355   0.023814
          57.689   0.154913
          1.2399   0.469986
        S 1 1.00
          0.29758  1.0
        ****

    Good::

        He 0
        S 3 1.00
          38.355   0.023814
          5.7689   0.154913
          1.2399   0.469986
        S 1 1.00
          0.29758  1.0
        ****
    """
    for ensemble in ensembles(case):
        found = _explained(ensemble, times, alone)
        for atom in ensemble.atoms:
            told = set()
            verdict = found.get(id(atom))
            if verdict is not None:
                told.add(verdict.number)
                yield number_finding(case, ensemble, verdict, clear)
            for stray in ensemble.strays(atom):
                enough = times if stray.others >= 3 else alone
                if stray.times >= 1.5 * enough and stray.number not in told:
                    yield column_finding(case, ensemble, stray, 2.0 * clear)


# Following more suspects than this in one set takes longer than an audit has; a set in which so
# many atoms are not stationary was not made for their energy.
_MOST = 12


def _explained(ensemble: Ensemble, times: float, alone: float) -> dict[int, Verdict]:
    """The atoms whose gradient a single number explains, by the atom's identity."""
    suspects = []
    for atom in ensemble.atoms:
        own = ensemble.steps(atom)
        if own is None:
            continue
        expected = ensemble.usual(own)
        away = float((expected.chi(own.gradient) ** 2).sum()) ** 0.5
        enough = times if expected.others >= 3 else alone
        if away >= enough:
            suspects.append((away / enough, own, expected))
    suspects.sort(key=lambda each: -each[0])
    found = {}
    for _, own, expected in suspects[:_MOST]:
        verdict = explain(own, ensemble.others(own.atom), expected)
        if verdict is None:
            continue
        enough = times if expected.others >= 3 else alone
        if (
            verdict.significance >= enough
            and verdict.after < _LEFT * verdict.before
            and abs(verdict.change) > 4.0 * verdict.error
        ):
            found[id(own.atom)] = verdict
    return found


_LEFT = 0.35  # part of chi squared that a single number may leave unexplained
