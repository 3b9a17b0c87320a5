"""What the energies of a document's atoms say: findings for the rules of `energy`."""

from collections.abc import Iterator
from dataclasses import replace
from math import inf

from overlapse.rules.atomic.atoms import Atom
from overlapse.rules.atomic.cleared import cleared
from overlapse.rules.atomic.energies import Ensemble, ensembles
from overlapse.rules.atomic.energy_told import (
    charge_finding,
    column_finding,
    number_finding,
    puzzle_finding,
)
from overlapse.rules.atomic.explained import Verdict, explain
from overlapse.rules.atomic.level import usual_gap
from overlapse.rules.atomic.stationary import Steps
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding


def bounded(case: Case, above: float) -> Iterator[Finding]:
    """Energies below the limit, or far above it."""
    for ensemble in ensembles(case):
        for atom in ensemble.atoms:
            if atom.energy is None:
                continue
            gap = atom.gap or 0.0
            most = above + 0.07 / atom.block.atomic_number**2
            below = atom.energy < atom.shells.limit - _RESIDUE + _ROUNDING * atom.shells.limit
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


_RESIDUE = 2e-6  # hartree: the limits are known to six decimals
_ROUNDING = 2e-9  # of the energy: sums over thousands of hartree lose a few digits


def losing(case: Case, gap: float, contracted: float, clear: float) -> Iterator[Finding]:
    """Atoms that lie higher, or lose more by contraction, than their neighbours."""
    # Of an atom beyond all bounds that much is known already.
    told_of = {finding.element for finding in case.found.get("energy.bound", ())}
    for ensemble in ensembles(case):
        for atom in ensemble.atoms:
            if atom.block.symbol in told_of:
                continue
            near = ensemble.near(atom)
            found = [
                ("lies above the Hartree-Fock limit", atom.gap, [a.gap for a in near], gap),
                ("pays for contraction", atom.share_lost, [a.share_lost for a in near], contracted),
            ]
            compared = False
            for told, own, others, most in found:
                known = [other for other in others if other is not None]
                if own is None or len(known) < 2:
                    continue
                compared = True
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
            if not compared:
                yield from _by_label(case, ensemble, atom, clear)


_LEVEL = 3.0  # times the largest gap of the label's own elements that is worth a note


def _by_label(case: Case, ensemble: Ensemble, atom: Atom, clear: float) -> Iterator[Finding]:
    """An atom without neighbours, against what its set's label implies."""
    if ensemble.label is None or ensemble.relativistic or atom.gap is None:
        return
    usual = usual_gap(ensemble.label, atom.block.atomic_number)
    if usual is None or atom.gap <= _LEVEL * usual:
        return
    yield case.at_line(
        atom.block.line,
        "warning" if atom.gap > clear * usual else "note",
        f"suspect: {atom.block.symbol} lies above the Hartree-Fock limit by {atom.gap:.2g} of its "
        f"energy, where {ensemble.label} has at most {usual:.2g} in this period",
        element=atom.block.symbol,
        measured=atom.gap,
        limit=_LEVEL * usual,
        witnesses=(f"energy: {atom.energy:.6f} hartree",),
        remedy="look for a lost function or a wrong number in this block, and at the label",
    )


def unsteady(
    case: Case, times: float, clear: float, alone: float, least: float, far: float
) -> Iterator[Finding]:
    """Numbers that would lower an atom's energy if they were others; what it clears is noted."""
    for ensemble in ensembles(case):
        case.cleared += cleared(case, ensemble)
        suspects = _suspects(ensemble, times, alone)
        for atom in ensemble.atoms:
            own = suspects.get(id(atom.block))
            yield from at_atom(case, ensemble, atom, own, times, clear, alone, least, far)


def at_atom(
    case: Case,
    ensemble: Ensemble,
    atom: Atom,
    own: Steps | None,
    times: float,
    clear: float,
    alone: float,
    least: float,
    far: float,
) -> Iterator[Finding]:
    """What the energy says about the numbers of one atom; ``own`` if its gradient is unusual."""
    best = _explained(ensemble, own, times, alone) if own is not None else None
    verdict = None
    if best is not None and _is_good(best, times if best.others >= 3 else alone, far):
        verdict = best
    charge = ensemble.foreign(atom)
    if charge and (verdict is None or verdict.after > 100.0 * verdict.count):
        yield charge_finding(case, atom, charge)
        return
    if verdict is not None and abs(verdict.change) < least:
        verdict = None
    elif verdict is not None:
        yield number_finding(case, ensemble, verdict, clear)
    elif best is not None and best.before**0.5 >= (far if best.others >= 3 else 1.5 * far):
        yield puzzle_finding(case, best)
    told = verdict.number if verdict is not None else None
    astray = [
        stray
        for stray in ensemble.strays(atom)
        if stray.times >= (1.15 * times if stray.others >= 3 else 1.5 * alone)
        and stray.number != told
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
    return {id(own.atom.block): own for _, own in found[:_MOST]}


def _explained(ensemble: Ensemble, own: Steps, times: float, alone: float) -> Verdict | None:
    """The single number that explains an atom's gradient best."""
    expected = ensemble.usual(own)
    if ensemble.relativistic and expected.others < 3:
        return None
    # Following a number takes long, and an edited file has few new ones.
    enough = times if expected.others >= 3 else alone
    verdict = own.atom.once(
        f"explained against {expected.token} by {enough}",
        lambda: explain(own, ensemble.others(own.atom), expected, enough),
    )
    own.atom.forget()
    return replace(verdict, own=own) if verdict is not None else None


def _is_good(verdict: Verdict, enough: float, far: float) -> bool:
    """Whether a single number explains a gradient well enough to be held for wrong."""
    is_clear = verdict.significance >= enough
    explains = verdict.after < max(far**2, _LEFT * verdict.before)
    is_sharp = verdict.error < min(0.05, 0.25 * abs(verdict.change))
    return is_clear and explains and is_sharp


_LEFT = 0.05  # part of a large chi squared that a single number may leave unexplained
