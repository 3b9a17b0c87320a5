"""The text layouts, one grammar and one module each.

A module of this folder that defines ``LAYOUT``, beside a grammar of its name, is a layout; nothing
else registers it.  The first lines of the grammar hold ``// spotted by: PATTERN``, a regular
expression (any letter case, ^ at each line) that every text of the layout matches somewhere.  It
spares most texts the import of most modules: only a layout that is spotted is asked for evidence.
"""

import re
from collections.abc import Iterable
from functools import cache
from importlib import import_module
from pathlib import Path

from overlapse.grammar import plugins
from overlapse.grammar.foreign import guarded
from overlapse.grammar.layout import Layout

_FOLDER = Path(__file__).parent
_SPOTTED_BY = "// spotted by: "


@cache
def _own() -> tuple[str, ...]:
    return tuple(sorted(path.stem.replace("_", "-") for path in _FOLDER.glob("*.lark")))


@cache
def _foreign() -> dict[str, Layout]:
    """Layouts that other packages bring, by name."""
    found: dict[str, Layout] = {}
    for entry in plugins.entries(plugins.LAYOUTS):
        layout = plugins.load(entry)
        if isinstance(layout, Layout) and layout.name not in (*_own(), *found):
            found[layout.name] = guarded(layout)
        elif layout is not None:
            is_one = isinstance(layout, Layout)
            plugins.trouble(entry, "the name is taken" if is_one else "it is no Layout")
    return found


@cache
def names() -> tuple[str, ...]:
    """Names of all layouts, in alphabetical order."""
    return tuple(sorted([*_own(), *_foreign()]))


@cache
def layout_of(name: str) -> Layout:
    """The layout of a name; raises ValueError for an unknown one."""
    if name not in names():
        raise ValueError(f"no layout is called {name!r}; known: {', '.join(names())}")
    if name in _foreign():
        return _foreign()[name]
    found = import_module(f"{__name__}.{name.replace('-', '_')}").LAYOUT
    assert isinstance(found, Layout)
    return found


@cache
def layouts() -> dict[str, Layout]:
    """All layouts by name, in alphabetical order."""
    return {name: layout_of(name) for name in names()}


@cache
def _pattern(name: str) -> re.Pattern[str]:
    if name in _foreign():  # which has been imported anyhow
        return re.compile("")
    with open(_FOLDER / f"{name.replace('-', '_')}.lark", encoding="utf-8") as grammar:
        line = next((line for line in grammar if line.startswith(_SPOTTED_BY)), _SPOTTED_BY)
    return re.compile(line[len(_SPOTTED_BY) :].rstrip("\n"), re.MULTILINE | re.IGNORECASE)


def spotted(text: str, among: Iterable[str]) -> list[Layout]:
    """Those of the named layouts whose pattern a text matches."""
    return [layout_of(name) for name in among if _pattern(name).search(text)]
