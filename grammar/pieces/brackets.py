"""Files of bracket sections: where each stands, which atoms repeat others, and what flags say.

Such files hold a whole calculation; what is not a basis may be very long and is not looked at.
"""

import re
from typing import NamedTuple

from overlapse.grammar.drafts import FunctionType
from overlapse.grammar.model import Block
from overlapse.grammar.source import Source

_HEADING = re.compile(r"\n[ \t]*\[([^\[\]\n]*)\]")
_ATOM = re.compile(r"\s*\d+\s+0\s*")
_FLAG = re.compile(r"(\d+)([dfgh])")
_FLAGS = re.compile(r"(?:\d+[dfgh])+")


class Section(NamedTuple):
    """A bracket section: its name in small letters, and its lines (0-based), heading included."""

    name: str
    lines: range


def sections(source: Source) -> list[Section]:
    """All bracket sections of a text; the lines in between are not looked at one by one."""
    text = "\n" + source.flat  # the first line begins like any other
    heads = []
    line = last = 0
    for match in _HEADING.finditer(text):
        line += text.count("\n", last, match.start())
        last = match.start()
        heads.append((match[1].strip().lower(), line))
    ends = [line for _, line in heads] + [len(source.lines)]
    return [
        Section(name, range(line, end)) for (name, line), end in zip(heads, ends[1:], strict=True)
    ]


class Repeat(NamedTuple):
    """An atom whose text is that of an earlier one: that one's heading, and its own lines below."""

    first: int
    lines: range


def repeats_in(source: Source, found: list[Section]) -> dict[int, Repeat]:
    """Atoms whose text below the heading came before, by the line (0-based) of their heading."""
    first: dict[tuple[str, ...], int] = {}
    repeats = {}
    text = source.lines
    for lines in (lines for name, lines in found if name == "gto"):
        heads = [at for at in lines if "." not in text[at] and _ATOM.fullmatch(text[at])]
        for head, end in zip(heads, [*heads, lines.stop][1:], strict=True):
            while not text[end - 1].strip():
                end -= 1
            below = text[head + 1 : end]
            if below and first.setdefault(below, head) != head:
                repeats[head] = Repeat(first[below], range(head + 1, end))
    return repeats


def kinds_of(flags: set[str]) -> dict[int, FunctionType]:
    """Spherical or Cartesian for d, f, g and h, by flags such as `[5D]`, `[5D10F]`, `[9G]`."""
    kinds: dict[int, FunctionType] = dict.fromkeys(range(2, 6), "cartesian")
    given = {
        letter: int(n)
        for flag in flags
        if _FLAGS.fullmatch(flag)
        for n, letter in _FLAG.findall(flag)
    }
    if given.get("d") == 5 and "f" not in given:
        given["f"] = 7  # `[5D]` speaks for both
    if given.get("g") == 9 and "h" not in given:
        given["h"] = 11
    for l, letter in enumerate("dfgh", 2):
        if given.get(letter) == 2 * l + 1:
            kinds[l] = "spherical"
    return kinds


def functions_of(block: Block, kinds: dict[int, FunctionType]) -> FunctionType | None:
    """What the flags make of a block; None if they treat its shells in two ways."""
    used = {kinds[min(l, 5)] for l in block.counts if l >= 2} or {kinds[2]}
    return used.pop() if len(used) == 1 else None
