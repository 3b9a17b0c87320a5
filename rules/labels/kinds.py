"""Spherical or Cartesian: what the functions of a set most likely are meant to be."""

from typing import NamedTuple

from overlapse.grammar.model import Block, Document
from overlapse.rules.families.kinds import usual_kind
from overlapse.rules.labels.claims import claims_of
from overlapse.rules.labels.naming import Ranking


class Kind(NamedTuple):
    """Whether functions are spherical, and who says so, in words."""

    spherical: bool
    because: str


class Kinds:
    """The kinds of a document's sets, each worked out when it is first asked for."""

    def __init__(self, document: Document) -> None:
        self._document = document
        self._by_set: dict[int, Kind] = {}

    def of(self, ordinal: int, block: Block) -> Kind:
        """The kind of a block of set number ``ordinal`` (from 0): its own mark, else by family."""
        if block.functions is not None:
            return Kind(block.functions == "spherical", "the file says so")
        if max(block.counts, default=0) < 2:
            return Kind(True, "it has s and p functions only")
        if ordinal not in self._by_set:
            self._by_set[ordinal] = self._by_family(ordinal)
        return self._by_set[ordinal]

    def _by_family(self, ordinal: int) -> Kind:
        claims = claims_of(self._document, None)[ordinal]
        for claim in claims:
            if claim.designation is not None and (usual := usual_kind(claim.designation)):
                return Kind(usual == "spherical", f"{claim.label} ({claim.where}) is used so")
        best = Ranking(self._document.sets[ordinal], claims).best
        if best is not None and (usual := usual_kind(best.label)):
            return Kind(usual == "spherical", f"{best.label}, which fits it best, is used so")
        return Kind(True, "most sets are")
