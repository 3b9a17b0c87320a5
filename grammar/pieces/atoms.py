"""Atoms as a group of a run input lists them: name, nuclear charge, x, y, z."""

import re

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, index_of
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.numbers import looks_numeric

_LETTERS = re.compile(r"[A-Za-z]+")


def is_atom(body: str) -> bool:
    """Name, nuclear charge and three coordinates, of which one word may be lost or damaged."""
    words = body.split()
    return len(words) > 3 and words[0][0].isalpha() and sum(map(looks_numeric, words[1:5])) > 2


def open_atom(build: Build, heading: Token) -> BlockDraft:
    """The block of an atom, whose nuclear charge says which element it is."""
    words, index = heading.split(), index_of(heading)
    letters = _LETTERS.match(words[0])
    named = number_of(letters[0]) if letters else None
    values = [
        build.number(word, index, at, words[0], None) for at, word in enumerate(words[1:5], 1)
    ]
    # A nucleus without charge that carries functions has its atomic number with a minus.
    charge = abs(values[0] or 0.0)
    z = int(charge) if charge.is_integer() and 1 <= charge <= 118 else None
    if len(words) < 5:
        build.fault_line(
            "form.count",
            index,
            f"{len(words)} words where an atom has five: name, nuclear charge, x, y, z",
            element=words[0],
            measured=len(words),
            expected=5,
            remedy="restore the missing number",
        )
    elif values[0] is not None:
        _check_charge(build, index, words, z, named)
        named = z
    number = z if named is None else named
    block = BlockDraft(
        words[0] if number is None else symbol_of(number),
        number,
        index,
        str(index),
        end=index,
    )
    build.blocks.append(block)
    return block


def _check_charge(
    build: Build, index: int, words: list[str], z: int | None, named: int | None
) -> None:
    """Names are free (CA may be a carbon), but N is not oxygen."""
    if z is not None and (named is None or symbol_of(named)[0] == symbol_of(z)[0]):
        return
    build.fault_word(
        "form.element",
        index,
        1,
        f"{words[1]} is no atomic number"
        if z is None
        else f"{words[1]} is the nuclear charge of {symbol_of(z)}, but the atom is called "
        f"{words[0]}",
        severity="error" if z is None else "warning",
        element=words[0],
        measured=words[1],
        expected=named,
        remedy="write the atomic number of the element that was meant",
    )
