"""The text of a file: decoded once, kept as it is, with positions worked out on demand."""

import re
from bisect import bisect_right
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property, lru_cache
from itertools import accumulate
from typing import NamedTuple

_LINE_END = re.compile("\r\n|\r|\n")


class Place(NamedTuple):
    """A position in a text, as an editor shows it: line and column, both counted from 1."""

    line: int
    column: int


@dataclass(frozen=True)
class Source:
    """Text of one file.

    ``text`` holds every character of the file, line ends included; ``path`` is the name shown in
    findings.  ``encoding`` is "utf-8" or "latin-1", whichever the bytes were read as, and
    ``marked`` says whether the bytes began with a byte-order mark (which is not in ``text``).
    """

    text: str
    path: str = "<text>"
    encoding: str = "utf-8"
    marked: bool = False

    @staticmethod
    def decode(data: bytes, path: str) -> "Source":
        """Decode ``data`` as UTF-8, and as Latin-1 where that fails (it never does)."""
        marked = data.startswith(b"\xef\xbb\xbf")
        body = data[3:] if marked else data
        try:
            return Source(body.decode("utf-8"), path, "utf-8", marked)
        except UnicodeDecodeError:
            return Source(body.decode("latin-1"), path, "latin-1", marked)

    @cached_property
    def lines(self) -> tuple[str, ...]:
        """The lines without their ends; LF, CRLF and lone CR all end a line."""
        if "\r" in self.text:
            return tuple(_LINE_END.split(self.text))
        return tuple(self.text.split("\n"))

    @cached_property
    def flat(self) -> str:
        """The text with every line end as LF, for patterns that look at whole lines."""
        return "\n".join(self.lines) if "\r" in self.text else self.text

    @cached_property
    def starts(self) -> list[int]:
        """Offset in ``text`` at which each of ``lines`` begins."""
        if "\r" in self.text:
            return [0, *(end.end() for end in _LINE_END.finditer(self.text))]
        return [0, *accumulate(len(line) + 1 for line in self.lines[:-1])]

    def lines_with(self, sign: str) -> Iterator[int]:
        """The lines (0-based) that hold a sign, without looking at the others."""
        text, index, seen = self.flat, 0, 0
        while (found := text.find(sign, seen)) >= 0:
            index += text.count("\n", seen, found)
            yield index
            seen = text.find("\n", found)
            if seen < 0:
                return

    def place(self, offset: int) -> Place:
        """Line and column of an offset; offsets past the end give the end."""
        line = bisect_right(self.starts, max(0, min(offset, len(self.text)))) - 1
        return Place(line + 1, offset - self.starts[line] + 1)

    def span_of_line(self, line: int) -> tuple[int, int]:
        """Offsets of the first and past the last visible character of a line (0-based index)."""
        text = self.lines[line]
        start = self.starts[line] + len(text) - len(text.lstrip())
        return start, max(start, self.starts[line] + len(text.rstrip()))

    def span_of_word(self, line: int, ordinal: int, pattern: str = r"\S+") -> tuple[int, int]:
        """Offsets of a word of a line (both 0-based), else of the whole line.

        ``pattern`` matches a word; plain words stand between blanks.
        """
        words = _words(self.lines[line], pattern)
        if 0 <= ordinal < len(words):
            start = self.starts[line]
            return start + words[ordinal][0], start + words[ordinal][1]
        return self.span_of_line(line)


@lru_cache(maxsize=8)  # faults tend to come from one line one after the other
def _words(line: str, pattern: str) -> list[tuple[int, int]]:
    """Where the words of a line begin and end."""
    return [word.span() for word in re.finditer(pattern, line)]
