"""Files of pseudopotentials alone, as kept beside the basis sets of layout `sets`: told, not read.

They come in three forms, none of which describes a function.
"""

import re

from overlapse.grammar.source import Source

IDLE = r"(?:[ \t]*(?:#[^\n]*)?\n)*"  # blank lines and comments
GAP = r"[ \t]*(?:#[^\n]*)?\n" + IDLE  # the end of a line, then idle lines

_FORMS = {
    "electrons by l and a local part below each element": re.compile(
        r"^[ \t]*[A-Z][A-Za-z]?[ \t]+[A-Za-z][^\n]*\n" + IDLE + r"[ \t]*\d+(?:[ \t]+\d+)*" + GAP
        + r"[ \t]*\d*\.\d+[ \t]+\d+(?:[ \t]+[-+]?\d*\.\d+)*" + GAP + r"[ \t]*(?:\d|[A-Z])",
        re.MULTILINE,
    ),
    "core potentials below a name": re.compile(
        r"^[ \t]*(?!(?:ecp|end|so)[ \t]*$)[^\s\"#&]+" + GAP
        + r"[ \t]*[A-Za-z]{1,3}[ \t]+nelec[ \t]+\d+",
        re.MULTILINE | re.IGNORECASE,
    ),
    "sections of a fitted potential": re.compile(
        r"^[ \t]*&\w*_POT[ \t]*\n[^\n]*\n(?:[ \t]*\d+[ \t]*\n)?[ \t]*\d*\.\d+[ \t]",
        re.MULTILINE | re.IGNORECASE,
    ),
}  # fmt: skip
_SECTION = re.compile(r"^[ \t]*(?:basis|ecp)\b", re.MULTILINE | re.IGNORECASE)


def potentials_in(source: Source) -> tuple[str, int] | None:
    """What marks a text as pseudopotentials, and the line (0-based) where they begin."""
    text = source.flat
    if not _SECTION.search(text):
        for what, pattern in _FORMS.items():
            if match := pattern.search(text):
                return what, text.count("\n", 0, match.start())
    return None
