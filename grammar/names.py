"""Sets that are called by a plain name, and names that several sets share."""

import json
import re
from functools import cache
from importlib.resources import files
from typing import Any, NamedTuple

_FILLING = re.compile(r"[\s_-]+")
_BRACKETS = str.maketrans("", "", "()")


class Named(NamedTuple):
    """What a name stands for: one set, or several where it is ambiguous.

    family: of the set.  sets: usual names, more than one (or none of their own) if ``ambiguous``.
    """

    family: str
    sets: tuple[str, ...]
    fitting: bool = False
    ambiguous: bool = False


def _key(name: str) -> str:
    return _FILLING.sub("", name.lower())


@cache
def _data() -> Any:
    return json.loads(files("overlapse.grammar").joinpath("names.json").read_text("utf-8"))


@cache
def _names() -> dict[str, Named]:
    data = _data()
    found: dict[str, Named] = {}
    for family, sets in data["sets"].items():
        for name, spellings in sets.items():
            for spelling in (name, *spellings):
                named = Named(family, (name,), name in data["fitting"])
                found[_key(spelling)] = named
                found.setdefault(_key(spelling).translate(_BRACKETS), named)
    for name, readings in data["ambiguous"].items():
        found[_key(name)] = Named(name, tuple(readings), ambiguous=True)
    return found


def named(label: str) -> Named | None:
    """What a label means as a plain name, or None if it is none of the known ones."""
    return _names().get(_key(label))


def usual_names() -> dict[str, str]:
    """Usual name of every set that is called by a plain name, with its family."""
    return {name: family for family, sets in _data()["sets"].items() for name in sets}


def is_short(label: str) -> bool:
    """Whether a plain name is so short, or so common a word, that a file may bear it by chance."""
    return len(_key(label)) < 4 or _key(label) in ("mini", "midi")
