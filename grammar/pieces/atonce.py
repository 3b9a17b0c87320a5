"""Texts of the open schema with nothing amiss, read at once.

The standard library's parser takes the whole text, and all numbers are converted together.  Where
objects stand is told by their braces, which come in the order of the parser's objects.  Whatever is
not plainly as the schema wants it raises `_Doubt`: the text is then read token by token, which says
what is wrong with it.
"""

import re
from collections.abc import Iterator
from contextlib import suppress
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft
from overlapse.grammar.model import Document, Floats, Potential, Remark
from overlapse.grammar.pieces.centrewise import settle_functions, sizes_of, symbol_in
from overlapse.grammar.pieces.jsontokens import DECODER
from overlapse.grammar.pieces.leaves import (
    Shape,
    channels_of,
    shapes_of,
    shells_of,
    tables_of,
    terms_of,
)
from overlapse.grammar.source import Source

_NESTED = (dict, list)
_CENTRE = {"electron_shells", "ecp_electrons", "ecp_potentials"}
_COLON = re.compile(r"[ \t\r\n]*:[ \t\r\n]*")
_MANY = 10**15  # no count comes near


class _Doubt(Exception):
    """Something that has to be looked at more closely."""


def document_of(source: Source) -> Document | None:
    """The document of a text, None where something might be wrong with it."""
    with suppress(_Doubt, LookupError, TypeError, ValueError, RecursionError):
        return _AtOnce(source).document()
    return None


class _Centre(NamedTuple):
    """A centre, and which objects of the text (counted from 0) are its shells, at what depth."""

    block: BlockDraft
    shells: range
    depth: int


class _Places:
    """Where things stand in a text.

    opens, closes: offsets of the braces; opening_lines, closing_lines: their lines (0-based).
    """

    def __init__(self, source: Source) -> None:
        self.text = source.text
        codes = np.frombuffer(source.text.encode("latin-1", "replace"), np.uint8)
        self.line_ends = np.flatnonzero(codes == ord("\n"))
        if "\r" in source.text:
            self.line_ends = np.array(source.starts[1:]) - 1
        opens, closes = np.flatnonzero(codes == ord("{")), np.flatnonzero(codes == ord("}"))
        self.opens: list[int] = opens.tolist()
        self.closes: list[int] = closes.tolist()
        self.opening_lines: list[int] = np.searchsorted(self.line_ends, opens).tolist()
        self.closing_lines: list[int] = np.searchsorted(self.line_ends, closes).tolist()

    def line_of(self, offset: int) -> int:
        """0-based line of an offset."""
        return int(np.searchsorted(self.line_ends, offset))

    def name_of(self, at: int, name: str) -> tuple[int, int]:
        """Offset and line of the name of an object, which is counted from 0."""
        opening = self.opens[at]
        end = self.text.rfind('"', 0, opening) + 1
        start = end - len(name) - 2
        if self.text[start:end] != f'"{name}"':
            raise _Doubt
        on_one_line = self.text[end:opening].isprintable()
        return start, self.opening_lines[at] if on_one_line else self.line_of(start)

    def value_at(self, name: str, start: int, end: int) -> int:
        """Offset of the value of a member whose name stands between two offsets just once."""
        key = f'"{name}"'
        at = self.text.find(key, start, end)
        colon = _COLON.match(self.text, at + len(key)) if at > 0 else None
        if not colon or self.text[at - 1] == "\\" or self.text.find(key, at + 1, end) > 0:
            raise _Doubt
        return colon.end()


