"""Drift: numbers that are no longer what they were, or not what the reference holds.

What comparing takes is imported where it is done, because most audits compare with nothing.
"""

from collections.abc import Iterator
from dataclasses import replace
from typing import TYPE_CHECKING

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.model import Block, Severity
from overlapse.rules.case import Case, gathered
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule

if TYPE_CHECKING:
    from overlapse.rules.compare.beside import Seal, SealedSet
    from overlapse.rules.compare.relation import Relation
    from overlapse.rules.compare.sides import Difference

_SHOWN = 16  # digits of a digest in a finding


@rule("drift.seal")
def seal(case: Case) -> Iterator[Finding]:
    """The numbers of an element are no longer those that were sealed.

    A library of basis sets is edited, converted and merged by many hands, and a number that changed
    on the way changes every energy computed from then on.  A seal pins what each element holds:
    its functions and its core potential.  Moving shells and rows, another layout, other spellings
    of the same numbers, letter case, labels and comments leave it whole; the last digit of one
    number breaks it.  A file without a seal is not judged.

    Formula: SHA-256 over the double-precision numbers of all functions, each with its primitives by
    falling exponent and without zeros, sorted; and over the terms of the core potential likewise.

    Source: National Institute of Standards and Technology, Secure Hash Standard, FIPS 180-4 (2015).

    Remedy: compare the file with the version that was sealed (overlapse relate) and restore the
    number, or, where the change is meant, seal anew: overlapse seal PATH --write.

    Beside::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        ****

    Bad::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.51
        ****

    Good::

        C 0
        s 2 1.00
          0.50D+00 .5
          4.00D+00 .6
        ****
    """
    alike: dict[str, list[Finding]] = {}
    for sealed in case.seals:
        for finding in _against_seal(case, sealed):
            # What changed at several elements is told once where it is the same.
            _, _, change = finding.message.partition(" ")
            alike.setdefault(change.partition(";")[0], []).append(finding)
    for findings in alike.values():
        yield from gathered(findings)


def _against_seal(case: Case, sealed: "SealedSet") -> Iterator[Finding]:
    from overlapse.rules.compare.beside import seal_of
    from overlapse.rules.compare.canonical import elements_of

    members = case.sets[sealed.own] if sealed.own >= 0 else None
    now = elements_of(members) if members is not None else {}
    for key, before in sealed.elements.items():
        block = now.get(key)
        if block is None:
            yield case.at_line(
                members.line if members is not None else 1,
                "warning",
                f"{symbol_of(key[0])} was sealed here and is gone; it was sealed as {before.holds}",
                element=symbol_of(key[0]),
                limit=before.digest[:_SHOWN],
                remedy="restore the element, or seal anew: overlapse seal PATH --write",
            )
        elif (after := seal_of(block)).digest != before.digest:
            yield _broken(case, block, before, after)


def _broken(case: Case, block: Block, before: "Seal", after: "Seal") -> Finding:
    names = list(dict.fromkeys([*before.parts, *after.parts]))
    changed = [name for name in names if before.parts.get(name) != after.parts.get(name)]
    told = [
        "core potential" if name == "potential" else f"{name} functions" for name in changed
    ] or ["whole"]
    holds = "" if before.holds == after.holds else f", and now {after.holds}"
    return case.at_line(
        block.line,
        "warning",
        f"{block.symbol} is not what was sealed: its {' and '.join(told)} changed; it was sealed "
        f"as {before.holds}{holds}",
        element=block.symbol,
        measured=after.digest[:_SHOWN],
        limit=before.digest[:_SHOWN],
        remedy="compare with the version that was sealed (overlapse relate) and restore the "
        "number; where the change is meant, seal anew: overlapse seal PATH --write",
    )


@rule("drift.reference")
def reference(case: Case) -> Iterator[Finding]:
    """An element differs from the same element of the reference.

    Where a trusted copy of a set is at hand, nothing finds a wrong number as surely as comparing
    with it.  The comparison sees through layout, order and spelling, and through contractions
    written in another way that span the same functions: these and numbers of fewer digits give a
    note, anything else a warning with the first number that differs.  Only files that the settings
    give a reference for are judged.

    Formula: numbers one by one; where they differ, the principal angles between the spaces that the
    contracted functions of each l span, in the metric of their overlap.

    Source: A. Bjorck, G. H. Golub, Math. Comput. 27, 579 (1973); E. R. Davidson, Chem. Phys. Lett.
    260, 514 (1996) for contractions that differ and span the same.

    Remedy: restore the number of the reference, or bring the reference up to date.

    Beside::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        ****

    Bad::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.51
        ****

    Good::

        C 0
        S 2 1.00
          0.5D0 0.5
          4.0D0 0.6
        ****
    """
    if case.reference is None:
        return
    from overlapse.rules.compare.relation import relate_documents

    for i, j, relations in relate_documents(case.document, case.reference):
        if i >= 0 and j >= 0:
            found = [f for relation in relations if (f := _differing(case, i, relation))]
            for severity in ("warning", "note"):
                yield from gathered([f for f in found if f.severity == severity])


_SEVERITIES: dict[str, Severity] = {
    "equal to rounding": "note",
    "equal span": "note",
    "contained in": "warning",
    "contains": "warning",
    "different": "warning",
    "only in second": "note",
}
_WORDS = {
    "equal to rounding": "has the numbers of the reference with other digits",
    "equal span": "has other numbers than the reference, which describe the same functions",
    "contained in": "holds less than the reference",
    "contains": "holds more than the reference",
    "different": "differs from the reference",
    "only in second": "is in the reference and not here",
}


def _differing(case: Case, index: int, relation: "Relation") -> Finding | None:
    severity = _SEVERITIES.get(relation.verdict)
    if severity is None:
        return None
    assert case.reference is not None
    first = relation.first
    line = relation.lines[0] or case.sets[index].line
    finding = case.at_line(
        line,
        severity,
        "; ".join([f"{relation.symbol} {_WORDS[relation.verdict]}", *relation.reasons])
        + (f": {_told(first, case.reference.path)}" if first is not None else ""),
        element=relation.symbol,
        measured=relation.verdict,
        limit="equal numbers",
        remedy="restore what the reference holds, or bring the reference up to date",
    )
    return finding if first is None or first.left is None else _placed(finding, first)


def _placed(finding: Finding, first: "Difference") -> Finding:
    """The finding at the first number that differs, with the reference's number as the expected."""
    spot = first.left
    assert spot is not None
    if first.right is None:
        return replace(finding, line=spot.line, column=spot.column, shell=spot.shell)
    return replace(
        finding,
        line=spot.line,
        column=spot.column,
        length=len(spot.spelling),
        shell=spot.shell,
        measured=spot.value,
        limit=first.right.value,
        expected=first.right.value,
    )


def _told(first: "Difference", path: str) -> str:
    here, there = first.left, first.right
    if here is None or there is None:
        spot = here or there
        assert spot is not None
        where = "here only" if there is None else f"only there ({path}:{spot.line}:{spot.column})"
        thing = "primitive" if first.what == "row" else first.what
        return f"a {thing} of {spot.shell}, {spot.spelling}, is {where}"
    return (
        f"{first.what} {here.spelling} here, {there.spelling} there "
        f"({path}:{there.line}:{there.column})"
    )
