"""What is amiss with a text whatever its layout: line ends, encoding, blanks that are none."""

import re
from collections.abc import Iterator

from overlapse.grammar.model import Fault
from overlapse.grammar.source import Source

# Unicode blanks that a program written for ASCII does not take for one.
_BLANKS = re.compile("[\u00a0\u1680\u2000-\u200a\u202f\u205f\u3000]")
_BARE_CR = re.compile("\r(?!\n)")


def text_faults(source: Source, comment: str) -> Iterator[Fault]:
    """Faults of form.ending, form.encoding and form.number; ``comment`` holds comment signs."""
    if "\r" in source.text:
        yield from _endings(source.text)
    if source.marked:
        yield Fault(
            "form.encoding",
            "the file begins with a byte-order mark, which many readers take for a part of the "
            "first line",
            (0, 1),
            severity="warning",
            remedy="save the file as UTF-8 without a byte-order mark",
        )
    if not source.text.isascii():
        yield from _foreign(source, comment)


def _endings(text: str) -> Iterator[Fault]:
    bare = _BARE_CR.search(text)
    crlf = text.count("\r\n")
    if bare is not None:
        yield Fault(
            "form.ending",
            "a line ends in a lone carriage return (CR), which most readers do not take for a "
            "line end",
            bare.span(),
            severity="warning",
            measured="CR",
            expected="LF",
            remedy="convert the line ends of the file to LF",
        )
    elif 0 < crlf < (total := text.count("\n")):
        first = text.find("\r\n") if crlf * 2 < total else re.search("(?<!\r)\n", text).start()  # type: ignore[union-attr]
        yield Fault(
            "form.ending",
            f"line ends are mixed: {crlf} of {total} are CRLF, the others LF",
            (first, first + 1),
            severity="note",
            measured=crlf,
            limit=total,
            remedy="convert the line ends of the file to LF",
        )


def _foreign(source: Source, comment: str) -> Iterator[Fault]:
    """Characters beyond ASCII outside comments, and bytes that are no UTF-8 anywhere."""
    outside = False
    for index, line in enumerate(source.lines):
        if line.isascii():
            continue
        read = re.split(f"[{re.escape(comment)}]", line, maxsplit=1)[0] if comment else line
        if read.isascii():
            continue
        outside = True
        blank = _BLANKS.search(read)
        if blank is not None and any(c.isdigit() for c in read):
            offset = source.starts[index]
            start = offset + blank.start()
            yield Fault(
                "form.number",
                f"U+{ord(blank[0]):04X} stands between numbers; it looks like a blank, but many "
                "readers do not take it for one",
                (start, start + 1),
                measured=f"U+{ord(blank[0]):04X}",
                expected="a blank",
                remedy="put a plain blank in its place",
                edits=tuple(
                    ((offset + found.start(), offset + found.end()), " ")
                    for found in _BLANKS.finditer(read)
                ),
            )
    if source.encoding == "latin-1":
        first = next(at for at, c in enumerate(source.text) if not c.isascii())
        yield Fault(
            "form.encoding",
            "the bytes are no UTF-8 and were read as Latin-1"
            + ("" if outside else "; only comments are concerned"),
            (first, first + 1),
            severity="warning" if outside else "note",
            measured="latin-1",
            expected="utf-8",
            remedy="save the file as UTF-8, or keep it to ASCII",
        )
