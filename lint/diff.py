"""A unified diff of two texts, as version control and ``patch`` read it."""

import difflib
from collections.abc import Iterator

_COLOURS = {"+": "32", "-": "31", "@": "36"}


def diff(old: bytes, new: bytes, name: str, for_terminal: bool = False) -> str:
    """The difference of two contents of a file; "" if there is none.

    Lines end at LF alone, as for ``patch``; bytes that are no UTF-8 stand as lone surrogates
    (the error handler "surrogateescape" gives them back).  for_terminal: control characters are
    made visible and lines are coloured.
    """
    changes = difflib.unified_diff(_lines(old), _lines(new), f"a/{name}", f"b/{name}")
    shown = "".join(_complete(changes))
    if not for_terminal or not shown:
        return shown
    return "".join(_painted(f"{line}\n") for line in shown.removesuffix("\n").split("\n"))


def _lines(data: bytes) -> list[str]:
    *whole, rest = data.decode("utf-8", "surrogateescape").split("\n")
    return [f"{line}\n" for line in whole] + ([rest] if rest else [])


def _complete(lines: Iterator[str]) -> Iterator[str]:
    for line in lines:
        yield line if line.endswith("\n") else f"{line}\n\\ No newline at end of file\n"


def _code(character: str) -> int:
    """The number of a character, or of the byte that a lone surrogate stands for."""
    return ord(character) - (0xDC00 if "\udc80" <= character <= "\udcff" else 0)


def _painted(line: str) -> str:
    body = "".join(c if c.isprintable() or c == "\n" else f"<{_code(c):02x}>" for c in line)
    code = _COLOURS.get(line[:1])
    return f"\x1b[{code}m{body.rstrip()}\x1b[0m\n" if code else body
