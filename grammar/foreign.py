"""Layouts of other packages, kept from doing harm: what fails in them is told and stays there."""

from collections.abc import Callable
from dataclasses import replace

from overlapse.grammar import plugins
from overlapse.grammar.layout import Evidence, Layout
from overlapse.grammar.model import Document, Fault
from overlapse.grammar.source import Source


def guarded(layout: Layout) -> Layout:
    """The layout with functions that never raise while a text is recognised or read."""
    return replace(
        layout,
        recognise=_recogniser(layout.name, layout.recognise),
        read=_reader(layout.name, layout.read),
    )


def _recogniser(
    name: str, recognise: Callable[[Source], Evidence | None]
) -> Callable[[Source], Evidence | None]:
    def recognised(source: Source) -> Evidence | None:
        try:
            return recognise(source)
        except Exception as problem:
            plugins.note(f"layout {name!r} fails to recognise: {_told(problem)}")
            return None

    return recognised


def _reader(name: str, read: Callable[[Source], Document]) -> Callable[[Source], Document]:
    def document(source: Source) -> Document:
        try:
            return read(source)
        except Exception as problem:
            plugins.note(f"layout {name!r} fails to read: {_told(problem)}")
            fault = Fault(
                "form.syntax",
                f"the reader of the layout {name!r} failed here: {_told(problem)}",
                (0, 0),
                remedy="ask the package that brings the layout, or name another with --layout",
            )
            return Document(source, name, faults=(fault,))

    return document


def _told(problem: Exception) -> str:
    return f"{type(problem).__name__}: {problem}"
