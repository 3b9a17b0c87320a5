"""Plain measures of numbers: how large they are and with how many digits they are printed."""

from collections.abc import Iterator

import numpy as np

from overlapse.grammar.model import Block, letter_of
from overlapse.grammar.numbers import NUMBER
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.physics.trends import quantile
from overlapse.rules.registry import rule


@rule("primitive.range")
def extent(case: Case, *, margin: float = 1.2, fewest: int = 8) -> Iterator[Finding]:
    """Suspect: the loosest exponent of some l is far from those of all other elements of the set.

    The loosest function of each l follows the size of the atom's valence shell, which varies by a
    factor of ten or so over the whole table.  One that lies well outside the range of all other
    elements has lost or gained a digit.  Elements without a row to be compared with are judged as
    well.

    Formula: ln of the smallest exponent of l against the range in the other elements.

    Source: common practice, no source; with this limit two exponents of 46 published sets of H-Kr
    (1,536 element blocks) are noted.

    Limits: margin: by how much ln(exponent) may lie outside the range of the others (1.2 is a
    factor of 3.3).  fewest: other elements needed.

    Remedy: compare the number with the original publication.

    Bad::

        B 0
        D 1 1.00
          0.34 1.0
        ****
        C 0
        D 1 1.00
          0.55 1.0
        ****
        N 0
        D 1 1.00
          0.0082 1.0
        ****
        O 0
        D 1 1.00
          1.18 1.0
        ****
        F 0
        D 1 1.00
          1.64 1.0
        ****
        Ne 0
        D 1 1.00
          2.20 1.0
        ****
        Al 0
        D 1 1.00
          0.19 1.0
        ****
        Si 0
        D 1 1.00
          0.28 1.0
        ****
        P 0
        D 1 1.00
          0.37 1.0
        ****

    Good::

        B 0
        D 1 1.00
          0.34 1.0
        ****
        C 0
        D 1 1.00
          0.55 1.0
        ****
        N 0
        D 1 1.00
          0.82 1.0
        ****
    """
    for members in case.sets:
        loosest: dict[int, dict[int, tuple[Block, int, int, float]]] = {}
        for block in members.blocks:
            for index, shell in enumerate(block.shells):
                if (shell.exponents > 0.0).all():
                    row = int(shell.exponents.argmin())
                    value = float(np.log(shell.exponents[row]))
                    for l in shell.angular:
                        best = loosest.setdefault(l, {}).get(id(block))
                        if best is None or value < best[3]:
                            loosest[l][id(block)] = block, index, row, value
        told: set[tuple[int, int]] = set()
        for l, found in loosest.items():
            if len(found) <= fewest:
                continue
            places = sorted(found.values(), key=lambda place: place[3])
            low, high = places[1][3], places[-2][3]
            for block, index, row, value in (places[0], places[-1]):
                if max(low - value, value - high) > margin and (id(block), index) not in told:
                    told.add((id(block), index))
                    shell = block.shells[index]
                    yield case.at_shell(
                        block,
                        index,
                        "note",
                        f"suspect: the loosest {letter_of(l)} exponent {shell.spelling(row)} lies "
                        f"far outside the range of the other {len(found) - 1} elements, "
                        f"{np.exp(low):.4g} to {np.exp(high):.4g}",
                        row=row,
                        measured=float(np.exp(value)),
                        limit=float(np.exp(low if value < low else high)),
                        witnesses=("range of the other elements",),
                        remedy="compare with the original publication: the point may have slipped",
                    )


@rule("primitive.digits")
def digits(case: Case, *, lost: int = 4, fewest: int = 4) -> Iterator[Finding]:
    """Suspect: an exponent of a contraction is printed with far fewer digits than its companions.

    The exponents of one contraction come from one optimisation and are printed alike.  Where all
    others carry seven or more significant digits and one carries three, digits were cut off or the
    line was broken.  Lone functions, also those in a matrix of several contractions, are rounded
    in good faith and are not judged; neither are zeros at the end, which may be mere padding.

    Formula: significant digits of an exponent against the fewest of the others in its contraction.

    Source: common practice, no source; no contraction of 46 published sets of H-Kr (1,536 element
    blocks) has an exponent four digits shorter than all its companions.

    Limits: lost: digits by which it must be shorter than the shortest of the others.  fewest:
    exponents that a contraction must have.

    Remedy: restore the digits from the source.

    Bad::

        C 0
        S 4 1.00
          1238.4016938 0.0054
          186.29004992 0.0406
          42.2 0.1803
          11.676557932 0.4632
        ****

    Good::

        C 0
        S 4 1.00
          1238.4016938 0.0054
          186.29004992 0.0406
          42.251176346 0.1803
          11.676557932 0.4632
        ****
    """
    for block in case.document.blocks:
        for index, shell in enumerate(block.shells):
            # Matrices hold lone functions as well, which are rounded in good faith.
            if len(shell.exponents) < fewest or shell.columns_per_l > 1:
                continue
            counts = [significant(repr(value)) for value in shell.exponents.tolist()]
            row = counts.index(min(counts))
            others = counts[:row] + counts[row + 1 :]
            usual = int(quantile(others, 0.5))
            if min(others) - counts[row] >= lost and counts[row] > 0:
                yield case.at_shell(
                    block,
                    index,
                    "note",
                    f"suspect: exponent {shell.spelling(row)} has {counts[row]} significant "
                    f"digit{'s' * (counts[row] != 1)}, the others of its contraction "
                    f"{min(others)} or more, usually {usual}",
                    row=row,
                    measured=counts[row],
                    limit=min(others),
                    witnesses=("printed digits of the companions",),
                    remedy="restore the digits from the source",
                )


def significant(word: str) -> int:
    """Significant digits of a printed number, without zeros at its end; 0 for no number."""
    if not NUMBER.fullmatch(word):
        return 0
    mantissa = word.upper().replace("D", "E").partition("E")[0]
    return len(mantissa.lstrip("+-").replace(".", "").lstrip("0").rstrip("0"))
