"""Views of a JSON text's tree that report slips as they meet them.

JSON is strict, and so are programs that read it: a missing comma makes a text unreadable to them.
Here each slip is a finding, and what follows it is read all the same.
"""

import json
from collections.abc import Iterator
from contextlib import suppress
from dataclasses import dataclass, field

from lark import Token, Tree

from overlapse.grammar.drafts import Node, leading, shorten
from overlapse.grammar.model import Span
from overlapse.grammar.numbers import read_number
from overlapse.grammar.pieces.jsontokens import (
    CLOSES,
    LEAF_OBJECT,
    JsonTokens,
    Value,
    kind_of,
    span_of,
)


@dataclass
class Members:
    """What an object holds.

    entries: key token and value (None where it is missing) by name.  whole: False where a part of
    the object could not be made out, so that what seems missing may have been there.
    """

    opener: Span
    entries: dict[str, tuple[Token, Value | None]] = field(default_factory=dict)
    whole: bool = True

    def get(self, name: str) -> Value | None:
        """The value of a member, None if there is none or it is null."""
        value = self.entries[name][1] if name in self.entries else None
        return None if isinstance(value, Token) and value == "null" else value


class JsonText(JsonTokens):
    """Objects, their members and the items of lists, out of the tree of one text."""

    def is_damaged(self, value: Value) -> bool:
        """Whether a bracket that does not fit stands inside."""
        start, end = self.extent(value) if self.damage else (0, 0)
        return any(start <= offset < end for offset in self.damage)

    def extent(self, value: Value) -> Span:
        """From the first to past the last character of an object or a list."""
        start, end = span_of(value)
        return start, end if isinstance(value, Token) else self.ends.get(start, len(self.text))

    def holders(
        self, tree: Node, name: str, nested: bool = True
    ) -> Iterator[tuple[Token | None, Node]]:
        """The objects that have a member of some name, in the order of the text.

        ``nested``: also those inside others.  Each comes with the key that it is the value of, None
        if it is in a list or by itself.
        """
        waiting: list[tuple[Token | None, Value]] = [(None, tree)]
        while waiting:
            key, node = waiting.pop()
            if isinstance(node, Token):
                if node.type != "LEAF" or name not in self.leaves[span_of(node)[0]]:
                    continue
                node = self.expand(node)
            if node.data == "object" and any(name_of(k) == name for k, _ in pairs_in(node)):
                yield key, node
                if not nested:
                    continue
            first = node.children[0] if node.data == "pair" else None
            key = first if isinstance(first, Token) else None
            waiting += [(key, child) for child in reversed(node.children)]

    def members(self, value: Value) -> Members:
        """The members of an object; to be called once, because it says what is wrong."""
        node = self.expand(value) if isinstance(value, Token) else value
        found = Members(span_of(node))
        for pair in self._items(node, found):
            assert isinstance(pair, Tree)
            key, *rest = pair.children
            assert isinstance(key, Token)
            if key[0] != '"':
                self.fault(key, "names stand in double quotes", expected=f'"{name_of(key)}":',
                           remedy=f'write "{name_of(key)}":')  # fmt: skip
            for part in (key, *rest):
                if isinstance(part, Token) and part[0] == '"' and _has_false_escape(part):
                    self.fault(part, "a backslash here begins no escape that JSON knows",
                               expected="\\\\", remedy="write two backslashes for one")  # fmt: skip
            if not rest:
                found.whole = False
                self.fault(key, f"no value follows the name {name_of(key)!r}",
                           remedy="restore the value from the source")  # fmt: skip
            elif not _is_closed(rest[0]):
                found.whole = False  # what it swallowed may belong here
            elif _is_unquoted(rest[0]):
                found.whole = False
                word = shorten(str(rest[0]))
                self.fault(rest[0], f"{word!r} is no value: texts stand in double quotes",
                           measured=word, expected='"', remedy="mend the quotes")  # fmt: skip
            if name_of(key) in found.entries:
                before = self.build.source.place(found.entries[name_of(key)][0].start_pos or 0)
                self.build.fault(
                    "form.repeat",
                    span_of(key),
                    f"{name_of(key)!r} was already given on line {before.line}: "
                    "most programs take the last and drop the others without a word",
                    measured=2,
                    expected=1,
                    remedy="keep one of them, or mend the name",
                )
                continue
            found.entries[name_of(key)] = (key, rest[0] if rest else None)
        return found

    def items(self, value: Value) -> tuple[list[Value], bool]:
        """The items of a list, and whether it is whole; to be called once, like `members`."""
        if isinstance(value, Token) and value.type == "LEAVES":
            found = LEAF_OBJECT.finditer(self.text, *span_of(value))
            return [Token("LEAF", m[0], start_pos=m.start(), end_pos=m.end()) for m in found], True
        node = self.expand(value) if isinstance(value, Token) else value
        members = Members(span_of(node))
        return list(self._items(node, members)), members.whole

    def _items(self, node: Node, found: Members) -> Iterator[Value]:
        """What stands between the commas of an object or a list."""
        closed = _is_closed(node)
        found.whole = closed
        # Where a bracket does not fit, that has been reported: the rest follows from it.
        quiet = not closed or self.is_damaged(node)
        said, lacking = quiet, False
        comma: Token | None = None
        filled = False
        for child in node.children[1 : -1 if closed else None]:
            kind = kind_of(child)
            if kind == "NOTE":
                self.fault(child, "JSON has no comments", remedy="take the comment out")
            elif isinstance(child, Token) and kind == "COMMA":
                if not filled and not said:
                    self._say_comma(child)
                said, filled, comma = quiet, False, child
            elif (kind == "pair") != (node.data == "object") or kind == "COLON":
                if not said:
                    self._say_misfit(child, node)
                found.whole, said, filled = False, True, True
            else:
                if filled and not said and not lacking:
                    self.fault(span_of(child), "a comma is missing before this",
                               expected=",", remedy="put commas between all items")  # fmt: skip
                    lacking = True
                filled, said = True, quiet
                yield child
        if comma is not None and not filled and not said:
            self._say_comma(comma)

    def _say_comma(self, comma: Token) -> None:
        self.fault(
            comma,
            "a comma too many: it stands between two items and nowhere else",
            measured=",",
            remedy="take the comma out, or restore what is missing beside it",
        )

    def _say_misfit(self, child: Value, node: Node) -> None:
        start, end = span_of(child)
        word = shorten(self.text[start:end])
        in_object = node.data == "object"
        wanted = 'a name and a colon, such as `"exponents":`,' if in_object else "a value"
        hint = "; a quote is missing" if word[0] == '"' and word[-1] != '"' else ""
        self.fault(
            child,
            f"{word!r} stands where {wanted} belongs{hint}",
            measured=word,
            remedy="mend the quotes, or take this out",
        )


