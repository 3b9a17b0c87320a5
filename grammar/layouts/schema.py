"""Reader and writer for the open JSON schema of basis sets in quantum chemistry."""

import re
from functools import cached_property

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, integer
from overlapse.grammar.elements import number_of
from overlapse.grammar.layout import Evidence, Layout
from overlapse.grammar.model import Document, Potential, Remark
from overlapse.grammar.pieces.apart import Apart, Where
from overlapse.grammar.pieces.atonce import document_of
from overlapse.grammar.pieces.centres import gather
from overlapse.grammar.pieces.centrewise import settle_functions, sizes_of, symbol_in
from overlapse.grammar.pieces.jsontext import Members, name_of, pairs_in, string_of
from overlapse.grammar.pieces.jsontokens import LISTS, Value, kind_of, span_of
from overlapse.grammar.pieces.jsonwriting import write
from overlapse.grammar.pieces.leaves import (
    Shape,
    Terms,
    channels_of,
    shells_of,
    table_of,
    terms_of,
)
from overlapse.grammar.source import Source

PICTURE = """\
{"name": "invented", "center_data": {"C": {"electron_shells": [
  {"harmonic_type": "spherical", "angular_momentum": [0],
   "exponents": [4.0, 0.5], "coefficients": [[0.6, 0.5]]}
]}}, "atom_map": ["C"]}"""

_OBJECTS = ("object", "LEAF")
_QUOTED = re.compile(r'"([^"\\\n]*)"')


def recognise(source: Source) -> Evidence | None:
    text = source.text
    found = [name for name in ('"center_data"', '"electron_shells"') if name in text]
    if len(found) == 2:
        return Evidence(97, f"`{found[0]}` and `{found[1]}`")
    if found and text.lstrip()[:1] == "{":
        return Evidence(85, f"JSON with `{found[0]}`")
    return None


def read(source: Source) -> Document:
    return gather(document_of(source) or _Reader(source).document())


