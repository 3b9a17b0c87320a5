"""Trends of contractions: coefficients that fall out of the progression of their row."""

from collections.abc import Iterator

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.normalisation import spoiled_shells
from overlapse.rules.registry import rule
from overlapse.rules.rowwise.norms import is_vouched
from overlapse.rules.rowwise.odd_told import REMEDY, oddities, told
from overlapse.rules.rowwise.overlaps import OddOverlap, odd_overlaps
from overlapse.rules.rowwise.signs import OddSign, odd_signs
from overlapse.rules.slips import likeliest, turned


@rule("contraction.trend")
def coefficients(
    case: Case, *, surprise: float = 7.0, overlap: float = 12.0, loud: float = 12.0
) -> Iterator[Finding]:
    """Suspect: a coefficient falls out of the progression of its row of the periodic table.

    The coefficients at one place of corresponding contractions run smoothly from element to
    element and keep their signs.  One with the wrong sign, or with a digit that slipped, stands
    alone outside, also where contractions are printed unnormalised and their norm tells nothing.
    The pattern of signs is also compared with that of the two nearest elements, since the s block
    has no row.  And the overlaps of the contractions of one l run smoothly, or vanish throughout
    where they are orbitals: where one coefficient with another value puts all of them in order, it
    is the wrong one.

    Formula: as for exponents (`primitive.trend`), with the coefficient in units of its usual size;
    the neighbours in the contraction and in the next column are companions.  Overlaps S_jk =
    sum_ab c_ja c_kb <a|b> against polynomials in ln Z through those of the other elements.

    Source: R. D. Cook, S. Weisberg, Residuals and Influence in Regression, Chapman and Hall 1982;
    G. K. Smyth, Stat. Appl. Genet. Mol. Biol. 3, article 3 (2004); contractions as orbitals, hence
    orthonormal: R. C. Raffenetti, J. Chem. Phys. 58, 4452 (1973).

    Limits: surprise: departure, in units of its spread, from which on a coefficient is noted; it
    rises with the part of the set's elements that hold such coefficients.  overlap: the same for
    overlaps.  loud: from which on a coefficient of the wrong sign is a warning; so is one of which
    row and overlaps agree.  Drawn from 46 published sets of H-Kr: of their elements one in 50 holds
    a coefficient that is noted, and of coefficients changed by 10 % in rows two in three are.

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
    integrals = {(id(odd.block), odd.shell): odd for odd in _overlaps(case, overlap)}
    for odd in oddities(case):
        key = id(odd.block), odd.shell
        if odd.column is None:
            # A wrong exponent moves overlaps as well.
            if odd.surprise >= surprise * odd.strictness:
                silent.add(key)
            continue
        if key in silent:
            continue
        other = integrals.get(key)
        is_confirmed = other is not None and (other.row, other.column) == (odd.row, odd.column)
        if odd.surprise < surprise * odd.strictness and not is_confirmed:
            continue
        value = odd.value
        is_far = odd.surprise >= loud * odd.strictness and odd.low <= -value <= odd.high
        silent.add(key)
        # Two witnesses that agree make a warning.
        agreed = ("the overlaps of these contractions agree",) if is_confirmed else ()
        yield told(case, odd, "warning" if is_far or is_confirmed else "note", surprise, agreed)
    for key, odd_overlap in integrals.items():
        if key not in silent:
            silent.add(key)
            yield _overlapping(case, odd_overlap, overlap)
    for members, norms in zip(case.sets, case.norms, strict=True):
        for sign in odd_signs(members):
            key = id(sign.block), sign.shell
            value = sign.block.shells[sign.shell].number(sign.row, sign.column)
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
        f"sign lost or added: {turned(word)} would fit",
        row=odd.row,
        column=odd.column,
        measured=value,
        expected=-value,
        witnesses=("the pattern of signs of the neighbouring elements",),
        remedy=REMEDY,
    )


def _overlaps(case: Case, least: float) -> list[OddOverlap]:
    return [
        odd
        for members, norms in zip(case.sets, case.norms, strict=True)
        for odd in odd_overlaps(members, least)
        if odd.is_alone
        and not case.is_faulty(odd.block, odd.shell)
        and not is_vouched(norms, odd.block, odd.shell, odd.row, odd.column, odd.expected)
    ]


def _overlapping(case: Case, odd: OddOverlap, limit: float) -> Finding:
    word = odd.block.shells[odd.shell].spelling(odd.row, odd.column)
    low, high = sorted((odd.expected - 2.0 * odd.spread, odd.expected + 2.0 * odd.spread))
    slip = likeliest(word, low, high, odd.expected)
    what = "self-overlap of" if odd.left == odd.right else f"overlap of {odd.left} and"
    message = (
        f"suspect: the {what} {odd.right} is {odd.overlap:.5f} where {odd.others} other elements "
        f"of the row suggest {odd.usual:.5f}; coefficient {word} is the likeliest culprit, with "
        f"{odd.expected:.5g} the overlaps are in order"
    )
    if slip is not None:
        message += f"; {slip.told}: {slip.word} would fit"
    return case.at_shell(
        odd.block,
        odd.shell,
        "note",
        message,
        row=odd.row,
        column=odd.column,
        measured=odd.overlap,
        limit=odd.usual,
        expected=slip.value if slip is not None else float(f"{odd.expected:.5g}"),
        witnesses=(
            f"off the row by {odd.surprise:.1f} times the spread; {limit:g} are noted",
            f"one number explains all, {odd.rest:.1f} is left",
        ),
        remedy=REMEDY,
    )
