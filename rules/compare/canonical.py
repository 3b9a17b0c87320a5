"""What an element holds, apart from how a text lays it out, and digests of that.

Nothing of layout, order, spelling, case or label is left: functions are taken one by one (a shell
of several columns or of s and p together is as many functions as it holds), with their primitives
by falling exponent and without those whose coefficient is zero; the terms of a core potential
likewise.  Numbers are the double-precision values that a calculation would use.
"""

import struct
from collections.abc import Iterator, Mapping
from hashlib import sha256
from typing import NamedTuple

import numpy as np

from overlapse.grammar.model import BasisSet, Block, Channel, Function, Potential, letter_of

# Part of what is digested: another way to put it together would have to carry another word.
_FORM = b"functions and potentials, form 1\n"
_SHORT = 16  # hexadecimal digits of a part's digest

ElementKey = tuple[
    int, int
]  # atomic number, and which time the element occurs in its set: 0, 1 ...


class Digest(NamedTuple):
    """Digests (SHA-256, hexadecimal) of an element's content.

    whole: of everything.  parts: of the functions of each letter, and of the "potential";
    shortened, to tell where a difference lies.
    """

    whole: str
    parts: Mapping[str, str]


def elements_of(members: BasisSet) -> dict[ElementKey, Block]:
    """The blocks of a set by element; a second block of an element has a place of its own."""
    found: dict[ElementKey, Block] = {}
    for block in members.blocks:
        ordinal = 0
        while (block.atomic_number, ordinal) in found:
            ordinal += 1
        found[block.atomic_number, ordinal] = block
    return found


def in_order(function: Function) -> Function:
    """The same function with its primitives by falling exponent."""
    order = np.lexsort((-function.coefficients, -function.exponents))
    return Function(
        function.l,
        function.exponents[order],
        function.coefficients[order],
        function.rows[order],
        function.column,
    )


def numbers_of(function: Function) -> bytes:
    """The numbers of a function whose primitives are in order, to look up equal ones."""
    # Adding zero turns a negative zero into a positive one.
    return (function.exponents + 0.0).tobytes() + (function.coefficients + 0.0).tobytes()


def channel_key(channel: Channel) -> tuple[str, int]:
    """What a channel of a potential is: its kind and its l, -1 for the local part.

    The local part acts on all l that have no part of their own, whatever l it is written under.
    """
    return channel.kind, -1 if channel.local else channel.l


Term = tuple[int, float, float]


def terms_of(channel: Channel) -> list[Term]:
    """Terms (power, exponent, coefficient) of a channel in order, without those that are zero."""
    rows = zip(
        channel.powers, channel.exponents.tolist(), channel.coefficients.tolist(), strict=True
    )
    return sorted((row for row in rows if row[2] != 0.0), key=lambda row: (row[0], -row[1], row[2]))


def digest_of(block: Block) -> Digest:
    """Digests of what a block holds; equal for equal numbers, however they are laid out."""
    content = {letter_of(l): data for l, data in _functions(block)}
    if block.potential is not None and (block.potential.electrons or block.potential.channels):
        content["potential"] = _potential(block.potential)
    whole = sha256(_FORM + struct.pack(">i", block.atomic_number))
    parts = {}
    for name, data in content.items():
        part = sha256(name.encode() + b"\n" + data)
        whole.update(part.digest())
        parts[name] = part.hexdigest()[:_SHORT]
    return Digest(whole.hexdigest(), parts)


def _functions(block: Block) -> Iterator[tuple[int, bytes]]:
    """For each l, the numbers of all its functions."""
    for l in block.counts:
        packed = []
        for _, function in block.functions_of(l):
            if len(function.exponents):
                rows = in_order(function)
                values = np.concatenate([rows.exponents, rows.coefficients]) + 0.0
                packed.append(struct.pack(">i", len(values)) + values.astype(">f8").tobytes())
        if packed:
            yield l, b"".join(sorted(packed))


def _potential(potential: Potential) -> bytes:
    found = []
    for channel in potential.channels:
        kind, l = channel_key(channel)
        if terms := terms_of(channel):
            rows = b"".join(struct.pack(">idd", *term) for term in terms)
            found.append(kind.encode() + struct.pack(">ii", l, len(terms)) + rows)
    return struct.pack(">i", potential.electrons) + b"".join(sorted(found))
