"""JSON with positions: the tokens of a text, and which of its brackets do not fit.

Sound innermost objects, and lists of them, are one token each and go through the standard library's
parser, so that a number costs next to nothing.  Only where something is wrong, or somebody asks,
an object or a list is taken apart into single tokens, each with its place.
"""

import json
import re
from collections.abc import Iterator
from contextlib import suppress
from typing import Any

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import Node
from overlapse.grammar.model import Span

Value = Token | Node

# A quote that is not closed on its line makes a word that ends before the next sign, or with its
# line if there are backslashes, which may hide quotes.
_QUOTED = r'"[^"\\\x00-\x1f]*(?:\\[^\x00-\x1f][^"\\\x00-\x1f]*)*"'
_BLANKS = r"[ \t\r\n]*"  # JSON knows no others
_SIGNS = r"(?P<OPEN>\{)|(?P<CLOSE>\})|(?P<BEGIN>\[)|(?P<END>\])|(?P<COMMA>,)|(?P<COLON>:)"
_SINGLE = (
    rf"(?P<NOTE>//[^\n]*|/\*[^\n]*|\#[^\n]*)"
    rf"|(?P<KEY>(?:{_QUOTED}|'[^'\n]*'|[A-Za-z_]\w*){_BLANKS}:)|(?P<STRING>{_QUOTED})|{_SIGNS}"
    rf'|(?P<WORD>"[^"\\\n]*\\[^\n]*|"[^"\n,:{{}}\[\]]*|[^ \t\r\n{{}}\[\],:"]+)'
)
_FINE = re.compile(rf"{_BLANKS}(?:{_SINGLE})")
_LEAF = r"\{[^{}\\]*\}"
_COARSE = re.compile(
    rf"{_BLANKS}(?:(?P<LEAF>{_LEAF})"
    rf"|(?P<LEAVES>\[{_BLANKS}{_LEAF}(?:{_BLANKS},{_BLANKS}{_LEAF})*{_BLANKS}\])"
    r'|(?P<FLAT>\[[^\[\]{}"\\]*(?:"[^"\\\n]*"[^\[\]{}"\\]*)*\])'
    rf"|{_SINGLE})"
)
LEAF_OBJECT = re.compile(_LEAF)
LISTS = ("array", "FLAT", "LEAVES")
CLOSES = {"CLOSE": "OPEN", "END": "BEGIN"}


class _Refused(ValueError):
    """Something that the standard library's parser takes and JSON does not."""


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    members = dict(pairs)
    if len(members) < len(pairs):
        raise _Refused
    return members


def _refuse(_constant: str) -> None:
    raise _Refused


DECODER = json.JSONDecoder(object_pairs_hook=_once, parse_constant=_refuse)


def kind_of(value: Value) -> str:
    return value.type if isinstance(value, Token) else str(value.data)


def span_of(value: Value) -> Span:
    """Where a token stands, or the first token of a tree."""
    while isinstance(value, Tree):
        value = value.children[0]
    return value.start_pos or 0, value.end_pos or 0


class JsonTokens:
    """The tokens of one text; where brackets do not fit, that is said."""

    def __init__(self, build: Build) -> None:
        self.build = build
        self.text = build.source.text
        self.leaves: dict[int, dict[str, Any]] = {}  # contents of the LEAF tokens, by offset
        self.said: set[Span] = set()  # where slips have been reported
        self.ends: dict[int, int] = {}  # where what opens at an offset ends
        self.damage: list[int] = []  # offsets where brackets do not fit

    def tree(self) -> Node:
        return self.build.parse(self._matched(self._scan(_COARSE, 0, len(self.text))))

    def expand(self, token: Token) -> Node:
        """The tree of a LEAF or FLAT token."""
        start, end = span_of(token)
        node = self.build.parse(self._matched(self._scan(_FINE, start, end))).children[0]
        assert isinstance(node, Tree)
        return node

    # ---- tokens

    def _scan(self, pattern: re.Pattern[str], at: int, end: int) -> Iterator[Token]:
        while match := pattern.match(self.text, at, end):
            kind = match.lastgroup or ""
            start, at = match.span(kind)
            if kind in ("LEAF", "LEAVES") and not self._is_sound(start, at):
                kind, at = "OPEN" if kind == "LEAF" else "BEGIN", start + 1
            yield Token(kind, self.text[start:at], start_pos=start, end_pos=at)

    def _is_sound(self, start: int, end: int) -> bool:
        with suppress(ValueError, RecursionError):
            found = DECODER.decode(self.text[start:end])
            if isinstance(found, dict):
                self.leaves[start] = found
                return True
            # A brace in a text makes the objects seem to be others than they are.
            places = [leaf.start() for leaf in LEAF_OBJECT.finditer(self.text, start, end)]
            self.leaves.update(zip(places, found, strict=True))
            return True
        return False

    def _matched(self, tokens: Iterator[Token]) -> Iterator[Token]:
        """The tokens without closing brackets that close nothing; says which do not fit.

        A bracket that fits the last but one opening bracket closes both.  Where the last one was
        closed too often in truth, a later bracket is left over: that is the same slip.
        """
        opened: list[Token] = []
        left_over = 0
        for token in tokens:
            if token.type in ("OPEN", "BEGIN"):
                opened.append(token)
            elif wanted := CLOSES.get(token.type):
                if opened and opened[-1].type == wanted:
                    self.ends[span_of(opened.pop())[0]] = span_of(token)[1]
                elif len(opened) > 1 and opened[-2].type == wanted:
                    self._say_mismatch(token, opened[-1])
                    left_over += 2  # one of either kind
                    self.ends |= {span_of(opener)[0]: span_of(token)[1] for opener in opened[-2:]}
                    del opened[-2:]
                else:
                    if left_over:
                        left_over -= 1
                    else:
                        self._say_mismatch(token, opened[-1] if opened else None)
                    continue
            yield token
        if opened and not self.damage:
            self._say_unclosed(opened[-1])

    # ---- faults

    def fault(self, where: Value | Span, message: str, **details: Any) -> None:
        """A slip in the form of the JSON; the first at a place stands for all."""
        span = where if isinstance(where, tuple) else span_of(where)
        if span not in self.said:
            self.said.add(span)
            self.build.fault("form.syntax", span, message, **details)

    def _say_mismatch(self, token: Token, opener: Token | None) -> None:
        self.damage.append(token.start_pos or 0)
        if opener is None:
            message, closer = f"this `{token}` closes nothing", None
        else:
            closer = "}" if opener == "{" else "]"
            line = self.build.source.place(opener.start_pos or 0).line
            message = f"`{token}` stands here, but `{opener}` of line {line} is still open"
        self.fault(
            token,
            message,
            measured=str(token),
            expected=closer,
            remedy="a bracket was lost or added before this place",
        )

    def _say_unclosed(self, opener: Token) -> None:
        self.damage.append(opener.start_pos or 0)
        self.fault(
            opener,
            f"this `{opener}` is not closed before the text ends",
            expected="}" if opener == "{" else "]",
            remedy="the file was cut off, or a bracket was lost",
        )
