"""Labels: does the set contain what its name and its comments say?"""

from collections.abc import Iterator

from overlapse.grammar.designation import Designation
from overlapse.grammar.model import BasisSet, Block, letter_of
from overlapse.rules.case import Case, gathered, is_orbital
from overlapse.rules.families.counted import is_on_record
from overlapse.rules.finding import Edit, Finding
from overlapse.rules.labels.claims import Claim, CompositionClaim, composition_claim
from overlapse.rules.labels.composition import notation, primitives
from overlapse.rules.labels.labelling import Judged, Kind, Verdict, best_label, fits, judged
from overlapse.rules.registry import rule
from overlapse.rules.repair import label_lines, replaced_words


def differing(case: Case, kind: Kind) -> Iterator[Finding]:
    """Findings for all claims, where the difference is of this kind.

    Where most elements differ the label is wrong, not they, and it is said once.
    """
    for claim in judged(case):
        if claim.label_is_wrong:
            if claim.kind == kind:
                yield _wrong_label(case, claim)
            continue
        yield from gathered([_at_element(case, claim, v) for v in claim.wrong if v.kind == kind])


def _at_element(case: Case, claim: Judged, v: Verdict) -> Finding:
    return case.at_line(
        v.block.line,
        "warning",
        told(claim, v),
        element=v.block.symbol,
        shell=letter_of(v.l),
        measured=v.found,
        limit=v.promised,
        expected=v.whole,
        remedy="restore the lost function, or correct the label",
    )


def told(claim: Judged, v: Verdict) -> str:
    """The difference of one element in words."""
    detail = f": {v.detail}" if v.detail else ""
    why = f"; {v.why}" if v.why else ""
    return (
        f"{claim.label} ({claim.claim.where}) promises {v.promised} for {v.block.symbol}; found "
        f"{v.found}{detail}{why}"
    )


def _wrong_label(case: Case, claim: Judged) -> Finding:
    v, wrong, count = claim.wrong[0], len(claim.wrong), len(claim.verdicts)
    best = str(claim.best) if claim.best is not None and claim.best != claim.label else None
    fits_it = f"; the contents fit {best}" if best else "; no known label fits the contents better"
    why = f" ({v.why})" if v.why else ""
    # Libraries of fitting sets file them under the name of the set that they belong to.
    beside = claim.best is not None and bool(claim.best.fitting) and not claim.label.fitting
    return case.at_line(
        claim.claim.line,
        "note" if beside else "warning",
        f"{claim.claim.label!r} ({claim.claim.where}) is not what the set contains: {wrong} of "
        f"{count} element{'s' * (count != 1)} differ{'s' * (count == 1)}, first {v.block.symbol} "
        f"on line {v.block.line} with {v.found} where the label promises {v.promised}{why}"
        f"{fits_it}",
        element=v.block.symbol,
        shell=letter_of(v.l),
        measured=v.found,
        limit=v.promised,
        expected=best,
        edits=_relabelled(case, claim, best) if best else (),
        remedy=f"call it {best}" if best else "correct the label, or restore what was lost",
    )


def _relabelled(case: Case, claim: Judged, best: str) -> tuple[Edit, ...]:
    """Edits that put the label that fits where the claimed one stands in the text."""
    label = claim.claim.label
    lines = label_lines(claim.members.blocks, label, claim.claim.line)
    return replaced_words(case.document, lines, label, best)


