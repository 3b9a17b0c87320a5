"""Atoms: is each block's energy possible, does contraction cost what it should, is it stationary?

These rules compute Hartree-Fock atoms, so they run only where energies are wanted.
"""

from collections.abc import Iterator
from dataclasses import replace
from math import inf

from overlapse.rules.atoms import Atom
from overlapse.rules.case import Case
from overlapse.rules.energies import Ensemble, ensembles
from overlapse.rules.energy_told import charge_finding, column_finding, number_finding
from overlapse.rules.explained import Verdict, explain
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule
from overlapse.rules.stationary import Steps


@rule("energy.bound")
def bound(case: Case, *, above: float = 0.03) -> Iterator[Finding]:
    """An atom's energy is one that no set of functions for that atom gives.

    No functions whatever bring the energy below the Hartree-Fock limit; an energy below it means
    that the functions are so nearly dependent that rounding has taken over, here and in any
    program.  An energy far above it is worse than that of the poorest published set: a number is
    grossly wrong, or the block belongs to another element.

    Formula: (E - E_limit) / |E_limit| of the ground term, restricted open shells with equivalent
    orbitals; negative, or larger than `above` + 0.07 / Z**2.

    Source: limits: C. F. Bunge, J. A. Barrientos, A. V. Bunge, At. Data Nucl. Data Tables 53, 113
    (1993); of some 3000 published blocks, H to Kr, the poorest, STO-3G, lie 0.067 (H) and 0.019
    (He) above them.

    Limits: above: the share of its limit by which the energy of a heavy atom may lie above it.

    Remedy: look at the numbers of the innermost functions, and whose block it is.

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
        for atom in ensemble.atoms:
            if atom.energy is None:
                continue
            gap = atom.gap or 0.0
            most = above + 0.07 / atom.block.atomic_number**2
            below = gap * abs(atom.shells.limit) < -_RESIDUE * max(1.0, abs(atom.shells.limit))
            if not below and gap <= most:
                continue
            side = "below" if below else "above"
            told = "which no functions can give" if below else "poorer than any published set"
            yield case.at_line(
                atom.block.line,
                "error" if below else "warning",
                f"the energy of {atom.block.symbol} ({atom.shells.text}, {atom.shells.term}) in "
                f"these functions is {atom.energy:.6f} hartree, {abs(gap):.2%} {side} the "
                f"Hartree-Fock limit, {told}",
                element=atom.block.symbol,
                measured=atom.energy,
                limit=atom.shells.limit if below else atom.shells.limit * (1.0 - most),
                remedy="take out one of two functions that nearly coincide"
                if below
                else "look at the innermost functions, and whose block this is",
            )


# The limits are known to six decimals; sums over thousands of hartree lose a few more digits.
_RESIDUE = 2e-6


@rule("energy.loss")
def loss(
    case: Case, *, gap: float = 2.5, contracted: float = 3.0, clear: float = 10.0
) -> Iterator[Finding]:
    """Suspect: contraction, or the set as a whole, costs an atom much more than its neighbours.

    Elements of one row are described equally well: what the energy lies above the Hartree-Fock
    limit, and what it would fall if all primitives were let loose, changes smoothly along the row.
    A lost function or a wrong number raises one of both for one element.  Of 2400 published blocks
    with neighbours in their row 4 exceed the first limit, 6 the second.

    Formula: (E - E_limit) / |E_limit| and (E - E_uncontracted) / |E_limit|, over the largest of
    the neighbours up to three places away in the row.

    Source: common practice, no source; limits as in energy.bound.

    Limits: gap: how many times that of the neighbours the first may be.  contracted: the same of
    the second.  clear: from how many times on it is a warning.

    Remedy: look for a lost function or a wrong number in this element's block.

    Bad::

        B 0
        S 3 1.00
          49.209  0.154329
          8.9635  0.535328
          2.4259  0.444635
        S 1 1.00
          1.014  1.0
        S 1 1.00
          0.2197  1.0
        P 1 1.00
          1.521  1.0
        P 1 1.00
          0.2873  1.0
        ****
        C 0
        S 3 1.00
          72.377  0.154329
          13.183  0.535328
          3.568  -0.444635
        S 1 1.00
          1.584  1.0
        S 1 1.00
          0.3433  1.0
        P 1 1.00
          2.377  1.0
        P 1 1.00
          0.4489  1.0
        ****
        N 0
        S 3 1.00
          100  0.154329
          18.215  0.535328
          4.9297  0.444635
        S 1 1.00
          2.281  1.0
        S 1 1.00
          0.4943  1.0
        P 1 1.00
          3.422  1.0
        P 1 1.00
          0.6464  1.0
        ****

    Good::

        B 0
        S 3 1.00
          49.209  0.154329
          8.9635  0.535328
          2.4259  0.444635
        S 1 1.00
          1.014  1.0
        S 1 1.00
          0.2197  1.0
        P 1 1.00
          1.521  1.0
        P 1 1.00
          0.2873  1.0
        ****
        C 0
        S 3 1.00
          72.377  0.154329
          13.183  0.535328
          3.568  0.444635
        S 1 1.00
          1.584  1.0
        S 1 1.00
          0.3433  1.0
        P 1 1.00
          2.377  1.0
        P 1 1.00
          0.4489  1.0
        ****
        N 0
        S 3 1.00
          100  0.154329
          18.215  0.535328
          4.9297  0.444635
        S 1 1.00
          2.281  1.0
        S 1 1.00
          0.4943  1.0
        P 1 1.00
          3.422  1.0
        P 1 1.00
          0.6464  1.0
        ****
    """
    for ensemble in ensembles(case):
        for atom in ensemble.atoms:
            near = ensemble.near(atom)
            found = [
                ("lies above the Hartree-Fock limit", atom.gap, [a.gap for a in near], gap),
                ("pays for contraction", atom.share_lost, [a.share_lost for a in near], contracted),
            ]
            for told, own, others, most in found:
                known = [other for other in others if other is not None]
                if own is None or len(known) < 2:
                    continue
                times = own / (max(known) + 1e-6)
                if times <= most:
                    continue
                yield case.at_line(
                    atom.block.line,
                    "warning" if times >= clear else "note",
                    f"suspect: {atom.block.symbol} {told} by {own:.2g} of its energy, "
                    f"{times:.3g} times as much as any of {len(known)} neighbours in its row",
                    element=atom.block.symbol,
                    measured=own,
                    limit=most * max(known),
                    witnesses=(f"energy: {atom.energy:.6f} hartree",),
                    remedy="look for a lost function or a wrong number in this block",
                )
                break


@rule("energy.stationary")
def stationary(
    case: Case,
    *,
    times: float = 7.5,
    clear: float = 25.0,
    alone: float = 10.0,
    least: float = 1e-3,
) -> Iterator[Finding]:
    """Suspect: the energy of an atom would fall if one number were another.

    Sets are made for the energy of atoms: exponents and coefficients are varied until it is least,
    or columns are the atom's own orbitals.  So at the true numbers the first derivatives vanish, or
    are what they are for the neighbours in the row, often to a hundredth of a per cent.  A wrong
    number moves them all, in a pattern of its own; the number whose correction alone explains the
    pattern is named, with the value that it should have.  Functions that hold no electrons do not
    show, and loose ones show little.  Sets recontracted for relativistic atoms are compared with
    their neighbours only.  Where all functions would have to shrink or grow as those of
    another element would, its block has come to stand here.

    Formula: step of a number x: -(dE/dx) / (d2E/dx2), orbitals relaxed, in units of the scatter of
    the same place in the neighbours; chi**2 is their sum of squares.  All lengths at once:
    f = -V / 2T, near Z / Z' for the block of Z'.

    Source: P. Pulay, Mol. Phys. 17, 197 (1969) (derivatives of the energy by the functions); S.
    Huzinaga, J. Chem. Phys. 42, 1293 (1965) (exponents by the energy of atoms).

    Limits: times: how many standard errors a correction must be to be told, beside three
    neighbours or more.  clear: how many make it a warning without another witness.  alone: how many
    an element without neighbours needs.  least: the smallest relative change that is told.

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
        suspects = _suspects(ensemble, times, alone)
        for atom in ensemble.atoms:
            own = suspects.get(id(atom))
            yield from at_atom(case, ensemble, atom, own, times, clear, alone, least)


