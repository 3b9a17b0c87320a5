"""Labels: does the set hold what its family holds, and in the family's kind of functions?"""

from collections.abc import Iterator

from overlapse.grammar.model import Block
from overlapse.rules.case import Case
from overlapse.rules.families.kinds import usual_kind
from overlapse.rules.finding import Finding
from overlapse.rules.label import differing
from overlapse.rules.labels.composition import function_counts
from overlapse.rules.labels.labelling import Judged, judged
from overlapse.rules.registry import rule


@rule("label.family")
def family(case: Case) -> Iterator[Finding]:
    """The numbers of functions or of primitives are not those of the family that the label names.

    The correlation-consistent sets follow formulas in their cardinal number n: carbon has n+1 s, n
    p, n-1 d and n-2 f functions and so on.  For the other families the composition of each element
    is on record.  A function too few or too many means that a shell was lost or added, or that the
    set is another one than its label says; a primitive too few, that a row was lost.  Irregular
    elements are known and taken into account.  Elements that a set was not published for are named
    in a note and not judged.

    Formula: cc-pVXZ with n = X: H-He: n s and n-l of each other l; Li-Ne: n+1 s and n-l+1; Na-Ar:
    n+2 s, n+1 p and n-l+1; Ca, Ga-Kr: n+3 s, n+2 p, n d and n-l+1; Sc-Zn: n+4 s, n+3 p, n+1 d and
    n-l+2.  aug- adds one of every l present, (X+d) a d function for Al-Ar, C and wC tight
    functions.

    Source: T. H. Dunning, J. Chem. Phys. 90, 1007 (1989); D. E. Woon, T. H. Dunning, J. Chem. Phys.
    98, 1358 (1993); 103, 4572 (1995); F. Weigend, R. Ahlrichs, Phys. Chem. Chem. Phys. 7, 3297
    (2005); F. Jensen, J. Chem. Phys. 115, 9113 (2001); others: see the families' data files.

    Remedy: restore what was lost, or correct the label.

    Bad::

        ! label: cc-pVDZ
        H 0
        S 3 1.00
          13.0 0.02
          2.0 0.14
          0.4 0.5
        S 1 1.00
          0.12 1.0
        P 1 1.00
          0.7 1.0
        P 1 1.00
          0.2 1.0
        ****

    Good::

        ! label: cc-pVDZ
        H 0
        S 3 1.00
          13.0 0.02
          2.0 0.14
          0.4 0.5
        S 1 1.00
          0.12 1.0
        P 1 1.00
          0.7 1.0
        ****
    """
    yield from differing(case, "family")
    for claim in judged(case):
        if claim.undefined and claim.verdicts and not claim.label_is_wrong:
            yield _undefined(case, claim)


def _undefined(case: Case, claim: Judged) -> Finding:
    symbols = [block.symbol for block in claim.undefined]
    return case.at_line(
        claim.undefined[0].line,
        "note",
        f"{claim.label} ({claim.claim.where}) is not defined for {', '.join(symbols)}, so the "
        "label was not held against them",
        element=symbols[0],
        measured=len(symbols),
        limit=0,
        remedy="make sure where these elements come from",
    )


@rule("label.cartesian")
def cartesian(case: Case) -> Iterator[Finding]:
    """The set is marked spherical where its family is used with Cartesian functions, or vice versa.

    A Cartesian d shell has six functions instead of five, an f shell ten instead of seven; the
    additional ones are an s function and p functions of a tighter kind.  The same numbers then give
    another energy, by 0.2 to 2 millihartree for each heavy atom in a double zeta set, and energies
    of the two kinds must not be compared.  3-21G and 6-31G with their decorations were made with
    Cartesian functions, 6-311G and nearly everything since with spherical ones.

    Formula: (l+1)(l+2)/2 Cartesian against 2l+1 spherical functions.

    Source: P. C. Hariharan, J. A. Pople, Theor. Chim. Acta 28, 213 (1973); R. Krishnan, J. S.
    Binkley, R. Seeger, J. A. Pople, J. Chem. Phys. 72, 650 (1980); later families: common practice.

    Remedy: change the mark, or keep to it knowingly and say so with the results.

    Bad::

        basis "H_cc-pVTZ" CARTESIAN
        H S
         33.0 0.006
         5.0 0.045
         1.1 0.2
        H S
         0.3 1.0
        H S
         0.1 1.0
        H P
         1.4 1.0
        H P
         0.4 1.0
        H D
         1.0 1.0
        end

    Good::

        basis "H_cc-pVTZ" SPHERICAL
        H S
         33.0 0.006
         5.0 0.045
         1.1 0.2
        H S
         0.3 1.0
        H S
         0.1 1.0
        H P
         1.4 1.0
        H P
         0.4 1.0
        H D
         1.0 1.0
        end
    """
    for claim in judged(case):
        usual = usual_kind(claim.label)
        blocks = [b for b in claim.members.blocks if b.functions and max(b.counts, default=0) > 1]
        other = [block for block in blocks if block.functions != usual]
        if usual and other and not claim.label_is_wrong:
            yield _marked(case, claim, other, usual)


def _marked(case: Case, claim: Judged, blocks: list[Block], usual: str) -> Finding:
    first = blocks[0]
    spherical, six = function_counts(first)
    here, there = (six, spherical) if usual == "spherical" else (spherical, six)
    return case.at_line(
        first.line,
        "note",
        f"marked {first.functions}, but {claim.label} ({claim.claim.where}) is used with {usual} "
        f"functions: {first.symbol} has {here} functions this way and {there} in the usual one, so "
        "energies differ from published ones",
        element=first.symbol,
        measured=first.functions,
        limit=usual,
        expected=usual,
        remedy=f"mark it {usual}, or say with the results that it was not",
    )
