"""Findings about numbers that an atom's energy suspects, with all that speaks for them."""

from math import floor, inf, log10

import numpy as np

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.model import Block
from overlapse.rules.atomic.atoms import Atom, Number
from overlapse.rules.atomic.columns import Stray
from overlapse.rules.atomic.energies import Ensemble
from overlapse.rules.atomic.explained import Verdict, by_row
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.physics.onecentre import self_overlap
from overlapse.rules.slips import TELLING, Slip, likely

_SMALL = 5e-3  # relative changes below it are notes without a second witness
_REMEDY = "compare with the original publication"


def number_finding(case: Case, ensemble: Ensemble, verdict: Verdict, clear: float) -> Finding:
    """A finding about the number that explains an atom's gradient."""
    atom, number = verdict.own.atom, verdict.number
    word, slip, expected, spread = _proposal(atom, number, verdict.value, verdict.error)
    against = (
        f"that of {verdict.others} neighbours" if verdict.others >= 3 else "what the set shows"
    )
    witnesses = [
        f"stationarity: a change of {verdict.change:+.2%} explains the gradient, "
        f"{verdict.significance:.0f} standard errors from {against}"
    ]
    others = _others(case, ensemble, atom, number, verdict.value)
    witnesses += others + _of_block(case, atom.block)
    if slip is not None:
        witnesses.append(f"slip: {slip.told} in {slip.word} gives {word}")
    is_far = abs(verdict.change) >= _SMALL
    enough = clear if verdict.others >= 3 else 2.5 * clear
    is_sure = is_far and verdict.significance >= enough
    # A slip may fit by chance; another witness that agrees is enough.
    fits = slip is not None and slip.told in TELLING and verdict.significance >= 0.5 * clear
    is_sure = is_sure or bool(others) or fits
    what = "exponent" if number.column is None else "coefficient"
    return _at(
        case,
        atom.block,
        number,
        "warning" if is_sure else "note",
        f"suspect: {what} {word} should be {spread}: with it the atom's energy is stationary, "
        f"as it is with the other numbers",
        expected,
        tuple(witnesses),
    )


def puzzle_finding(case: Case, verdict: Verdict) -> Finding:
    """A finding about an atom whose gradient is large and that no single number explains well."""
    atom, number = verdict.own.atom, verdict.number
    word = atom.block.shells[number.shell].spelling(number.row, number.column)
    what = "exponent" if number.column is None else "coefficient"
    return _at(
        case,
        atom.block,
        number,
        "note",
        f"suspect: the energy of {atom.block.symbol} is far from stationary, and no single number "
        f"explains it well; the likeliest is {what} {word}, as if {verdict.value:.4g} were meant",
        None,
        (
            f"stationarity: the gradient is {verdict.before**0.5:.0f} standard errors from what is "
            f"usual in the set, {verdict.after**0.5:.0f} with that number",
            *_of_block(case, atom.block),
        ),
    )


def column_finding(case: Case, ensemble: Ensemble, stray: Stray, clear: float) -> Finding:
    """A finding about a coefficient that is not its orbital's; a note if ``clear`` is infinite."""
    word, slip, expected, spread = _proposal(stray.atom, stray.number, stray.value, stray.error)
    witnesses = [
        f"orbital: {stray.times:.0f} times the departure of its neighbours from the atom's orbital"
    ]
    others = _others(case, ensemble, stray.atom, stray.number, stray.value)
    witnesses += others + _of_block(case, stray.atom.block)
    if slip is not None:
        witnesses.append(f"slip: {slip.told} in {slip.word} gives {word}")
    agreed = bool(others) or (slip is not None and slip.told in TELLING)
    enough = 0.5 * clear if agreed else clear
    is_sure = stray.others >= 3 and clear < inf and stray.times >= enough
    return _at(
        case,
        stray.atom.block,
        stray.number,
        "warning" if is_sure else "note",
        f"suspect: coefficient {word} should be {spread}: the column is an orbital of the atom "
        "but for this number",
        expected,
        tuple(witnesses),
    )


def charge_finding(case: Case, atom: Atom, charge: int) -> Finding:
    """A finding about a block whose functions all suit another element."""
    block = atom.block
    return case.at_line(
        block.line,
        "warning",
        f"suspect: the functions of {block.symbol} are made for a nuclear charge of about {charge} "
        f"({symbol_of(charge)}), not {block.atomic_number}: the block of another element, or a "
        "gross slip in its core",
        element=block.symbol,
        measured=charge,
        limit=block.atomic_number,
        expected=block.atomic_number,
        witnesses=(
            f"virial: the energy would be least with all exponents times "
            f"{(atom.scaling or 1.0) ** 2:.4f}",
            *_of_block(case, block),
        ),
        remedy="compare the block with those of its neighbours and with the original publication",
    )


