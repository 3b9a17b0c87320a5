"""Where the keys of a TOML text stand.

TOML libraries give values without places; a message about a wrong one needs them.
"""

import json
from contextlib import suppress
from pathlib import Path
from typing import NamedTuple

from lark import Lark, Token, Tree
from lark.exceptions import LarkError

from overlapse.grammar.source import Place

Node = Tree[Token]


class KeyPlaces(NamedTuple):
    """Where a key stands, and where its value begins."""

    key: Place
    value: Place


def places(text: str) -> dict[str, KeyPlaces]:
    """Places of all keys, by dotted path.

    Members of arrays have their index in the path ("where.0.paths"); quotes around a key are left
    out, so that ``"label.unknown"`` and ``label.unknown`` have one path.  Empty for a text that is
    no TOML.
    """
    grammar = Path(__file__).with_name("toml.lark").read_text("utf-8")
    parser = Lark(grammar, parser="lalr", maybe_placeholders=False, propagate_positions=True)
    found = _Places()
    with suppress(LarkError):
        found.statements(parser.parse(text if text.endswith("\n") else text + "\n"))
    return found.places


class _Places:
    def __init__(self) -> None:
        self.places: dict[str, KeyPlaces] = {}
        self._lengths: dict[str, int] = {}  # of arrays of tables

    def statements(self, tree: Node) -> None:
        prefix = ""
        for statement in _trees(tree):
            if statement.data == "pair":
                self._pair(prefix, statement)
                continue
            (key,) = _trees(statement)
            prefix = self._table(key, statement.data == "tables")

    def _table(self, key: Node, is_array: bool) -> str:
        names = _names(key)
        prefix = ""
        for at, name in enumerate(names, 1):
            prefix = _join(prefix, name)
            if at == len(names) and is_array:
                self._lengths[prefix] = self._lengths.get(prefix, 0) + 1
            self._put(prefix, key)
            if prefix in self._lengths:
                prefix = _join(prefix, str(self._lengths[prefix] - 1))
                self._put(prefix, key)
        return prefix

    def _pair(self, prefix: str, pair: Node) -> None:
        key, value = pair.children
        assert isinstance(key, Tree)
        for name in _names(key):
            prefix = _join(prefix, name)
            self._put(prefix, key, value)
        self._value(prefix, value)

    def _value(self, prefix: str, value: Token | Node) -> None:
        if not isinstance(value, Tree):
            return
        if value.data == "inline":
            for pair in _trees(value):
                self._pair(prefix, pair)
        elif value.data == "array":
            for index, member in enumerate(value.children):
                path = _join(prefix, str(index))
                self._put(path, member)
                self._value(path, member)

    def _put(self, path: str, key: Token | Node, value: Token | Node | None = None) -> None:
        self.places.setdefault(path, KeyPlaces(_place(key), _place(value or key)))


def _trees(tree: Node) -> list[Node]:
    return [child for child in tree.children if isinstance(child, Tree)]


def _names(key: Node) -> list[str]:
    return [_unquoted(str(part)) for part in key.children]


def _unquoted(part: str) -> str:
    if part.startswith('"'):
        with suppress(ValueError):
            return str(json.loads(part))
    return part.strip("\"'")


def _join(prefix: str, name: str) -> str:
    return f"{prefix}.{name}" if prefix else name


def _place(node: Token | Node) -> Place:
    if isinstance(node, Token):
        return Place(node.line or 1, node.column or 1)
    # An array or a table without members has no place of its own in the tree.
    return Place(getattr(node.meta, "line", 1), getattr(node.meta, "column", 1))