class _Reader:
    """Walks the tree of one text."""

    def __init__(self, source: Source) -> None:
        self.build = Build(source, "schema", windows=())
        self.json = Apart(self.build)
        self.tree = self.json.tree()
        self.label: str | None = None
        self.starts: dict[int, BlockDraft] = {}  # by the offset of their names
        self.shapes: dict[str, list[Shape]] = {}  # of the centres of one basis

    def document(self) -> Document:
        self.check_outside()
        bases = [node for _, node in self.json.holders(self.tree, "center_data", False)]
        for node in bases:
            self.basis(node)
        if not bases or self.json.damage:
            self.strays(bool(bases))
        self.mark_damage()
        return self.build.document()

    def check_outside(self) -> None:
        """In a file that is one JSON text, nothing stands beside it."""
        beside = [c for c in self.tree.children if kind_of(c) not in (*_OBJECTS, *LISTS)]
        is_json = self.json.text.lstrip()[:1] in tuple("{[,}]")
        if beside and is_json and not self.json.damage:
            message = "this stands outside the brackets of the JSON text"
            self.json.fault(beside[0], message, remedy="take it out, or mend the brackets")

    # ---- a basis and its centres

    def basis(self, node: Node) -> None:
        members = self.json.members(node)
        self.label = string_of(members.get("name")) or None
        self.shapes = {}
        described = members.get("description")
        if described is not None and (text := string_of(described)):
            self.build.remarks.append(Remark(text, self.line_of(described) + 1))
        centres = members.get("center_data")
        if centres is None or kind_of(centres) not in _OBJECTS:
            where = members.opener if centres is None else centres
            remedy = "restore the centres from the source"
            self.json.fault(where, "`center_data` is no object", expected="{", remedy=remedy)
            return
        damaged = self.json.is_damaged(centres)
        for name, (key, value) in self.json.members(centres).entries.items():
            self.shapes[name] = []
            # Behind a bracket that does not fit, names of other things may have come here.
            if value is not None and not (damaged and kind_of(value) not in _OBJECTS):
                self.centre(key, value)
        if members.whole and not self.json.damage:
            self.json.check_names(members, ["atom_map"], optional=["name"])
            self.check_map(members)

    def centre(self, key: Token, value: Value) -> None:
        block = self.opened(key)
        name = name_of(key)
        if kind_of(value) not in _OBJECTS:
            block.complete = False
            message = f"{name!r} should be an object with `electron_shells`"
            self.json.fault(
                value, message, element=block.symbol, expected="{", remedy="restore the object"
            )
            return
        shapes = self.shapes.setdefault(name, [])
        members = self.json.members(value)
        block.complete &= members.whole
        if members.whole:
            where: Where = {"element": block.symbol}
            names = ("ecp_electrons", "ecp_potentials")
            self.json.check_names(members, ["electron_shells"], where, names)
        for shell in self.objects(members, "electron_shells", block):
            self.shell(block, shell, shapes)
        self.potential(block, members)
        settle_functions(self.build, block, shapes)
        block.end = max(block.end, self.build.source.place(self.json.extent(value)[1]).line - 1)

    def opened(self, key: Token) -> BlockDraft:
        """The block of a centre, whose element its name has to tell."""
        name, start = name_of(key), span_of(key)[0]
        symbol = symbol_in(name) or self.elements.get(name)
        if symbol is None:
            self.build.fault(
                "form.element",
                span_of(key),
                f"no element can be told from the name {name!r} of this centre",
                measured=name,
                remedy="name the centre by its element, such as C, C1 or name_C",
            )
            self.starts[start] = BlockDraft(name, None, self.line_of(key), "")
            self.build.blocks.append(self.starts[start])
            return self.starts[start]
        # Each centre by itself: which of them make a set is found out at the end.
        self.starts[start] = self.build.open_block(
            symbol, self.line_of(key), section=str(start), label=self.label
        )
        return self.starts[start]

    def objects(self, members: Members, name: str, block: BlockDraft) -> list[Value]:
        """The objects of a list; a list that is not there is an empty one."""
        value = members.get(name)
        if value is None:
            return []
        items, whole = [value], False
        if kind_of(value) in LISTS:
            items, whole = self.json.items(value)
        wrong = [item for item in items if kind_of(item) not in _OBJECTS or item is value]
        if wrong and not self.json.is_damaged(value):
            self.json.fault(
                wrong[0],
                f"`{name}` is a list of objects",
                element=block.symbol,
                expected="[{",
                remedy="restore the list from the source",
            )
        block.complete &= whole and not wrong
        return [item for item in items if kind_of(item) in _OBJECTS]

    def shell(self, block: BlockDraft, value: Value, shapes: list[Shape]) -> None:
        start, end = self.json.extent(value)
        table = table_of(self.json.leaves[start]) if isinstance(value, Token) else None
        if table is None:
            table = self.json.table(value, block)
        if table is None:
            block.complete = False
            return
        shapes.append(table[0])
        block.ready += shells_of(table, self.build.source, self.line_of(value) + 1, start, end)

    # ---- potentials

    def potential(self, block: BlockDraft, members: Members) -> None:
        parts = self.objects(members, "ecp_potentials", block)
        value = members.get("ecp_electrons")
        electrons = integer(str(value)) if isinstance(value, Token) else None
        if value is not None and electrons is None:
            self.build.fault(
                "form.number",
                span_of(value),
                "`ecp_electrons` is a whole number",
                element=block.symbol,
                measured=str(value),
                expected=28,
                remedy="write the number of electrons replaced",
            )
        elif value is None and parts:
            self.json.fault(
                parts[0],
                "`ecp_electrons` is missing beside `ecp_potentials`",
                element=block.symbol,
                expected="ecp_electrons",
                remedy="write the number of electrons replaced",
            )
        found = [(self.line_of(part) + 1, self.terms(block, part)) for part in parts]
        if parts or electrons:
            channels = channels_of([(line, part) for line, part in found if part is not None])
            line = self.line_of(parts[0] if value is None else value) + 1
            block.potential = Potential(electrons or 0, tuple(channels), line)

    def terms(self, block: BlockDraft, value: Value) -> Terms | None:
        found = terms_of(self.json.leaves[span_of(value)[0]]) if isinstance(value, Token) else None
        if found is None:
            found = self.json.terms(value, block)
        block.complete &= found is not None
        return found

    # ---- what the basis says of itself

    def check_map(self, members: Members) -> None:
        """`atom_map` names centres that are there; `nbf` counts the functions of its atoms."""
        value = members.get("atom_map")
        if value is None:
            return
        items = self.json.listed(value, "atom_map", {})
        first: dict[str, Value] = {}
        for item in items:
            first.setdefault(string_of(item) or "", item)
        for name in first.keys() - self.shapes.keys():
            self.build.fault(
                "form.element",
                span_of(first[name]),
                f"`center_data` holds no centre {name!r}",
                measured=name,
                remedy="mend the name, or add the centre",
            )
        if first.keys() <= self.shapes.keys():
            self.check_size(members, [self.shapes[string_of(item) or ""] for item in items])

    def check_size(self, members: Members, atoms: list[list[Shape]]) -> None:
        value = members.get("nbf")
        announced = integer(str(value)) if isinstance(value, Token) else None
        whole = all(block.complete for block in self.starts.values())
        sizes = sizes_of(atoms) if whole and announced is not None else None
        if value is not None and sizes is not None and announced not in sizes:
            self.build.fault(
                "form.count",
                span_of(value),
                f"`nbf` announces {announced} functions; the centres of `atom_map` have {sizes[0]}",
                measured=sizes[0],
                expected=announced,
                remedy="a shell or an atom was lost or added, or the number is wrong",
            )

    # ---- what damage leaves behind

    def strays(self, has_basis: bool) -> None:
        """Centres that stand outside `center_data`, because it or a bracket was lost."""
        for key, node in self.json.holders(self.tree, "electron_shells"):
            if key is None or span_of(key)[0] in self.starts:
                continue
            if not has_basis and not self.json.damage:
                message = "this centre does not stand in `center_data`"
                remedy = "restore the name that was lost above it"
                self.json.fault(key, message, expected='"center_data": {', remedy=remedy)
                has_basis = True
            self.centre(key, node)

    def mark_damage(self) -> None:
        """Where brackets do not fit, the centre before them may have lost shells."""
        for offset in self.json.damage:
            before = [start for start in self.starts if start <= offset]
            if before:
                self.starts[max(before)].complete = False

    @cached_property
    def elements(self) -> dict[str, str]:
        """Elements of centres, where a molecule stands beside its basis."""
        lists: dict[str, list[str]] = {}
        for name in ("symbols", "atom_map"):
            for _, node in self.json.holders(self.tree, name):
                found = next(value for key, value in pairs_in(node) if name_of(key) == name)
                if found is not None:
                    text = self.json.text[slice(*self.json.extent(found))]
                    lists.setdefault(name, _QUOTED.findall(text))
        symbols, centres = lists.get("symbols", []), lists.get("atom_map", [])
        if len(symbols) != len(centres):
            return {}
        pairs = zip(centres, symbols, strict=True)
        return {centre: symbol for centre, symbol in pairs if number_of(symbol)}

    def line_of(self, value: Value) -> int:
        """0-based line of the first character."""
        return self.build.source.place(span_of(value)[0]).line - 1


LAYOUT = Layout(
    name="schema",
    summary="the open JSON schema: `center_data`, with `electron_shells` for each centre",
    picture=PICTURE,
    comment="",
    recognise=recognise,
    read=read,
    write=write,
    any_line=True,
)
