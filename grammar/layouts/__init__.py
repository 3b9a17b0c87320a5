"""The text layouts, one grammar and one module each.

A module of this folder that defines ``LAYOUT`` is a layout; nothing else registers it.
"""

from functools import cache
from importlib import import_module
from importlib.resources import files

from overlapse.grammar.layout import Layout


@cache
def layouts() -> dict[str, Layout]:
    """All layouts by name, in alphabetical order."""
    found: dict[str, Layout] = {}
    for entry in sorted(files(__name__).iterdir(), key=lambda entry: entry.name):
        if entry.name.endswith(".py") and entry.name != "__init__.py":
            module = import_module(f"{__name__}.{entry.name.removesuffix('.py')}")
            if isinstance(layout := getattr(module, "LAYOUT", None), Layout):
                found[layout.name] = layout
    return found