def _proposal(
    atom: Atom, number: Number, value: float, error: float
) -> tuple[str, Slip | None, float, str]:
    """The number as typed, the slip that made it, what should have stood there, and in words."""
    shell = atom.block.shells[number.shell]
    word = shell.spelling(number.row, number.column)
    slip = likely(word, value, error)
    if slip is not None:
        return word, slip, slip.value, slip.word
    size = abs(value) * max(error, 1e-6)
    places = max(0, -floor(log10(size))) if size > 0.0 else 8
    rounded = float(f"{value:.{min(places, 15)}f}") or value
    return word, None, rounded, f"{rounded:.10g} +- {size:.1g}"


def _others(case: Case, ensemble: Ensemble, atom: Atom, number: Number, value: float) -> list[str]:
    """Witnesses besides the energy that agree with it."""
    printed = atom.value(number)
    found = _found(case, atom.block, number, printed, value)
    steps = ensemble.steps(atom)
    if steps is not None:
        for each, suggested, far in by_row(steps, ensemble.others(atom)):
            nearer = abs(suggested - value) < 0.5 * abs(suggested - printed)
            if each == number and far > 4.0 and nearer:
                found.append(f"trend: the neighbours suggest about {suggested:.4g}")
    found += _norm(atom, number, value)
    return found


# Rules that look at numbers without the atom, by what they are called as witnesses.
_BESIDE = {
    "primitive": "other primitives",
    "contraction": "other contractions",
    "drift": "another file",
    "label.contains": "a related set",
}


def _found(case: Case, block: Block, number: Number, printed: float, value: float) -> list[str]:
    """What other rules say of the same number, where they do not contradict."""
    shell = block.shells[number.shell]
    if shell.cells is None:
        return []
    place = shell.place(number.row, number.column)
    told = []
    for finding in (f for found in case.found.values() for f in found):
        what = _BESIDE.get(finding.rule) or _BESIDE.get(finding.rule.partition(".")[0])
        if what is None or (finding.line, finding.column) != (place.line, place.column):
            continue
        expected = finding.expected
        if expected is None:
            told.append(f"{what}: {finding.rule} points at this number")
        elif not isinstance(expected, str) and abs(expected - value) < 0.5 * abs(printed - value):
            told.append(f"{what}: {finding.rule} asks for {expected:.4g}")
    return told


# Rules about whole blocks, by what they are called as witnesses.
_WHOLE = {
    "energy.loss": "energy loss",
    "label.composition": "counts",
    "label.split": "counts",
    "label.family": "counts",
    "shell.neighbour": "charge",
}


def _of_block(case: Case, block: Block) -> list[str]:
    """What is said of the block as a whole; it does not single out a number, so it only adds."""
    return [
        f"{what}: {finding.message.removeprefix('suspect: ')}"
        for rule, what in _WHOLE.items()
        for finding in case.found.get(rule, ())
        if finding.element == block.symbol
        and any(finding.line in (block.line, shell.line) for shell in block.shells)
    ]


def _norm(atom: Atom, number: Number, value: float) -> list[str]:
    """The self-overlap of a contraction, if the new value brings it to one."""
    shell = atom.block.shells[number.shell]
    for function in shell.functions():
        if len(function.exponents) < 2 or number.row not in function.rows:
            continue
        if number.column is not None and number.column != function.column:
            continue
        at = int(np.flatnonzero(function.rows == number.row)[0])
        exponents, coefficients = function.exponents.copy(), function.coefficients.copy()
        if number.column is None:
            exponents[at] = value
        else:
            coefficients[at] = value
        before = self_overlap(function.exponents, function.coefficients, function.l)
        after = self_overlap(exponents, coefficients, function.l)
        if abs(before - 1.0) > 1e-4 and abs(after - 1.0) < 0.1 * abs(before - 1.0):
            return [f"norm: the self-overlap {before:.6f} becomes {after:.6f}"]
    return []


def _at(
    case: Case,
    block: Block,
    number: Number,
    severity: str,
    message: str,
    expected: float | None,
    witnesses: tuple[str, ...],
) -> Finding:
    shell = block.shells[number.shell]
    function = next((f for f in shell.functions() if f.column == number.column), None)
    return case.at_shell(
        block,
        number.shell,
        severity,  # type: ignore[arg-type]
        message,
        function=function,
        row=number.row,
        column=number.column,
        measured=shell.number(number.row, number.column),
        expected=expected,
        witnesses=witnesses,
        remedy=_REMEDY,
    )
