"""A unified diff of two texts, as version control and ``patch`` read it."""

import difflib
from collections.abc import Iterator

_COLOURS = {"+": "32", "-": "31", "@": "36"}


def diff(old: bytes, new: bytes, name: str, for_terminal: bool = False) -> str:
    """The difference of two contents of a file; "" if there is none.

    Lines end at LF alone, as for ``patch``.  for_terminal: control characters are made visible and
    lines are coloured.
    """
    changes = difflib.unified_diff(_lines(old), _lines(new), f"a/{name}", f"b/{name}")
    shown = "".join(_complete(changes))
    if not for_terminal:
        return shown
    return "".join(map(_painted, shown.splitlines(keepends=True)))


def _lines(data: bytes) -> list[str]:
    *whole, rest = data.decode("utf-8", "replace").split("\n")
    return [f"{line}\n" for line in whole] + ([rest] if rest else [])


def _complete(lines: Iterator[str]) -> Iterator[str]:
    for line in lines:
        yield line if line.endswith("\n") else f"{line}\n\\ No newline at end of file\n"


def _painted(line: str) -> str:
    body = "".join(c if c.isprintable() or c == "\n" else f"<{ord(c):02x}>" for c in line)
    code = _COLOURS.get(line[:1])
    return f"\x1b[{code}m{body.rstrip()}\x1b[0m\n" if code else body
