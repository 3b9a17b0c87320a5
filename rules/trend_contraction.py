"""Trends of contractions: coefficients that fall out of the progression of their row."""

from collections.abc import Iterator

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.normalisation import spoiled_shells
from overlapse.rules.registry import rule
from overlapse.rules.rowwise.norms import is_vouched
from overlapse.rules.rowwise.odd_told import REMEDY, number_at, oddities, told, turned_word
from overlapse.rules.rowwise.signs import OddSign, odd_signs


@rule("contraction.trend")
def coefficients(case: Case, *, surprise: float = 5.5, loud: float = 12.0) -> Iterator[Finding]:
    """Suspect: a coefficient falls out of the progression of its row of the periodic table.

    The coefficients at one place of corresponding contractions run smoothly from element to
    element and keep their signs.  One with the wrong sign, or with a digit that slipped, stands
    alone outside, also where contractions are printed unnormalised and their norm tells nothing.
    The pattern of signs is also compared with that of the two nearest elements, since the s block
    has no row.

    Formula: as for exponents (`primitive.trend`), with the coefficient in units of its usual size;
    the neighbours in the contraction and in the next column are companions.

    Source: R. D. Cook, S. Weisberg, Residuals and Influence in Regression, Chapman and Hall 1982;
    G. K. Smyth, Stat. Appl. Genet. Mol. Biol. 3, article 3 (2004).

    Limits: surprise: departure, in units of its spread, from which on a coefficient is noted; it
    rises with the part of the set's elements that hold such coefficients.  loud: from which on a
    coefficient of the wrong sign is a warning.  Drawn from 46 published sets of H-Kr: of their
    elements one in 50 holds a coefficient that is noted, and of coefficients changed by 10 % in
    rows two in three are.

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
    # Where the norm tells of a wrong number, it names the culprit with the row's help.
    silent = set(spoiled_shells(case))
    for odd in oddities(case):
        key = id(odd.block), odd.shell
        if key in silent or odd.column is None or odd.surprise < surprise * odd.strictness:
            continue
        value = number_at(odd.block, odd.shell, odd.row, odd.column)
        is_far = odd.surprise >= loud * odd.strictness and odd.low <= -value <= odd.high
        silent.add(key)
        yield told(case, odd, "warning" if is_far else "note", surprise)
    for members, norms in zip(case.sets, case.norms, strict=True):
        for sign in odd_signs(members):
            key = id(sign.block), sign.shell
            value = number_at(sign.block, sign.shell, sign.row, sign.column)
            place = sign.block, sign.shell, sign.row, sign.column
            if key not in silent and not is_vouched(norms, *place, -value):
                silent.add(key)
                yield _turned(case, sign, value)


def _turned(case: Case, odd: OddSign, value: float) -> Finding:
    word = odd.block.shells[odd.shell].spelling(odd.row, odd.column)
    return case.at_shell(
        odd.block,
        odd.shell,
        "warning" if len(odd.beside) > 1 else "note",
        f"suspect: coefficient {word} has another sign than in the same place of "
        f"{' and '.join(odd.beside)}, while all others of the contraction agree; "
        f"sign lost or added: {turned_word(word)} would fit",
        row=odd.row,
        column=odd.column,
        measured=value,
        expected=-value,
        witnesses=("the pattern of signs of the neighbouring elements",),
        remedy=REMEDY,
    )
