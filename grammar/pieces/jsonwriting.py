"""Writer of the open JSON schema for basis sets."""

import json
from collections.abc import Iterable, Iterator

from overlapse.grammar.layout import Written
from overlapse.grammar.model import Block, Document, Potential, Shell
from overlapse.grammar.pieces.apart import as_json
from overlapse.grammar.writing import Losses, segments, terms, title_of


def write(document: Document) -> Written:
    """Each block as a centre, named by its element."""
    losses = Losses()
    blocks = [block for block in document.blocks if block.shells]
    for block in document.blocks:
        if not block.shells and block.potential is not None:
            losses.say("a core potential without shells is left out", block.symbol)
    title = title_of(document, blocks[0]) if blocks else "unnamed"
    if len(document.sets) > 1:
        losses.say("the layout has one name for all: the names of several sets are not written")
    if any(members.role == "fitting" for members in document.sets):
        losses.say("the layout does not tell a fitting set from an orbital set")
    names: list[str] = []
    for block in blocks:
        before = sum(name.split("_")[0] == block.symbol for name in names)
        names.append(f"{block.symbol}_{before + 1}" if before else block.symbol)
    centres = [
        f"    {json.dumps(name)}: {{\n{_centre(block, losses)}\n    }}"
        for name, block in zip(names, blocks, strict=True)
    ]
    text = (
        '{\n  "schema_name": "qcschema_basis",\n  "schema_version": 1,\n'
        f'  "name": {json.dumps(title, ensure_ascii=False)},\n'
        '  "center_data": {\n' + ",\n".join(centres) + "\n  },\n"
        f'  "atom_map": {json.dumps(names)}\n}}\n'
    )
    return Written(text, losses.lines())


def _centre(block: Block, losses: Losses) -> str:
    if block.functions is None:
        losses.say("spherical or Cartesian was not stated and is written as spherical")
    kind = block.functions or "spherical"
    shells = [text for shell in block.shells for text in _shells(shell, kind, block, losses)]
    if len(set(shells)) < len(shells):
        losses.say(
            "equal shells are written, although the schema wants all to differ", block.symbol
        )
    members = [_listed("electron_shells", shells)]
    if block.potential is not None:
        members.append(f'      "ecp_electrons": {block.potential.electrons}')
        if parts := _parts(block.potential, block.symbol, losses):
            members.append(_listed("ecp_potentials", parts))
    return ",\n".join(members)


def _listed(name: str, objects: list[str]) -> str:
    return f'      "{name}": [\n' + ",\n".join(objects) + "\n      ]"


def _object(**members: str) -> str:
    lines = ",\n".join(f'          "{name}": {text}' for name, text in members.items())
    return f"        {{\n{lines}\n        }}"


def _numbers(words: Iterable[str]) -> str:
    return f"[{', '.join(map(as_json, words))}]"


def _columns(rows: Iterable[Iterable[str]]) -> str:
    """Coefficients given row by row as one list for each contraction."""
    lists = ",\n".join(f"            {_numbers(column)}" for column in zip(*rows, strict=True))
    return f"[\n{lists}\n          ]"


def _shells(shell: Shell, kind: str, block: Block, losses: Losses) -> Iterator[str]:
    exponents, coefficients = shell.spellings()
    tables = [(exponents, coefficients)]
    if len(shell.angular) > 1 and shell.columns_per_l > 1:
        losses.say("shared s and p exponents are written once for each pair", block.symbol)
        tables = [
            ([row[0] for row in rows], [row[1:] for row in rows]) for _, rows in segments(shell)
        ]
    for words, table in tables:
        yield _object(
            harmonic_type=json.dumps(kind),
            angular_momentum=json.dumps(list(shell.angular)),
            exponents=_numbers(words),
            coefficients=_columns(table),
        )


def _parts(potential: Potential, element: str, losses: Losses) -> list[str]:
    channels = [channel for channel in potential.channels if channel.powers]
    if len(channels) < len(potential.channels):
        losses.say("parts of a core potential without terms are left out", element)
    scalar = [channel for channel in channels if channel.kind == "scalar"]
    if any(c.local != (c.l == max(s.l for s in scalar)) for c in scalar):
        losses.say("the local part of a core potential is not marked: the highest l is", element)
    found = []
    for channel in channels:
        powers, exponents, coefficients = zip(*terms(channel), strict=True)
        found.append(
            _object(
                ecp_type='"spinorbit"' if channel.kind == "spin-orbit" else '"scalar"',
                angular_momentum=json.dumps([channel.l]),
                r_exponents=_numbers(powers),
                gaussian_exponents=_numbers(exponents),
                coefficients=_columns([[word] for word in coefficients]),
            )
        )
    return found
