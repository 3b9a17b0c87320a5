"""What a layout is: a name, how to recognise it, how to read it."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.model import Document
from overlapse.grammar.source import Source


class Evidence(NamedTuple):
    """Why a text looks like a layout.

    strength: 1 to 100.  Marks that no other layout has (a keyword of its own) come above 80, a
    heading pattern followed by numbers 50 to 80, a mere resemblance below.
    reason: the marks in words, for the reader of a report.
    """

    strength: int
    reason: str


class Written(NamedTuple):
    """A document in another layout: the text, and what the layout could not express."""

    text: str
    losses: tuple[str, ...]


@dataclass(frozen=True)
class Layout:
    """One text layout.

    name: by structure.  summary: one line.  picture: a few lines of the layout with invented
    numbers.  comment: the signs that start a comment.  recognise: the evidence in a text, or None.
    read: text to document; never raises on bad text, but says what is wrong in the faults.
    write: document to text in this layout, with the digits as they were spelled.
    raw_primitives: whether texts of this layout may have coefficients over raw primitives; to all
        others a document is written with its coefficients over normalised ones.
    highest: highest angular momentum that the layout has a sign for.
    any_line: whether line ends mean nothing here, so that a line may be as long as it likes.
    """

    name: str
    summary: str
    picture: str
    comment: str
    recognise: Callable[[Source], Evidence | None]
    read: Callable[[Source], Document]
    write: Callable[[Document], Written]
    raw_primitives: bool = False
    any_line: bool = False
    highest: int = 20

    def __post_init__(self) -> None:
        if not self.raw_primitives:
            object.__setattr__(self, "write", _over_normalised(self.write))


def _over_normalised(write: Callable[[Document], Written]) -> Callable[[Document], Written]:
    """A writer that is never handed coefficients over raw primitives."""

    def written(document: Document) -> Written:
        text, losses = write(over_normalised(document))
        if document.raw_primitives:
            losses += ("coefficients over raw primitives became ones over normalised primitives",)
        return Written(text, losses)

    return written