def at_atom(
    case: Case,
    ensemble: Ensemble,
    atom: Atom,
    own: Steps | None,
    times: float,
    clear: float,
    alone: float,
    least: float,
) -> Iterator[Finding]:
    """What the energy says about the numbers of one atom; ``own`` if its gradient is unusual."""
    verdict = _explained(ensemble, own, times, alone) if own is not None else None
    charge = ensemble.foreign(atom)
    if charge and (verdict is None or verdict.after > 100.0 * verdict.count):
        yield charge_finding(case, atom, charge)
        return
    if verdict is not None and abs(verdict.change) < least:
        verdict = None
    if verdict is not None:
        yield number_finding(case, ensemble, verdict, clear)
    told = verdict.number if verdict is not None else None
    astray = [
        stray
        for stray in ensemble.strays(atom)
        if stray.times >= 1.5 * (times if stray.others >= 3 else alone) and stray.number != told
    ]
    # One slip is one number: several that stray have another cause, and the first is a hint.
    astray.sort(key=lambda stray: -stray.times)
    for stray in astray[:1]:
        yield column_finding(case, ensemble, stray, 2.0 * clear if len(astray) == 1 else inf)


# Following more suspects than this in one set takes longer than an audit has; a set in which so
# many atoms are not stationary was not made for their energy.
_MOST = 12


def _suspects(ensemble: Ensemble, times: float, alone: float) -> dict[int, Steps]:
    """The atoms whose gradient is unusual, by the atom's identity; the most unusual ones."""
    found = []
    for atom in ensemble.atoms:
        own = ensemble.steps(atom)
        if own is not None:
            expected = ensemble.usual(own)
            away = float((expected.chi(own.gradient) ** 2).sum()) ** 0.5
            found.append((away / (times if expected.others >= 3 else alone), own))
    found = sorted((each for each in found if each[0] >= 1.0), key=lambda each: -each[0])
    return {id(own.atom): own for _, own in found[:_MOST]}


def _explained(ensemble: Ensemble, own: Steps, times: float, alone: float) -> Verdict | None:
    """The single number that explains an atom's gradient, if one does well enough."""
    expected = ensemble.usual(own)
    if ensemble.relativistic and expected.others < 3:
        return None
    # Following a number takes long, and an edited file has few new ones.
    verdict = own.atom.once(
        f"explained against {expected.token}",
        lambda: explain(own, ensemble.others(own.atom), expected),
    )
    if verdict is None:
        return None
    verdict = replace(verdict, own=own)
    is_clear = verdict.significance >= (times if expected.others >= 3 else alone)
    explains = verdict.after < max(_LEFT * min(verdict.before, 1e4), 0.05 * verdict.before)
    if expected.others < 3:
        # Without neighbours the rest of the atom must be in order to be believed.
        explains = verdict.after < 10.0 * verdict.count
    is_sharp = verdict.error < min(0.05, 0.25 * abs(verdict.change))
    return verdict if is_clear and explains and is_sharp else None


_LEFT = 0.35  # part of chi squared that a single number may leave unexplained