class _AtOnce:
    """Meets the objects of one text in their order, and counts them."""

    def __init__(self, source: Source) -> None:
        self.source = source
        self.build = Build(source, "schema", windows=())
        self.places = _Places(source)
        self.met = 0  # objects so far
        self.bases: list[tuple[dict[str, Any], range]] = []  # and which centres are theirs
        self.centres: list[_Centre] = []
        self.leaves: list[dict[str, Any]] = []  # the shells of all centres

    def document(self) -> Document:
        text = self.source.text
        # The other reader trims names, so that two of them may be one.
        if "'\"" in text or "\"'" in text:
            raise _Doubt
        self.visit(DECODER.decode(text), 0)
        found = shapes_of(self.leaves)
        # Braces in texts would make all objects behind them seem to stand elsewhere.
        all_met = self.met == len(self.places.opens) == len(self.places.closes)
        if found is None or not self.bases or not all_met:
            raise _Doubt
        shared = list(self.shared_out(*found))
        for basis, centres in self.bases:
            _check_map(basis, shared[centres.start : centres.stop])
        return self.build.document()

    # ---- objects in their order

    def visit(self, value: Any, depth: int, in_basis: bool = False) -> None:
        """Meet the objects in a value that stands in so many others; read those that are bases."""
        members = value
        if type(value) is dict:
            if "center_data" in value and not in_basis:
                self.basis(value, depth)
                return
            self.met += 1
            members, depth = value.values(), depth + 1
        for member in members:
            if type(member) in _NESTED:
                self.visit(member, depth, in_basis)

    def basis(self, basis: dict[str, Any], depth: int) -> None:
        start, first, label = self.places.opens[self.met], len(self.centres), basis["name"]
        self.met += 1
        if type(label) is not str or not all(map(_is_harmless, basis.values())):
            raise _Doubt
        for name, value in basis.items():
            if name == "center_data":
                self.centres_of(value, label or None, depth + 1)
            elif type(value) in _NESTED:
                self.visit(value, depth + 1, True)
        self.bases.append((basis, range(first, len(self.centres))))
        described = basis.get("description")
        if type(described) is str and described:
            end = self.places.closes[self.met - 1 - depth]
            line = self.places.line_of(self.places.value_at("description", start, end))
            self.build.remarks.append(Remark(described, line + 1))

    def centres_of(self, centres: Any, label: str | None, depth: int) -> None:
        if type(centres) is not dict:
            raise _Doubt
        self.met += 1
        for name, centre in centres.items():
            symbol = symbol_in(name)
            if symbol is None or type(centre) is not dict or not centre.keys() <= _CENTRE:
                raise _Doubt
            start, line = self.places.name_of(self.met, name)
            block = self.build.open_block(symbol, line, section=str(start), label=label)
            self.centre(block, centre, depth + 1)

    def centre(self, block: BlockDraft, centre: dict[str, Any], depth: int) -> None:
        start = self.places.opens[self.met]
        lists: dict[str, range] = {}  # the objects of each
        self.met += 1
        for name, value in centre.items():
            if type(value) is list:
                lists[name] = range(self.met, self.met + len(value))
                self.met += len(value)
        self.leaves += centre["electron_shells"]
        self.centres.append(_Centre(block, lists["electron_shells"], depth + 1))
        end = self.places.closes[self.met - 1 - depth]
        block.end = self.places.closing_lines[self.met - 1 - depth]
        # Escapes may hide the names by which numbers are found again.
        if self.source.text.find("\\", start, end) > 0:
            raise _Doubt
        parts = centre.get("ecp_potentials")
        if parts is not None or centre.get("ecp_electrons") is not None:
            at = self.places.value_at("ecp_electrons", start, end)
            objects = lists["ecp_potentials"] if parts is not None else range(0)
            block.potential = self.potential(centre["ecp_electrons"], at, parts or [], objects)

    def potential(
        self, electrons: Any, at: int, parts: list[dict[str, Any]], objects: range
    ) -> Potential | None:
        """A potential whose number of electrons stands at an offset; ``objects`` are its parts."""
        if type(electrons) is not int or electrons >= _MANY or not self.source.text[at].isdigit():
            raise _Doubt
        found = []
        for part, place in zip(parts, objects, strict=True):
            terms = terms_of(part)
            if terms is None:
                raise _Doubt
            found.append((self.places.opening_lines[place] + 1, terms))
        if not found and not electrons:
            return None
        return Potential(electrons, tuple(channels_of(found)), self.places.line_of(at) + 1)

    # ---- when all is met

    def shared_out(self, shapes: list[Shape], values: Floats) -> Iterator[list[Shape]]:
        """The shells of each centre, which become those of its block."""
        tables, done, places = tables_of(shapes, values), 0, self.places
        for block, objects, depth in self.centres:
            first, last = objects.start, objects.stop
            for line, start, end, table in zip(
                places.opening_lines[first:last],
                places.opens[first:last],
                places.closes[first - depth : last - depth],
                tables,
                strict=False,
            ):
                block.ready += shells_of(table, self.source, line + 1, start, end + 1)
            own = shapes[done : done + len(objects)]
            done += len(objects)
            settle_functions(self.build, block, own)
            yield own


def _is_harmless(value: object) -> bool:
    """Whether a value is no number, or a whole one of sensible size."""
    return type(value) is not float and (type(value) is not int or abs(value) < _MANY)


def _check_map(basis: dict[str, Any], centres: list[list[Shape]]) -> None:
    """Doubt whether `atom_map` and `nbf` fit the centres."""
    atoms, announced = basis["atom_map"], basis.get("nbf")
    if type(atoms) is not list:
        raise _Doubt
    own = dict(zip(basis["center_data"], centres, strict=True))
    shells = [own[atom] for atom in atoms]
    sizes = sizes_of(shells) if type(announced) is int else None
    if sizes is not None and announced not in sizes:
        raise _Doubt
