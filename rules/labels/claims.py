"""Where a set's label is claimed, and what its comments say about its composition."""

import re
from pathlib import PurePath
from typing import NamedTuple

from overlapse.grammar.designation import (
    Designation,
    label_in_file_name,
    label_in_words,
    parse_label,
)
from overlapse.grammar.model import BasisSet, Block, Document

_LETTERS = "spdfghiklmnoqrtuv"
_NAMED = re.compile(
    r"(?:basis(?:[ _-]?set)?|set|label|name)[ \t]*[:=][ \t]*[\"']?(\S+?)[\"',;]?$", re.IGNORECASE
)
_COMPOSITION = re.compile(r"\(([^()\[\]]*)\)\s*(?:->|/)\s*\[([^\[\]]*)\]")
_ENTRY = re.compile(r"(\d+)\s*([a-zA-Z])")
# "Li - Ne: (10s,4p,1d) -> [3s,2p,1d]" speaks of a range of elements, not of the next block.
_RANGE = re.compile(r"^\s*[A-Za-z]{1,2}\s*(?:-|,|to)\s*[A-Za-z]{1,2}\b")


class Claim(NamedTuple):
    """A label that a set is claimed to have.

    label: as written.  designation: the label taken apart, None if it is not understood.  where:
    in words, for the finding.  line: of the text, counted from 1, 1 where it is not in the text.
    """

    label: str
    designation: Designation | None
    where: str
    line: int


class CompositionClaim(NamedTuple):
    """A remark such as "(10s,4p) -> [3s,2p]": counts of primitives and contracted functions."""

    text: str
    primitives: dict[int, int]
    contracted: dict[int, int]
    line: int


def claims_of(document: Document, given: str | None) -> dict[int, list[Claim]]:
    """Claimed labels of each set, the weightiest first.

    A label given by the user outweighs the text's own headings, these its comments, these the
    file's name.  A weaker claim is kept where it says something else than the stronger ones.
    """
    return {index: _claims(document, members, given) for index, members in enumerate(document.sets)}


def _claims(document: Document, members: BasisSet, given: str | None) -> list[Claim]:
    found: list[Claim] = []
    if given:
        found.append(Claim(given, parse_label(given), "the label you gave", members.line))
    if members.label:
        where = f"the heading on line {members.line}"
        found.append(Claim(members.label, parse_label(members.label), where, members.line))
    if len(document.sets) == 1:
        found += _commented(document)
        found += _filed(document)
    distinct: list[Claim] = []
    for claim in found:
        if claim.designation is None or all(claim.designation != c.designation for c in distinct):
            distinct.append(claim)
    return distinct


def _commented(document: Document) -> list[Claim]:
    """The first comment above the data that names a label, as `name: LABEL` or at its start."""
    first = min((block.line for block in document.blocks), default=0)
    for remark in document.remarks:
        if remark.line >= first:
            break
        named = _NAMED.search(remark.text)
        label = named[1] if named else label_in_words(remark.text.split())
        if label and (designation := parse_label(label)) is not None:
            return [Claim(label, designation, f"the comment on line {remark.line}", remark.line)]
    return []


def _filed(document: Document) -> list[Claim]:
    label = label_in_file_name(PurePath(document.path).name)
    if label is None:
        return []
    return [Claim(label, parse_label(label), "the file's name", 1)]


def composition_claim(document: Document, block: Block, before: int) -> CompositionClaim | None:
    """What a comment right above a block, or inside it above its first row, says it contains.

    ``before`` is the last line of the block above (0 for none).
    """
    start = min((shell.line for shell in block.shells), default=block.end)
    found = [remark for remark in document.remarks if before < remark.line <= start]
    inside = [remark for remark in found if remark.line >= block.line]
    above = [remark for remark in found if remark.line < block.line]
    for remark in [*inside[:1], *above[::-1][:2]]:
        if not _RANGE.match(remark.text) and (match := _COMPOSITION.search(remark.text)):
            primitives, contracted = _counts(match[1]), _counts(match[2])
            if contracted:
                return CompositionClaim(match[0], primitives, contracted, remark.line)
    return None


def _counts(text: str) -> dict[int, int]:
    counts: dict[int, int] = {}
    for number, letter in _ENTRY.findall(text):
        if (l := _LETTERS.find(letter.lower())) >= 0:
            counts[l] = counts.get(l, 0) + int(number)
    return counts
