"""Trends: exponents that fall out of the progression of their row, or of their own shell."""

from collections.abc import Iterator

import numpy as np

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.gap import spacing_oddities
from overlapse.rules.registry import rule
from overlapse.rules.rowwise.alongside import Step
from overlapse.rules.rowwise.odd_told import REMEDY, borrowed, oddities, slip_of, steps, told
from overlapse.rules.slips import likeliest


@rule("primitive.trend")
def trend(
    case: Case, *, surprise: float = 7.0, step: float = 6.0, loud: float = 12.0
) -> Iterator[Finding]:
    """Suspect: an exponent falls out of the progression of its row of the periodic table.

    Exponents of corresponding primitives run smoothly from element to element, and where an
    element goes its own way its other exponents go along.  So each is predicted from the same
    place in the other elements of its row, with the help of its neighbours in the block; a decimal
    point or digits that slipped leave one exponent alone outside, and all others in order once it
    is put right.  Where no row is at hand (hydrogen, helium, the s block, files of few elements)
    the step of ln(exponent) to a neighbouring element must change evenly along the shell, and
    where there is no neighbour ln(exponent) itself.  It is a suspicion, since some published
    elements have an exponent of their own: the finding gives the value that the others suggest,
    with its spread, and the slip that would explain it.

    Formula: departure of ln(exponent) from the polynomial in ln Z through the other elements,
    alone and with a neighbouring exponent as companion, weighed by their spreads and in units of
    the best of them; departure of the step to the next element from the cubic through the steps
    around it, in units of their range; departure from the Legendre polynomial of third order
    through the other exponents of the shell.

    Source: G. A. Petersson, S. Zhong, J. A. Montgomery, M. J. Frisch, J. Chem. Phys. 118, 1101
    (2003) (smooth ln(exponent), Legendre polynomials); R. D. Cook, S. Weisberg, Residuals and
    Influence in Regression, Chapman and Hall 1982; G. K. Smyth, Stat. Appl. Genet. Mol. Biol. 3,
    article 3 (2004).

    Limits: surprise: departure from the row, in units of its spread, from which on an exponent is
    noted; it rises with the part of the set's elements that hold such exponents, and where row and
    shell agree five are enough.  step: the same for the shell.  loud: from which on, for departures
    by more than a factor of two that one slip explains, it is a warning.  Drawn from 46 published
    sets of H-Kr: of their elements one in 60 holds an exponent that is noted, and of exponents
    changed by 10 % in rows five in six are.

    Remedy: compare the number with the original publication.

    Bad::

        B 0
        S 1 1.00
          0.105 1.0
        ****
        C 0
        S 1 1.00
          1.55 1.0
        ****
        N 0
        S 1 1.00
          0.21 1.0
        ****
        O 0
        S 1 1.00
          0.28 1.0
        ****
        F 0
        S 1 1.00
          0.355 1.0
        ****
        Ne 0
        S 1 1.00
          0.44 1.0
        ****

    Good::

        B 0
        S 1 1.00
          0.105 1.0
        ****
        C 0
        S 1 1.00
          0.155 1.0
        ****
        N 0
        S 1 1.00
          0.21 1.0
        ****
        O 0
        S 1 1.00
          0.28 1.0
        ****
        F 0
        S 1 1.00
          0.355 1.0
        ****
        Ne 0
        S 1 1.00
          0.44 1.0
        ****
    """
    spaced = {odd.shell for odd in spacing_oddities(case)}
    beside = {(id(odd.block), odd.shell): odd for odd in steps(case, step)}
    for odd in oddities(case):
        if odd.column is not None:
            continue
        key = id(odd.block), odd.shell
        other = beside.get(key)
        is_confirmed = other is not None and other.row == odd.row
        if odd.surprise < surprise * odd.strictness and not is_confirmed:
            continue
        beside.pop(key, None)
        # Two witnesses that agree make a warning; one of them may be a slip that fits.
        is_far = odd.surprise >= loud * odd.strictness and abs(odd.departure) >= np.log(2.0)
        is_loud = is_far and slip_of(odd) is not None
        is_loud = is_loud or key in spaced or (is_confirmed and abs(odd.departure) > 0.2)
        agreed = ("the steps to the neighbouring elements along the shell agree",)
        yield told(
            case, odd, "warning" if is_loud else "note", surprise, agreed if is_confirmed else ()
        )
    for key, odd_step in beside.items():
        yield _out_of_step(case, odd_step, key in spaced, step)


def _out_of_step(case: Case, odd: Step, is_spaced: bool, limit: float) -> Finding:
    shell = odd.block.shells[odd.shell]
    word = shell.spelling(odd.row)
    value = float(shell.exponents[odd.row])
    low, high = (odd.expected * float(np.exp(side * odd.spread)) for side in (-1.5, 1.5))
    slip = likeliest(word, low, high, odd.expected)
    against = (
        f"the steps to {' and '.join(odd.beside)} at the other places" if odd.beside
        else "the other exponents of this shell"
    )  # fmt: skip
    message = (
        f"suspect: exponent {word} falls out of its shell, where {against} suggest "
        f"{odd.expected:.4g} ({low:.4g} to {high:.4g})"
    )
    if place := borrowed(case, odd.block, odd.shell, odd.row, None):
        message += f"; it is the number of {place}"
    elif slip is not None:
        message += f"; {slip.told}: {slip.word} would fit"
    if odd.either:
        message += f"; or the exponent of {odd.either} in this place is wrong"
    return case.at_shell(
        odd.block,
        odd.shell,
        "warning" if is_spaced else "note",
        message,
        row=odd.row,
        measured=value,
        limit=high if value > high else low,
        expected=slip.value if slip is not None else float(f"{odd.expected:.4g}"),
        witnesses=(
            f"off by {odd.surprise:.1f} times the unevenness around it; {limit:g} are noted",
        ),
        remedy=REMEDY,
    )
