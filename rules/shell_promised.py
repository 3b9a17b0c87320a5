"""Shells: is any missing that the label promises, or that the neighbours have?"""

from collections.abc import Iterator

from overlapse.grammar.elements import occupied, row_of, symbol_of
from overlapse.grammar.model import Block, letter_of
from overlapse.rules.case import Case, gathered, is_orbital
from overlapse.rules.families.counted import plus
from overlapse.rules.finding import Finding
from overlapse.rules.label import differing
from overlapse.rules.labels.composition import notation, primitives
from overlapse.rules.labels.labelling import Judged, judged
from overlapse.rules.registry import rule


@rule("shell.polarization")
def polarization(case: Case) -> Iterator[Finding]:
    """An element lacks polarization functions that the label promises and other elements have.

    The names of most families (cc-pVXZ, def2-, pc-n) promise them without a sign of their own; the
    stars and brackets of 6-31G* and its like are judged by `label.decoration`.  Without them bonds
    cannot bend the density of the atom; energies are off by tens of millihartree and geometries
    with them, for this element only, so that comparisons between molecules go wrong without notice.

    Source: P. C. Hariharan, J. A. Pople, Theor. Chim. Acta 28, 213 (1973); compositions of the
    families: see their data files.

    Remedy: restore the lost shell from the source.

    Bad::

        ! label: cc-pVDZ
        H 0
        S 3 1.00
          13.0 0.02
          2.0 0.14
          0.4 0.5
        S 1 1.00
          0.12 1.0
        ****
        He 0
        S 3 1.00
          38.0 0.02
          2.0 0.14
          0.4 0.5
        S 1 1.00
          0.12 1.0
        P 1 1.00
          0.7 1.0
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
    yield from differing(case, "polarization")


@rule("shell.diffuse")
def diffuse(case: Case) -> Iterator[Finding]:
    """An element lacks diffuse functions that the label promises.

    Anions, excited states and weak interactions need them; without them electron affinities come
    out far too small.  Some sets in circulation carry a label with a plus for elements for which no
    diffuse functions were ever published: there it changes nothing, and is said once.

    Source: T. Clark, J. Chandrasekhar, G. W. Spitznagel, P. von R. Schleyer, J. Comput. Chem. 4,
    294 (1983); R. A. Kendall, T. H. Dunning, R. J. Harrison, J. Chem. Phys. 96, 6796 (1992).

    Remedy: restore the lost functions, or call the set by the name without them.

    Bad::

        ! label: aug-cc-pVDZ
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
        He 0
        S 3 1.00
          38.0 0.02
          2.0 0.14
          0.4 0.5
        S 1 1.00
          0.12 1.0
        P 1 1.00
          0.7 1.0
        S 1 1.00
          0.03 1.0
        P 1 1.00
          0.14 1.0
        ****

    Good::

        ! label: aug-cc-pVDZ
        H 0
        S 3 1.00
          13.0 0.02
          2.0 0.14
          0.4 0.5
        S 1 1.00
          0.12 1.0
        P 1 1.00
          0.7 1.0
        S 1 1.00
          0.03 1.0
        P 1 1.00
          0.14 1.0
        ****
    """
    yield from differing(case, "diffuse")
    for claim in judged(case):
        bare = [v.block for v in claim.verdicts if v.bare]
        if bare and not claim.label_is_wrong:
            yield _bare(case, claim, bare)


def _bare(case: Case, claim: Judged, blocks: list[Block]) -> Finding:
    label = claim.label.but(diffuse=0)
    return case.at_line(
        blocks[0].line,
        "warning",
        f"{claim.label} ({claim.claim.where}) promises diffuse functions, but "
        f"{', '.join(block.symbol for block in blocks)} have none: they equal {label}, and none "
        "were published for them",
        element=blocks[0].symbol,
        shell="s",
        measured=len(blocks),
        limit=0,
        expected=str(label),
        remedy=f"call it {label} where these elements are used",
    )


@rule("shell.uneven")
def uneven(case: Case, *, least: float = 4) -> Iterator[Finding]:
    """Suspect composition: an element differs from all others of its row, which are alike.

    Families keep one composition along a row of the periodic table, but for its ends.  Where all
    others of a row are alike and one differs, and the label does not tell why, a shell or a row was
    probably lost or added there.  It is a warning where the element has fewer functions than the
    others, a note else.

    Limits: least: so many others of the row must be alike.

    Source: common practice, no source; the rows in which published families differ are known from
    their labels.

    Remedy: compare with the source of the set.

    Bad::

        B 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
        C 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
        N 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        ****
        O 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
        F 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****

    Good::

        B 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
        C 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
        N 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
        O 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
        F 0
        S 1 1.00
          40.0 1.0
        SP 1 1.00
          0.5 1.0 1.0
        D 1 1.00
          0.8 1.0
        ****
    """
    yield from _uneven(case, least)


def _uneven(case: Case, least: float) -> Iterator[Finding]:
    known = {id(v.block) for claim in judged(case) for v in claim.verdicts}
    for members in case.sets:
        if not is_orbital(members) and members.role != "fitting":
            continue
        blocks = [b for b in members.blocks if b.complete and b.shells and id(b) not in known]
        yield from gathered([_odd(case, odd, others) for odd, others in _odd_ones(blocks, least)])


def _odd_ones(blocks: list[Block], least: float) -> Iterator[tuple[Block, list[Block]]]:
    rows: dict[tuple[int, int], list[Block]] = {}
    for block in sorted(blocks, key=lambda b: b.atomic_number):
        rows.setdefault(row_of(block.atomic_number), []).append(block)
    for members in rows.values():
        made = [_made_of(block) for block in members]
        # Families change at the ends of a row, so that an end says nothing.
        for at, block in enumerate(members[1:-1], 1):
            alike = {*made[:at], *made[at + 1 :]}
            if len(members) > least and len(alike) == 1 and made[at] not in alike:
                yield block, [other for other in members if other is not block]


def _made_of(block: Block) -> tuple[object, ...]:
    distinct, _ = primitives(block)
    return tuple(distinct.items()), tuple(block.counts.items()), block.potential is None


def _odd(case: Case, block: Block, others: list[Block]) -> Finding:
    first, last = (symbol_of(z) for z in row_of(block.atomic_number))
    l = next(
        (l for l in sorted({*block.counts, *others[0].counts})
         if block.counts.get(l) != others[0].counts.get(l)),
        0,
    )  # fmt: skip
    return case.at_line(
        block.line,
        "warning" if _is_short(block, others[0]) else "note",
        f"suspect composition: {block.symbol} has {notation(block)}, while the other "
        f"{len(others)} elements of {first}-{last} have {notation(others[0])}",
        element=block.symbol,
        shell=letter_of(l),
        measured=notation(block),
        limit=notation(others[0]),
        expected=notation(others[0]),
        remedy="compare with the source of the set",
    )


def _is_short(block: Block, other: Block) -> bool:
    """Whether a block has fewer functions than another, and of no l more, but needs as many."""
    short = plus(other.counts, {l: -count for l, count in block.counts.items()})
    occupation = occupied(block.atomic_number) == occupied(other.atomic_number)
    return occupation and bool(short) and min(short.values()) > 0
