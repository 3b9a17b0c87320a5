"""Labels of basis sets, taken apart: what a name claims, before anybody asks whether it is true."""

import re
from dataclasses import dataclass
from functools import cache
from typing import Literal

from lark import Lark, Token, Tree
from lark.exceptions import UnexpectedInput

from overlapse.grammar.compiled import grammar

_LETTERS = "spdfghi"
# Cheap test that spares most words of a comment the parser.
_HOPEFUL = re.compile(r"sto-?_?[1-9]g|[1-9][-_]?[1-9]{2,3}[+pP]{0,2}g", re.IGNORECASE)
# Ends that make another set of a label; none of them is the plain set.
_ENDINGS = re.compile(r"\.[A-Za-z0-9]{1,10}$")


@dataclass(frozen=True)
class Designation:
    """A label taken apart.

    family: "STO-nG" or "N-MPG".  core: primitives of each core function (n of STO-nG).  valence:
    primitives of each valence function, tight to loose; () for STO-nG.  diffuse: 0, 1 ("+", heavy
    atoms) or 2 ("++", hydrogen as well).  heavy, light: number of polarization functions by
    angular momentum, for Li and beyond and for H and He.  stars: 1 or 2 where they were written
    as stars, because a star means different things in different rows.
    """

    family: Literal["STO-nG", "N-MPG"]
    core: int
    valence: tuple[int, ...] = ()
    diffuse: int = 0
    heavy: tuple[tuple[int, int], ...] = ()
    light: tuple[tuple[int, int], ...] = ()
    stars: int = 0

    def __str__(self) -> str:
        """The label in its usual form."""
        if self.family == "STO-nG":
            return f"STO-{self.core}G{'*' * self.stars}"
        digits = "".join(map(str, self.valence))
        return f"{self.core}-{digits}{'+' * self.diffuse}G{self._polarization()}"

    def _polarization(self) -> str:
        if self.stars:
            return "*" * self.stars
        if not self.heavy and not self.light:
            return ""
        return "(" + ",".join(filter(None, (_terms(self.heavy), _terms(self.light)))) + ")"

    @property
    def parent(self) -> "Designation":
        """The undecorated set."""
        return Designation(self.family, self.core, self.valence)


def _terms(terms: tuple[tuple[int, int], ...]) -> str:
    return "".join(f"{count if count > 1 else ''}{_LETTERS[l]}" for l, count in terms)


@cache
def _parser() -> Lark:
    return grammar("designation")


@cache
def parse_label(label: str) -> Designation | None:
    """Take a label apart, or return None for one that is not understood.

    Letter case does not matter; "*" may be written "s" as file names have it.
    """
    words = label.strip()
    if not _HOPEFUL.match(words):
        return None
    try:
        tree = _parser().parse(words)
    except UnexpectedInput:
        return None
    node = tree.children[0]
    assert isinstance(node, Tree)
    return _slater(node) if node.data == "slater" else _split(node)


def label_in_file_name(name: str) -> str | None:
    """The label that a file's name is, as it stands there, or None.

    ``6-31Gs.dat`` and ``6-31+G*`` are labels; a name with anything else in it is none.
    """
    stem = _ENDINGS.sub("", name)
    return next((text for text in (name, stem) if parse_label(text) is not None), None)


def _slater(node: Tree[Token]) -> Designation:
    (n,) = (int(t) for t in node.children if isinstance(t, Token) and t.type == "DIGIT")
    stars = next((_stars(t) for t in node.children if isinstance(t, Tree)), 0)
    return Designation("STO-nG", n, stars=stars)


def _stars(node: Tree[Token]) -> int:
    return min(2, len(node.children))


def _split(node: Tree[Token]) -> Designation:
    tokens = {t.type: str(t) for t in node.children if isinstance(t, Token)}
    trees = {str(t.data): t for t in node.children if isinstance(t, Tree)}
    diffuse = min(2, len(trees["diffuse"].children)) if "diffuse" in trees else 0
    stars = _stars(trees["star"]) if "star" in trees else 0
    parts = [_counts(part) for part in trees["listed"].children] if "listed" in trees else []
    heavy = parts[0] if parts else (((2, 1),) if stars else ())
    light = parts[1] if len(parts) > 1 else (((1, 1),) if stars == 2 else ())
    return Designation(
        "N-MPG",
        int(tokens["DIGIT"]),
        tuple(int(digit) for digit in tokens["VALENCE"]),
        diffuse,
        heavy,
        light,
        stars,
    )


def _counts(part: Token | Tree[Token]) -> tuple[tuple[int, int], ...]:
    """(l, count) for a list of terms such as 3df: three d functions and an f function."""
    assert isinstance(part, Tree)
    counts: dict[int, int] = {}
    for term in part.children:
        word = str(term).lower()
        l = _LETTERS.index(word[-1])
        counts[l] = counts.get(l, 0) + (int(word[0]) if len(word) > 1 else 1)
    return tuple(sorted(counts.items()))
