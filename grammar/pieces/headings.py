"""Lines of bare whole numbers: headings of counted tables, and counts of rows.

Tokens: HEAD for two whole numbers (and a 0 behind them), COUNT for one.
"""

import re
from functools import lru_cache
from typing import NamedTuple

from lark import Token

_WHOLE = re.compile(
    r"([0-9OolI]+)(?:[ \t]+([0-9OolI]+)(?:[ \t]+([0-9OolI]+))?)?(?:[ \t]+(?![0-9.+\-])\S.*)?"
)
DIGITS = str.maketrans("OolI", "0011")


class Heading(NamedTuple):
    """What the heading of a table announces; ``flagged`` if a third number stands behind."""

    primitives: int
    contractions: int
    flagged: bool

    @property
    def numbers(self) -> int:
        return self.primitives * (1 + self.contractions)


def whole(body: str) -> str | None:
    """Token of a line of bare whole numbers: HEAD for two (and a 0), COUNT for one, else None."""
    if "." in body and body[: body.index(".")].isalnum():
        return None  # nearly all numbers of tables have a point
    match = _WHOLE.fullmatch(body)
    if match is None:
        return None
    first, second, third = match.groups()
    if second is None:
        return "COUNT" if first.isdigit() else None
    if third is not None and third not in "0Oo":
        return None
    return "HEAD"


@lru_cache(1024)
def heading_of(token: str) -> Heading:
    """The announced numbers of a HEAD token."""
    match = _WHOLE.fullmatch(token)
    assert match is not None
    first, second, third = match.groups()
    return Heading(_value(first), _value(second), third is not None)


def count_of(token: Token) -> int:
    """The number of a COUNT token."""
    return _value(token.split()[0])


def _value(word: str) -> int:
    # An absurd count need only stay absurd.
    return int(word.translate(DIGITS)[:18])


def spanning(first: Token, last: Token) -> Token:
    """One ROWS token for the lines of several tokens."""
    if first is last and first.type == "ROWS":
        return first
    return Token("ROWS", "", line=first.line, end_line=last.end_line)


def sensible(tokens: list[Token]) -> list[Token]:
    """The tokens with HEADs such as `0 1`, which announce nothing, as the rows they are."""
    done: list[Token] = []
    for token in tokens:
        if token.type == "HEAD":
            heading = heading_of(token)
            if heading.primitives == 0 < heading.contractions:
                token = spanning(token, token)
        if done and done[-1].type == token.type == "ROWS":
            done[-1] = spanning(done[-1], token)
        else:
            done.append(token)
    return done
