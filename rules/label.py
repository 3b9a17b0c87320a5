"""Labels: does the set contain what its name and its comments say?"""

from collections.abc import Callable, Iterator
from typing import NamedTuple

from overlapse.grammar.designation import Designation
from overlapse.grammar.model import BasisSet, Block, letter_of
from overlapse.rules.case import Case, gathered, is_orbital
from overlapse.rules.claims import Claim, CompositionClaim, composition_claim
from overlapse.rules.composition import lengths_of, notation, primitives, show
from overlapse.rules.families.expected import Lengths, Promise, candidates, promise
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule


class Verdict(NamedTuple):
    """A block against a promise: where they differ, by angular momentum.

    split: l whose core or valence functions differ; added: l whose polarization or diffuse
    functions differ.
    """

    block: Block
    promise: Promise
    found: Lengths
    split: tuple[int, ...]
    added: tuple[int, ...]

    @property
    def is_decorated(self) -> bool:
        """Whether the label adds functions to this element, or the block has some of its own."""
        return self.promise.full != self.promise.plain or bool(self.added)

    @property
    def fits(self) -> bool:
        return not self.split and not self.added


def verdict(block: Block, label: Designation) -> Verdict | None:
    """Compare a block with what a label promises, or None where the label is not defined."""
    promised = promise(label, block.atomic_number)
    if promised is None:
        return None
    found = lengths_of(block)
    split: list[int] = []
    added: list[int] = []
    for l in sorted({*promised.full, *found}):
        here, full = found.get(l, ()), promised.full.get(l, ())
        if here in (full, full + promised.optional.get(l, ())):
            continue
        plain = promised.plain.get(l, ())
        only_ones = here[: len(plain)] == plain and set(here[len(plain) :]) <= {1}
        (added if only_ones else split).append(l)
    return Verdict(block, promised, found, tuple(split), tuple(added))


def fitting_labels(members: BasisSet, limit: int = 12) -> list[tuple[Designation, int, int]]:
    """Known labels that fit a set: label, elements that fit, elements looked at; best first."""
    blocks = [block for block in members.blocks if block.complete and block.shells][:limit]
    found = []
    for label in candidates():
        verdicts = [verdict(block, label) for block in blocks]
        fits = sum(v is not None and v.fits for v in verdicts)
        if fits * 2 > len(blocks):
            found.append((label, fits, len(blocks)))
    return sorted(found, key=lambda item: -item[1])


def _best(members: BasisSet) -> str | None:
    labels = fitting_labels(members)
    return str(labels[0][0]) if labels else None


def _judged(case: Case) -> Iterator[tuple[BasisSet, Claim, Designation]]:
    for index, members in enumerate(case.sets):
        for claim in case.claims[index]:
            if claim.designation is not None and is_orbital(members):
                yield members, claim, claim.designation


def _compare(
    case: Case,
    differ: Callable[[Verdict], tuple[int, ...]],
    say: Callable[[Verdict, Claim, Designation], str],
    concerns: Callable[[Verdict], bool] = lambda v: True,
) -> Iterator[Finding]:
    """Findings for all claims; where most elements differ the label is wrong, not they.

    ``concerns`` chooses the elements that the comparison says anything about.
    """
    for members, claim, label in _judged(case):
        blocks = [block for block in members.blocks if block.complete and block.shells]
        verdicts = [v for block in blocks if (v := verdict(block, label)) is not None]
        verdicts = [v for v in verdicts if concerns(v)]
        wrong = [v for v in verdicts if differ(v)]
        if not wrong:
            continue
        if len(wrong) * 2 > len(verdicts):
            yield _wrong_label(case, members, claim, wrong, len(verdicts), differ)
            continue
        for v in wrong:
            yield case.at_line(
                v.block.line,
                "warning",
                say(v, claim, label),
                element=v.block.symbol,
                shell=letter_of(differ(v)[0]),
                measured=show(v.found, differ(v)),
                limit=show(v.promise.full, differ(v)),
                expected=show(v.promise.full),
                remedy="restore the lost function, or correct the label",
            )


def _wrong_label(
    case: Case,
    members: BasisSet,
    claim: Claim,
    wrong: list[Verdict],
    count: int,
    differ: Callable[[Verdict], tuple[int, ...]],
) -> Finding:
    v = wrong[0]
    best = _best(members)
    fits = f"; the contents fit {best}" if best else "; no known label fits the contents better"
    told = f" ({v.promise.why})" if v.promise.why else ""
    return case.at_line(
        claim.line,
        "warning",
        f"{claim.label!r} ({claim.where}) is not what the set contains: {len(wrong)} of {count} "
        f"element{'s' * (count != 1)} differ{'s' * (count == 1)}, first {v.block.symbol} on line "
        f"{v.block.line} with {show(v.found, differ(v))} where the label promises "
        f"{show(v.promise.full, differ(v))}{told}{fits}",
        element=v.block.symbol,
        shell=letter_of(differ(v)[0]),
        measured=show(v.found),
        limit=show(v.promise.full),
        expected=best,
        remedy=f"call it {best}" if best else "correct the label, or restore what was lost",
    )


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

    def say(v: Verdict, claim: Claim, label: Designation) -> str:
        why = f"; {v.promise.why}" if v.promise.why else ""
        return (
            f"{label} ({claim.where}) promises {show(v.promise.full, v.split)} for "
            f"{v.block.symbol}; found {show(v.found, v.split)}{why}"
        )

    yield from _compare(case, lambda v: v.split, say)


@rule("label.decoration")
def decoration(case: Case) -> Iterator[Finding]:
    """Polarization or diffuse functions differ from what the label's decorations promise.

    A star, or (d,p), stands for polarization functions, a plus for diffuse s and p functions on
    heavy atoms, a second plus for a diffuse s function on hydrogen.  What a star adds depends on
    the row: an f function for Sc-Zn in 6-31G*, nothing below Na in 3-21G*.

    Source: P. C. Hariharan, J. A. Pople, Theor. Chim. Acta 28, 213 (1973); T. Clark, J.
    Chandrasekhar, G. W. Spitznagel, P. von R. Schleyer, J. Comput. Chem. 4, 294 (1983); M. J.
    Frisch, J. A. Pople, J. S. Binkley, J. Chem. Phys. 80, 3265 (1984).

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

    def say(v: Verdict, claim: Claim, label: Designation) -> str:
        words = []
        for l in v.added:
            short = len(v.promise.full.get(l, ())) - len(v.found.get(l, ()))
            verb = "is missing" if short > 0 else "is too many"
            words.append(f"{abs(short)} {letter_of(l)} function {verb}")
        why = f"; {v.promise.why}" if v.promise.why else ""
        return (
            f"{label} ({claim.where}) promises {show(v.promise.full, v.added)} for "
            f"{v.block.symbol}; found {show(v.found, v.added)}: {', '.join(words)}{why}"
        )

    yield from _compare(case, lambda v: () if v.split else v.added, say, lambda v: v.is_decorated)


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
    """A label is not understood, so the composition was not judged by it.

    The rest of the audit does not depend on the label.  If the contents fit a known label, it is
    named.

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
            if claim.designation is None:
                best = _best(members) if is_orbital(members) else None
                fits = f"; the contents fit {best}" if best else ""
                yield case.at_line(
                    claim.line,
                    "note",
                    f"no composition is on record for {claim.label!r} ({claim.where}), so the set "
                    f"was judged without its label{fits}",
                    element=members.blocks[0].symbol,
                    measured=claim.label,
                    expected=best,
                    remedy="give the label with --label if the set has one of the known names",
                )