def _is_unquoted(value: Value) -> bool:
    """Whether a value is neither a number nor likely meant as one."""
    return (
        isinstance(value, Token)
        and value.type == "WORD"
        and value not in ("true", "false", "null")
        and read_number(value).value is None
    )


def _has_false_escape(text: Token) -> bool:
    if "\\" in text:
        try:
            json.loads(text.rstrip(": \t\r\n") if text.type == "KEY" else text)
        except ValueError:
            return True
    return False


def _is_closed(value: Value) -> bool:
    last = value.children[-1] if isinstance(value, Tree) else None
    return last is None or (isinstance(last, Token) and last.type in CLOSES)


def name_of(key: Token) -> str:
    """The name that a KEY token spells."""
    word = key[:-1].rstrip()
    if "\\" in word:
        with suppress(ValueError):
            return str(json.loads(word))
    return word.strip("\"'")


def string_of(value: Value | None) -> str | None:
    """The text of a STRING token, None for anything else."""
    if not isinstance(value, Token) or value.type != "STRING":
        return None
    with suppress(ValueError):
        return str(json.loads(value))
    return value.strip('"')


def pairs_in(node: Node) -> Iterator[tuple[Token, Value | None]]:
    """Keys and values of a node, without a word on what is wrong."""
    for child in node.children:
        if isinstance(child, Tree) and child.data == "pair":
            key = leading(child)
            yield key, child.children[1] if len(child.children) > 1 else None
