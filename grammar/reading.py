"""From a file to a document: find the layout, then let it read."""

import os
from collections.abc import Iterable
from pathlib import Path

from overlapse.grammar.layout import Evidence, Layout
from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import Document, Fault
from overlapse.grammar.source import Source

# No row of a basis set comes near this; a longer line is some other kind of file, unless its
# layout knows no lines.
LONGEST_LINE = 100_000
# Two layouts whose evidence is this close are both possible.
CLOSE_CALL = 5


def read(path: str | os.PathLike[str], *, layout: str | None = None) -> Document:
    """Read a file.

    ``layout`` is a name from `overlapse.grammar.layouts.layouts`, or None to find it by content.
    Raises OSError if the file cannot be opened, ValueError for an unknown layout.  Whatever is
    wrong with the text itself comes back in `Document.faults`.
    """
    return read_bytes(Path(path).read_bytes(), os.fspath(path), layout=layout)


def read_text(text: str, path: str = "<text>", *, layout: str | None = None) -> Document:
    """As `read`, for a text at hand."""
    return read_source(Source(text, path), layout=layout)


def read_bytes(data: bytes, path: str, *, layout: str | None = None) -> Document:
    """As `read`, for the bytes of a file."""
    if b"\x00" in data[:8192]:
        return _unread(Source("", path), "this is a binary file, not a text")
    return read_source(Source.decode(data, path), layout=layout)


def read_source(source: Source, *, layout: str | None = None) -> Document:
    """As `read`, for a decoded text."""
    known = layouts()
    if layout is not None and layout not in known:
        raise ValueError(f"no layout is called {layout!r}; known: {', '.join(known)}")
    if not source.text.strip():
        return _unread(source, "the file is empty")
    long = next((at for at, line in enumerate(source.lines) if len(line) > LONGEST_LINE), None)
    if long is not None:
        known = {name: each for name, each in known.items() if each.any_line}
    if layout is None and (found := candidates(source, known.values())):
        return _read_by_content(source, found)
    if layout in known:
        return known[layout].read(source)
    if long is None:
        return _unread(source, "no known layout of basis sets is recognised in this text")
    length = len(source.lines[long])
    return _unread(
        source, f"line {long + 1} has {length:,} characters: no row of a basis set is so long"
    )


def candidates(
    source: Source, among: Iterable[Layout] | None = None
) -> list[tuple[Evidence, Layout]]:
    """Layouts whose marks a text carries, the likeliest first; all layouts, or those given."""
    found = [
        (evidence, layout)
        for layout in (layouts().values() if among is None else among)
        if (evidence := layout.recognise(source)) is not None
    ]
    return sorted(found, key=lambda pair: -pair[0].strength)


def _read_by_content(source: Source, found: list[tuple[Evidence, Layout]]) -> Document:
    (evidence, layout), *others = found
    document = layout.read(source)
    rivals = [pair for pair in others if evidence.strength - pair[0].strength < CLOSE_CALL]
    faults = document.faults
    if rivals:
        rival_evidence, rival = rivals[0]
        doubt = Fault(
            "form.syntax",
            f"read as {layout.name} ({evidence.reason}); it might also be {rival.name} "
            f"({rival_evidence.reason})",
            (0, 0),
            severity="note",
            remedy=f"say which with --layout {layout.name} or --layout {rival.name}",
        )
        faults = (doubt, *faults)
    return Document(
        source,
        document.layout,
        document.sets,
        document.remarks,
        faults,
        evidence.reason,
        document.raw_primitives,
    )


def _unread(source: Source, message: str) -> Document:
    fault = Fault(
        "form.syntax",
        message,
        (0, 0),
        remedy="check that this is the file you meant; --layout NAME reads it as a given layout",
    )
    return Document(source, "", faults=(fault,))