@rule("label.split")
def split(case: Case) -> Iterator[Finding]:
    """The contraction lengths are not those that the label's digits promise.

    In N-MPG each core function has N primitives and the valence is split into functions of M, P
    (and Q) primitives; STO-nG has n primitives everywhere.  Below the first row each further row
    adds a core level: 6-31G gives carbon one core function of 6 and valence functions of 3 and 1,
    sodium to argon two core levels.  A different length means that a row was lost or added, or
    that the set is another one than its label says.  Rows of the periodic table that do not follow
    their digits are known and taken into account.

    Formula: s: N (n-1 times), M, P; p: N (n-2 times), M, P in row n of the periodic table; H and
    He: s: M, P.

    Source: R. Ditchfield, W. J. Hehre, J. A. Pople, J. Chem. Phys. 54, 724 (1971); W. J. Hehre, R.
    Ditchfield, J. A. Pople, J. Chem. Phys. 56, 2257 (1972); W. J. Hehre, R. F. Stewart, J. A.
    Pople, J. Chem. Phys. 51, 2657 (1969); irregular rows: see the family's data file.

    Remedy: restore the row that was lost, or correct the label.

    Bad::

        ! label: STO-3G
        H 0
        S 2 1.00
          1.5 0.6
          0.2 0.5
        ****

    Good::

        ! label: STO-2G
        H 0
        S 2 1.00
          1.5 0.6
          0.2 0.5
        ****
    """

    yield from differing(case, "split")


@rule("label.decoration")
def decoration(case: Case) -> Iterator[Finding]:
    """Polarization or diffuse functions differ from what the label's decorations promise.

    A star, or (d,p), stands for polarization functions, a plus for diffuse s and p functions on
    heavy atoms, a second plus for a diffuse s function on hydrogen.  What a star adds depends on
    the row: an f function for Sc-Zn in 6-31G*, nothing below Na in 3-21G*.  The prefixes of other
    families (aug-, jul- to feb-, maug-, ma-) stand for diffuse functions, one for each angular
    momentum or for some of them; single elements that lack those are left to `shell.diffuse`.

    Source: P. C. Hariharan, J. A. Pople, Theor. Chim. Acta 28, 213 (1973); T. Clark, J.
    Chandrasekhar, G. W. Spitznagel, P. von R. Schleyer, J. Comput. Chem. 4, 294 (1983); M. J.
    Frisch, J. A. Pople, J. S. Binkley, J. Chem. Phys. 80, 3265 (1984); R. A. Kendall, T. H.
    Dunning, R. J. Harrison, J. Chem. Phys. 96, 6796 (1992); E. Papajak, J. Zheng, X. Xu, H. R.
    Leverentz, D. G. Truhlar, J. Chem. Theory Comput. 7, 3027 (2011).

    Remedy: restore the lost function, or correct the label.

    Bad::

        ! label: 2-11G*
        Be 0
        S 2 1.00
          20.0 0.5
          4.0 0.6
        SP 1 1.00
          0.5 1.0 1.0
        SP 1 1.00
          0.1 1.0 1.0
        ****

    Good::

        ! label: 2-11G*
        Be 0
        S 2 1.00
          20.0 0.5
          4.0 0.6
        SP 1 1.00
          0.5 1.0 1.0
        SP 1 1.00
          0.1 1.0 1.0
        D 1 1.00
          0.4 1.0
        ****
    """

    yield from differing(case, "decoration")


