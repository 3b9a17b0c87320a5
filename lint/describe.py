"""What a file contains, element by element: the facts, and the same as plain data."""

import json
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import groupby
from typing import Any, TextIO

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.model import BasisSet, Block, Document, Potential, letter_of
from overlapse.lint.reports.lines import one_line
from overlapse.rules.labels.claims import claims_of
from overlapse.rules.labels.composition import (
    exponent_limits,
    function_counts,
    lengths_of,
    notation,
    primitives,
)
from overlapse.rules.labels.naming import Naming, Ranking


@dataclass(frozen=True)
class Portrait:
    """One element of one set: its block and the labels that fit it, best first."""

    block: Block
    labels: tuple[str, ...]


@dataclass(frozen=True)
class SetPortrait:
    """One set: its elements by atomic number, the label that fits best, doubtful claims.

    ordinal: its place in the file, counted from 1.
    """

    ordinal: int
    members: BasisSet
    elements: tuple[Portrait, ...]
    best: Naming | None
    doubtful: tuple[Naming, ...]
    claimed: str | None


@dataclass(frozen=True)
class Description:
    """What a document contains."""

    document: Document
    sets: tuple[SetPortrait, ...]

    @property
    def broken(self) -> int:
        """Faults of form that may have cost a number or a shell."""
        return sum(fault.severity == "error" for fault in self.document.faults)


def describe(document: Document, only: Iterable[int] = ()) -> Description:
    """Describe all elements of a document, or those with the atomic numbers in ``only``.

    Labels are judged by the whole set all the same.  Sets without such an element are left out.
    """
    wanted = frozenset(only)
    claims = claims_of(document, None)
    portraits = []
    for index, members in enumerate(document.sets):
        ranking = Ranking(members, claims[index])
        elements = tuple(
            Portrait(block, tuple(map(str, ranking.of_block(block))))
            for block in sorted(members.blocks, key=lambda block: block.atomic_number)
            if not wanted or block.atomic_number in wanted
        )
        if elements:
            told = claims[index][0].label if claims[index] else None
            best, doubtful = ranking.best, tuple(ranking.doubtful)
            portraits.append(SetPortrait(index + 1, members, elements, best, doubtful, told))
    return Description(document, tuple(portraits))


def emptiness(description: Description) -> str:
    """Why there is nothing to describe, "" where there is something."""
    document = description.document
    if description.sets:
        return ""
    if document.blocks:
        held = ranges(sorted({block.atomic_number for block in document.blocks}))
        return f"{one_line(document.path)} has no such element; it holds {held}"
    faults = [fault.message for fault in document.faults if fault.severity == "error"]
    return f"{one_line(document.path)}: {one_line((faults or ['no element was found'])[0])}"


def ranges(numbers: Sequence[int]) -> str:
    """Elements in the usual short form, of rising atomic numbers: H-He, B, N-Ne."""
    parts = []
    for _, run in groupby(enumerate(numbers), key=lambda pair: pair[1] - pair[0]):
        members = [symbol_of(z) for _, z in run]
        parts.append(members[0] if len(members) == 1 else f"{members[0]}-{members[-1]}")
    return ", ".join(parts)


# ---- plain data


def write_json(description: Description, out: TextIO) -> None:
    """One object; the elements of all sets in one list, each with the number of its set."""
    document = description.document
    plain = {
        "path": document.path,
        "layout": document.layout or None,
        "faults": description.broken,
        "sets": [_set_object(each) for each in description.sets],
        "elements": [
            _element_object(each.ordinal, portrait)
            for each in description.sets
            for portrait in each.elements
        ],
    }
    json.dump(plain, out, indent=1, allow_nan=False)
    out.write("\n")


def _set_object(each: SetPortrait) -> dict[str, Any]:
    return {
        "set": each.ordinal,
        "label": each.claimed,
        "role": each.members.role,
        "elements": [portrait.block.symbol for portrait in each.elements],
        "best": _naming_object(each.best) if each.best else None,
        "doubtful": [_naming_object(naming) for naming in each.doubtful],
    }


def _naming_object(naming: Naming) -> dict[str, Any]:
    return {
        "label": str(naming.label),
        "fits": naming.fits,
        "of": naming.of,
        "for": list(naming.speaks_for),
        "against": list(naming.speaks_against),
    }


def _element_object(ordinal: int, portrait: Portrait) -> dict[str, Any]:
    block = portrait.block
    spherical, cartesian = function_counts(block)
    return {
        "element": block.symbol,
        "atomic_number": block.atomic_number,
        "set": ordinal,
        "line": block.line,
        "complete": block.complete,
        "notation": notation(block, ""),
        "primitives": _by_letter(primitives(block)[0]),
        "contracted": _by_letter(block.counts),
        "pattern": _by_letter({l: list(n) for l, n in lengths_of(block).items()}),
        "functions": {"spherical": spherical, "cartesian": cartesian, "stated": block.functions},
        "exponents": {
            letter_of(l): {"highest": high, "lowest": low}
            for l, (high, low) in exponent_limits(block).items()
        },
        "potential": _potential_object(block.potential) if block.potential else None,
        "labels": list(portrait.labels),
    }


def _by_letter(values: dict[int, Any]) -> dict[str, Any]:
    return {letter_of(l): value for l, value in values.items()}


def _potential_object(potential: Potential) -> dict[str, Any]:
    return {
        "electrons": potential.electrons,
        "channels": [
            {
                "letter": letter_of(channel.l),
                "local": channel.local,
                "kind": channel.kind,
                "terms": len(channel.powers),
            }
            for channel in potential.channels
        ],
    }
