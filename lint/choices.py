"""Which block of which basis file each atom of a geometry gets."""

import os
import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import NamedTuple

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.designation import parse_label
from overlapse.grammar.elements import number_of
from overlapse.grammar.geometry import Atom, Frame
from overlapse.grammar.model import BasisSet, Block, Document
from overlapse.rules.labels.claims import claims_of
from overlapse.rules.labels.kinds import Kinds
from overlapse.rules.measured.site import Site

_ATOMS = re.compile(r"(\d+)(?:-(\d+))?")


class ChoiceError(ValueError):
    """A choice that cannot be made; the message says why."""


class Use(NamedTuple):
    """A choice by hand: a file for an element, or for some atoms, counted from 1."""

    path: Path
    element: int = 0
    atoms: range = range(0)

    def meets(self, number: int, atom: Atom) -> bool:
        return number in self.atoms or atom.atomic_number == self.element


def parsed_use(text: str) -> list[Use]:
    """Read ``C=file``, ``3=file`` or ``1-4,7=file``.  Raises ChoiceError for anything else."""
    who, sign, path = text.partition("=")
    if not sign or not path or not who.strip():
        raise ChoiceError(f"{text!r}: write an element or atom numbers, =, and a file: C=c.basis")
    uses = []
    for word in map(str.strip, who.split(",")):
        if match := _ATOMS.fullmatch(word):
            first, last = int(match[1]), int(match[2] or match[1])
            if not 1 <= first <= last:
                raise ChoiceError(f"{word!r}: atoms are counted from 1, the lower number first")
            uses.append(Use(Path(path), atoms=range(first, last + 1)))
        elif (number := number_of(word)) is not None:
            uses.append(Use(Path(path), element=number))
        else:
            raise ChoiceError(f"{word!r} is neither an element nor the number of an atom")
    return uses


@dataclass(frozen=True)
class Shelf:
    """The basis files of a run.

    originals: the documents as they were read, in the order given; those that only serve choices by
    hand come last.  documents: the same, coefficients over normalised primitives.  general: how
    many of them serve all atoms.  uses: choices by hand, each with the index of its document.
    wanted: label of the set to take where a file has several.  spherical: kind of all functions,
    None to follow each file.
    """

    originals: tuple[Document, ...]
    documents: tuple[Document, ...]
    general: int
    uses: tuple[tuple[Use, int], ...] = ()
    wanted: str = ""
    spherical: bool | None = None
    kinds: dict[int, Kinds] = field(default_factory=dict, compare=False)

    def sites(self, frame: Frame) -> tuple[list[Site], list[Atom]]:
        """The atoms of a frame with their blocks, and those for which no file has functions."""
        found: list[Site] = []
        lacking = []
        elements = frame.elements
        chosen: dict[tuple[int, int], Site | None] = {}
        for number, atom in enumerate(frame.atoms, 1):
            file = next((k for use, k in self.uses[::-1] if use.meets(number, atom)), -1)
            key = (atom.atomic_number, file)
            if key not in chosen:
                chosen[key] = self._site(atom, file, elements)
            site = chosen[key]
            if site is None:
                lacking.append(atom)
            else:
                found.append(site._replace(atom=atom))
        return found, lacking

    def _site(self, atom: Atom, file: int, elements: Sequence[int]) -> Site | None:
        for index in range(self.general) if file < 0 else (file,):
            document = self.documents[index]
            ordinal = self._set(index, atom.atomic_number, elements)
            if ordinal is None:
                continue
            block = block_of(document.sets[ordinal], atom.atomic_number)
            if block is not None:
                kinds = self.kinds.setdefault(index, Kinds(document))
                kind = self.spherical
                spherical = kinds.of(ordinal, block).spherical if kind is None else kind
                fitting = document.sets[ordinal].role == "fitting"
                return Site(atom, document.path, block, spherical, fitting)
        return None

    def _set(self, index: int, element: int, elements: Sequence[int]) -> int | None:
        """The set of a file that serves an element: the wanted one, or the first that covers."""
        document = self.documents[index]
        sets = document.sets
        if self.wanted:
            labels = _labelled(document, self.wanted)
            return labels[0] if labels else None
        holding = [k for k, members in enumerate(sets) if block_of(members, element)]
        for ordinal in holding:
            if all(block_of(sets[ordinal], other) for other in elements):
                return ordinal
        return holding[0] if holding else None

    def because(self, atom: Atom) -> str:
        """Why an atom has no functions, in words."""
        files = ", ".join(document.path for document in self.documents[: self.general])
        several = self.general > 1
        lack = f"no functions for {atom.symbol} in {'any of ' if several else ''}{files}"
        return lack + (f" (set {self.wanted})" if self.wanted else "")


def block_of(members: BasisSet, element: int) -> Block | None:
    """The first block of an element that has functions (and not only a core potential)."""
    return next((b for b in members.blocks if b.atomic_number == element and b.shells), None)


def _labelled(document: Document, wanted: str) -> list[int]:
    """Sets of a document that bear a label, in any of its spellings."""
    label = parse_label(wanted)
    claims = claims_of(document, None)
    return [
        k
        for k in range(len(document.sets))
        if any(
            claim.label.lower() == wanted.lower()
            or (label is not None and claim.designation == label)
            for claim in claims[k]
        )
    ]


def shelf(
    documents: Sequence[Document],
    uses: Sequence[tuple[Use, Document]] = (),
    *,
    wanted: str = "",
    spherical: bool | None = None,
) -> Shelf:
    """A shelf of documents that have been read.

    Raises ChoiceError where no document has the set that is wanted.
    """
    held = list(documents)
    places: dict[str, int] = {}
    made: list[tuple[Use, int]] = []
    for use, document in uses:
        name = os.fspath(use.path)
        if name not in places:
            places[name] = len(held)
            held.append(document)
        made.append((use, places[name]))
    if wanted and not any(_labelled(document, wanted) for document in held):
        known = [
            claim.label for d in held for each in claims_of(d, None).values() for claim in each
        ]
        raise ChoiceError(
            f"no set is called {wanted!r}; there is {', '.join(dict.fromkeys(known)) or 'no label'}"
        )
    turned = tuple(map(over_normalised, held))
    return Shelf(tuple(held), turned, len(documents), tuple(made), wanted, spherical)