@rule("label.composition")
def composition(case: Case) -> Iterator[Finding]:
    """A comment such as (10s,4p) -> [3s,2p] does not agree with the block it belongs to.

    The comment was usually made from the numbers when they were sound; if the two differ, a row or
    a shell was lost or added since.  Files that only add functions often carry the comment of the
    full set: where most elements differ it is said once, as a note.

    Source: notation of contractions, T. H. Dunning, P. J. Hay in Methods of Electronic Structure
    Theory, Plenum 1977, chapter 1.

    Remedy: restore what was lost, or correct the comment.

    Bad::

        ****
        ! (3s) -> [2s]
        H 0
        S 1 1.00
          1.5 1.0
        S 1 1.00
          0.2 1.0
        ****

    Good::

        ****
        ! (2s) -> [2s]
        H 0
        S 1 1.00
          1.5 1.0
        S 1 1.00
          0.2 1.0
        ****
    """
    for members in case.sets:
        claimed: list[tuple[Block, CompositionClaim]] = []
        before = 0
        for block in sorted(members.blocks, key=lambda b: b.line):
            claim = composition_claim(case.document, block, before)
            before = max(before, block.end)
            if claim is not None and block.complete and block.shells:
                claimed.append((block, claim))
        wrong = [(block, claim) for block, claim in claimed if not _agrees(block, claim)]
        if len(wrong) * 2 > len(claimed) > 1:
            block, claim = wrong[0]
            yield case.at_line(
                claim.line,
                "note",
                f"{len(wrong)} of {len(claimed)} comments on the composition differ from the "
                f"blocks, first {claim.text} for {block.symbol}, which has {notation(block)}: "
                "they seem to describe another set",
                element=block.symbol,
                measured=notation(block),
                limit=claim.text,
                remedy="correct the comments, or use the file with the set it belongs to",
            )
            continue
        yield from gathered(
            [
                case.at_line(
                    claim.line,
                    "warning",
                    f"the comment says {claim.text}, but {block.symbol} has {notation(block)}",
                    element=block.symbol,
                    measured=notation(block),
                    limit=claim.text,
                    edits=replaced_words(case.document, [claim.line], claim.text, notation(block)),
                    remedy="restore the row or shell that was lost, or correct the comment",
                )
                for block, claim in wrong
            ]
        )


def _agrees(block: Block, claim: CompositionClaim) -> bool:
    if block.counts != claim.contracted:
        return False
    distinct, written = primitives(block)
    return not claim.primitives or claim.primitives in (distinct, written)


@rule("label.unknown")
def unknown(case: Case) -> Iterator[Finding]:
    """A label is not understood, or means several sets, so it was not used to judge by.

    The rest of the audit does not depend on the label.  If the contents fit a known label, it is
    named.  Short names such as DZP, SVP or TZVP were given to several sets each.

    Source: none is needed.

    Remedy: nothing to do, unless the label was meant to be one of the known ones.

    Bad::

        $basis
        *
        h my-own-set
        *
          1 s
            0.5 1.0
        *
        $end

    Good::

        $basis
        *
        h STO-1G
        *
          1 s
            0.3 1.0
        *
        $end
    """
    for index, members in enumerate(case.sets):
        for claim in case.claims[index]:
            label = claim.designation
            if label is not None and label.readings:
                yield _ambiguous(case, members, claim, label.readings)
            elif label is None or not _has_record(label):
                yield _not_on_record(case, members, claim)


def _has_record(label: Designation) -> bool:
    return label.family in ("STO-nG", "N-MPG") or is_on_record(label)


def _not_on_record(case: Case, members: BasisSet, claim: Claim) -> Finding:
    found = best_label(members) if is_orbital(members) else None
    best = None if found is None else str(found)
    fitting = f"; the contents fit {best}" if best else ""
    return case.at_line(
        claim.line,
        "note",
        f"no composition is on record for {claim.label!r} ({claim.where}), so the set "
        f"was judged without its label{fitting}",
        element=members.blocks[0].symbol,
        measured=claim.label,
        expected=best,
        remedy="give the label with --label if the set has one of the known names",
    )


def _ambiguous(
    case: Case, members: BasisSet, claim: Claim, readings: tuple[Designation, ...]
) -> Finding:
    blocks = [block for block in members.blocks if block.complete and block.shells]
    fitting = [str(r) for r in readings if all(fits(block, r) for block in blocks)]
    told = f"the contents fit {' and '.join(fitting)}" if fitting else "the contents fit none"
    return case.at_line(
        claim.line,
        "note",
        f"{claim.label!r} ({claim.where}) is the name of more than one set, among them "
        f"{', '.join(map(str, readings))}; {told}",
        element=members.blocks[0].symbol,
        measured=claim.label,
        expected=fitting[0] if len(fitting) == 1 else None,
        remedy="say which set it is: the name alone does not",
    )
