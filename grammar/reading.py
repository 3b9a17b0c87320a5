"""From a file to a document: find the layout, then let it read."""

import gc
import os
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

from overlapse.grammar.bytewise import text_faults
from overlapse.grammar.layout import Evidence, Layout
from overlapse.grammar.layouts import layout_of, names, spotted
from overlapse.grammar.model import Document, Fault
from overlapse.grammar.source import Source

# No row of a basis set comes near this; a longer line is some other kind of file, unless its
# layout knows no lines.
LONGEST_LINE = 100_000
# The marks of a layout stand near the beginning of nearly all files.
HEAD = 20_000
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
    wanted = layout_of(layout) if layout is not None else None
    if not source.text.strip():
        return _unread(source, "the file is empty")
    is_long = _has_long_line(source)
    if wanted is not None and (wanted.any_line or not is_long):
        return _read_as(source, wanted)
    if is_long and wanted is None:
        found = _candidates(source, [name for name in names() if layout_of(name).any_line])
    else:
        found = candidates(source) if wanted is None else []
    if found:
        return _read_by_content(source, found)
    if not is_long:
        return _unread(source, "no known layout of basis sets is recognised in this text")
    lengths = list(map(len, source.lines))
    line = lengths.index(max(lengths)) + 1
    return _unread(
        source, f"line {line} has {max(lengths):,} characters: no row of a basis set is so long"
    )


def _has_long_line(source: Source) -> bool:
    """Whether some line is longer than any row; no need to cut all lines out for that."""
    text, start = source.flat, 0
    while len(text) - start > LONGEST_LINE:
        end = text.rfind("\n", start, start + LONGEST_LINE + 1)
        if end < 0:
            return True
        start = end + 1
    return False


def candidates(source: Source) -> list[tuple[Evidence, Layout]]:
    """Layouts whose marks a text carries, the likeliest first.

    A long text is judged by its beginning, unless that shows no layout.
    """
    head = source
    if len(source.text) > HEAD:
        head = Source(source.text[: source.text.rfind("\n", 0, HEAD) + 1] or source.text)
    found = _candidates(head, names())
    return found if found or head is source else _candidates(source, names())


def _candidates(source: Source, among: Iterable[str]) -> list[tuple[Evidence, Layout]]:
    found = [
        (evidence, layout)
        for layout in spotted(source.flat, among)
        if (evidence := layout.recognise(source)) is not None
    ]
    return sorted(found, key=lambda pair: -pair[0].strength)


@contextmanager
def _collector_at_rest() -> Iterator[None]:
    """Nothing made while reading is garbage; the collector would only walk it, again and again."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def _read_as(source: Source, layout: Layout, reason: str = "", *doubts: Fault) -> Document:
    with _collector_at_rest():
        document = layout.read(source)
    faults = [*document.faults, *text_faults(source, layout.comment)]
    faults.sort(key=lambda fault: fault.span)
    return replace(document, faults=(*doubts, *faults), reason=reason)


def _read_by_content(source: Source, found: list[tuple[Evidence, Layout]]) -> Document:
    (evidence, layout), *others = found
    doubts = [
        Fault(
            "form.syntax",
            f"read as {layout.name} ({evidence.reason}); it might also be {rival.name} "
            f"({rival_evidence.reason})",
            (0, 0),
            severity="note",
            remedy=f"say which with --layout {layout.name} or --layout {rival.name}",
        )
        for rival_evidence, rival in others[:1]
        if evidence.strength - rival_evidence.strength < CLOSE_CALL
    ]
    return _read_as(source, layout, evidence.reason, *doubts)


def _unread(source: Source, message: str) -> Document:
    fault = Fault(
        "form.syntax",
        message,
        (0, 0),
        remedy="check that this is the file you meant; --layout NAME reads it as a given layout",
    )
    return Document(source, "", faults=(fault,))
