"""Rules and layouts that other installed packages bring along, by entry points.

A package that says, in its own pyproject.toml,

    [project.entry-points."overlapse.rules"]
    tarn = "tarn_rules"

has the module ``tarn_rules`` imported with the rules, which it registers with the decorator that
all rules have; an entry of the group ``overlapse.layouts`` names an object of the class `Layout`.
One that cannot be loaded is noted in `troubles` and does without.
"""

import importlib.util
import os
import sys
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from importlib.metadata import EntryPoint

RULES, LAYOUTS = "overlapse.rules", "overlapse.layouts"

troubles: list[str] = []


def load(entry: "EntryPoint") -> Any | None:
    """The object that an entry point names, or None where it cannot be had."""
    try:
        return entry.load()
    except Exception as problem:  # whatever a stranger's module does when it is imported
        trouble(entry, f"{type(problem).__name__}: {problem}")
        return None


def trouble(entry: "EntryPoint", problem: str) -> None:
    """Note that an entry cannot be used."""
    owner = entry.dist.name if entry.dist is not None else "an unknown package"
    note(f"{entry.group} {entry.name!r} of {owner} is left out: {problem}")


def note(message: str) -> None:
    """Note a trouble, once."""
    if message not in troubles:
        troubles.append(message)


@cache
def entries(group: str) -> tuple["EntryPoint", ...]:
    """Entry points of a group, sorted by name."""
    if not _is_mentioned():
        return ()
    from importlib.metadata import entry_points

    return tuple(sorted(entry_points(group=group), key=lambda entry: entry.name))


@cache
def _is_mentioned() -> bool:
    """Whether any installed package has entry points for us.

    Looking for the words costs a tenth of what the library that reads them costs at start.
    """
    for place in sys.path:
        try:
            with os.scandir(place or ".") as listed:
                folders = [e.path for e in listed if e.name.endswith((".dist-info", ".egg-info"))]
        except OSError:
            continue
        for folder in folders:
            try:
                with open(os.path.join(folder, "entry_points.txt"), "rb") as table:
                    text = table.read()
            except OSError:
                continue
            if RULES.encode() in text or LAYOUTS.encode() in text:
                return True
    return False


def sources() -> list[Path]:
    """Files and folders of the packages that bring rules or layouts."""
    found: list[Path] = []
    for group in (RULES, LAYOUTS):
        for entry in entries(group):
            top = entry.value.partition(":")[0].partition(".")[0]
            try:
                spec = importlib.util.find_spec(top)
            except (ImportError, ValueError):
                spec = None
            if spec is not None and spec.submodule_search_locations:
                found += map(Path, spec.submodule_search_locations)
            elif spec is not None and spec.origin:
                found.append(Path(spec.origin))
    return found
