"""Lines of elements with counted sets: which heads an element, which a set."""

import re

from overlapse.grammar.drafts import integer
from overlapse.grammar.elements import number_of
from overlapse.grammar.pieces.setheadings import heading_of

# An element's symbol, which an atom's number may follow.
SYMBOL = re.compile(r"([A-Za-z]{1,3})_?\d*")

_LIKE_SYMBOL = re.compile(r"[A-Z][A-Za-z]?\d*")


class SetLines:
    """Names the lines of a text."""

    def __init__(self, bodies: list[str]) -> None:
        self.bodies = bodies
        self.width = 0  # of a row of the set whose heading was met last

    def classify(self, body: str, index: int) -> str:
        """The token of a line that does not begin like a number."""
        words = body.split()
        if body.lower() == "end":
            return "END"
        if not any(map(str.isalnum, body)):
            return "RULED"
        if self.is_element(words, index):
            return "ELEMENT"
        # A heading whose first number is misspelt does not begin like a number.
        return "SHELL" if len(words) > 4 and _odd(words) < 2 else "TEXT"

    def is_element(self, words: list[str], index: int) -> bool:
        """Whether a line opens an element: its symbol says so, and what follows must fit."""
        below, after = self.following(index)
        counted = integer(below) is not None
        if counted and _is_heading(after):
            return True
        if not _is_symbol(words[0]):
            return _is_heading(below) and _LIKE_SYMBOL.fullmatch(words[0]) is not None
        if counted or _is_heading(below):
            return True
        named = len(words) > 1 and words[1][0].isalpha() and not words[1].islower()
        if below and _is_symbol(below.split()[0]):
            return named and integer(after) is not None  # nothing follows but the next element
        return _is_heading(after) or (named and below.lower() in ("", "end"))

    def following(self, index: int) -> tuple[str, str]:
        """The next two lines that are neither blank nor a comment, "" past the end."""
        bodies = self.bodies
        said = filter(None, map(bodies.__getitem__, range(index + 1, len(bodies))))
        return next(said, ""), next(said, "")

    def numeric_heading(self, body: str) -> str | None:
        """COUNT for a lone whole number, SHELL for the heading of a set, None for a row."""
        if "." in body:
            return None
        if (heading := heading_of(body)) is not None:
            self.width = heading.width
            return "SHELL"
        words = body.split()
        if len(words) == 1:
            ruled = not any(map(str.isdigit, body))
            return "COUNT" if integer(body) is not None else "RULED" if ruled else None
        # A row may be written without any decimal point, and a heading may be misspelt.
        is_row = len(words) < 4 or len(words) == self.width or _odd(words) > 1
        return None if is_row else "SHELL"


def _is_symbol(word: str) -> bool:
    match = SYMBOL.fullmatch(word)
    return match is not None and number_of(match[1]) is not None


def _odd(words: list[str]) -> int:
    """How many of the words are no whole numbers."""
    return sum(integer(word) is None for word in words)


def _is_heading(body: str) -> bool:
    return heading_of(body) is not None
