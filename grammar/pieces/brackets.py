"""Files of bracket sections: where each section stands, and which atoms repeat an earlier one.

Such files hold a whole calculation; what is not a basis may be very long and is not looked at.
"""

import re
from typing import NamedTuple

from overlapse.grammar.source import Source

_HEADING = re.compile(r"\n[ \t]*\[([^\[\]\n]*)\]")
_ATOM = re.compile(r"\s*\d+\s+0\s*")


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
