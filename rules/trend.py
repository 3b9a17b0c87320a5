"""Trends along the periodic table: numbers that fall out of the progression of their row."""

from collections.abc import Iterator

import numpy as np

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.gap import spacing_oddities
from overlapse.rules.normalisation import spoiled_shells
from overlapse.rules.registry import rule
from overlapse.rules.rowwise.progressions import (
    Oddity,
    odd_coefficients,
    odd_exponents,
    oddest_of_shells,
)
from overlapse.rules.slips import Slip, likeliest


def _gather(case: Case) -> list[Oddity]:
    """Odd numbers of all sets, of each shell the oddest exponent or coefficient.

    Where the form is at fault, that has been reported.
    """
    return case.shared(
        "oddities",
        lambda: oddest_of_shells(
            [
                oddity
                for members in case.sets
                for oddity in (
                    *odd_exponents(members, _LEAST),
                    *odd_coefficients(members, _LEAST),
                )
                if not case.is_faulty(oddity.block, oddity.shell)
            ]
        ),
    )


_LEAST = 3.0  # deviates below which a number is not looked at


@rule("primitive.trend")
def trend(case: Case, *, surprise: float = 4.1, loud: float = 6.0) -> Iterator[Finding]:
    """Suspect: an exponent falls out of the progression of its row of the periodic table.

    Exponents of corresponding primitives run smoothly from element to element, and where an
    element goes its own way its other exponents go along.  So each is predicted from the same
    place in the other elements of its row, with the help of its neighbours in the block; a decimal
    point or digits that slipped leave one exponent alone outside.  It is a suspicion, since some
    published elements have an exponent of their own: the finding gives the value that the others
    suggest, with its spread, and the slip that would explain it.

    Formula: residual of ln(exponent) against the polynomial in ln Z through the other elements,
    alone and with a neighbouring exponent as companion, weighed by their scatters and expressed as
    a normal deviate.

    Source: G. A. Petersson, S. Zhong, J. A. Montgomery, M. J. Frisch, J. Chem. Phys. 118, 1101
    (2003) (smooth ln(exponent)); R. D. Cook, S. Weisberg, Residuals and Influence in Regression,
    Chapman and Hall 1982; G. K. Smyth, Stat. Appl. Genet. Mol. Biol. 3, article 3 (2004).

    Limits: surprise: deviates from which on an exponent is noted.  loud: from which on, for
    departures by more than a factor of two, it is a warning.  Measured: one note per 100 elements
    in 25 published sets of H-Kr, three in 21 others.

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
    for odd in _gather(case):
        if odd.column is None and odd.surprise >= surprise:
            is_far = odd.surprise >= loud and abs(odd.departure) >= np.log(2.0)
            # Two witnesses that agree make a warning.
            is_far = is_far or (id(odd.block), odd.shell) in spaced
            yield _finding(case, odd, "exponent", is_far, surprise)


@rule("contraction.trend")
def coefficients(case: Case, *, surprise: float = 5.2, loud: float = 6.0) -> Iterator[Finding]:
    """Suspect: a coefficient falls out of the progression of its row of the periodic table.

    The coefficients at one place of corresponding contractions run smoothly from element to
    element and keep their signs.  One with the wrong sign, or with a digit that slipped, stands
    alone outside, also where contractions are printed unnormalised and their norm tells nothing.

    Formula: as for exponents (`primitive.trend`), with the coefficient in units of its usual size;
    the neighbours in the contraction and in the next column are companions.

    Source: R. D. Cook, S. Weisberg, Residuals and Influence in Regression, Chapman and Hall 1982;
    G. K. Smyth, Stat. Appl. Genet. Mol. Biol. 3, article 3 (2004).

    Limits: surprise: deviates from which on a coefficient is noted.  loud: from which on a
    coefficient of the wrong sign is a warning.

    Remedy: compare the number with the original publication.

    Bad::

        B 0
        S 2 1.00
          2.0 0.40
          0.5 0.70
        ****
        C 0
        S 2 1.00
          3.1 0.41
          0.8 0.69
        ****
        N 0
        S 2 1.00
          4.3 -0.42
          1.1 0.68
        ****
        O 0
        S 2 1.00
          5.8 0.43
          1.5 0.67
        ****
        F 0
        S 2 1.00
          7.5 0.44
          1.9 0.66
        ****
        Ne 0
        S 2 1.00
          9.4 0.45
          2.4 0.65
        ****

    Good::

        B 0
        S 2 1.00
          2.0 0.40
          0.5 0.70
        ****
        C 0
        S 2 1.00
          3.1 0.41
          0.8 0.69
        ****
        N 0
        S 2 1.00
          4.3 0.42
          1.1 0.68
        ****
        O 0
        S 2 1.00
          5.8 0.43
          1.5 0.67
        ****
        F 0
        S 2 1.00
          7.5 0.44
          1.9 0.66
        ****
        Ne 0
        S 2 1.00
          9.4 0.45
          2.4 0.65
        ****
    """
    spoiled = spoiled_shells(case)
    for odd in _gather(case):
        # Where the norm tells of a wrong number, it names the culprit with the row's help.
        if (id(odd.block), odd.shell) in spoiled:
            continue
        if odd.column is not None and odd.surprise >= surprise:
            value = float(odd.block.shells[odd.shell].coefficients[odd.row, odd.column])
            is_far = odd.surprise >= loud and odd.low <= -value <= odd.high
            yield _finding(case, odd, "coefficient", is_far, surprise)


def _finding(case: Case, odd: Oddity, what: str, is_far: bool, limit: float) -> Finding:
    shell = odd.block.shells[odd.shell]
    word = shell.spelling(odd.row, odd.column)
    slip = _slip(odd, word)
    message = (
        f"suspect: {what} {word} falls out of its row, where {odd.others} other elements suggest "
        f"{odd.expected:.4g} ({odd.low:.4g} to {odd.high:.4g})"
    )
    if slip is not None:
        message += f"; {slip.told}: {slip.word} would fit"
    table = shell.exponents if odd.column is None else shell.coefficients[:, odd.column]
    value = float(table[odd.row])
    return case.at_shell(
        odd.block,
        odd.shell,
        "warning" if is_far else "note",
        message,
        row=odd.row,
        column=odd.column,
        measured=value,
        limit=odd.high if value > odd.high else odd.low,
        expected=slip.value if slip is not None else float(f"{odd.expected:.4g}"),
        witnesses=(f"{odd.surprise:.1f} standard deviations off the row; {limit:g} are noted",),
        remedy="compare with the original publication: digits, sign or point may have slipped",
    )


def _slip(odd: Oddity, word: str) -> Slip | None:
    """The slip that explains a departure; a wrong sign goes before all others."""
    number = likeliest(word, odd.low, odd.high, odd.expected)
    if odd.column is not None:
        turned = word[1:] if word.startswith("-") else f"-{word.lstrip('+')}"
        value = -float(odd.block.shells[odd.shell].coefficients[odd.row, odd.column])
        if odd.low <= value <= odd.high:
            return Slip(turned, value, "sign lost or added")
    return number
