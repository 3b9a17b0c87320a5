"""Settings: which level fails, which rules are quiet, which limits hold, what is accepted.

They are looked for from each checked file upwards: the nearest ``overlapse.toml``, or
``[tool.overlapse]`` in a ``pyproject.toml``.  Nothing in them is ever run.
"""

import os
import re
import sys
from collections.abc import Hashable, Mapping
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

from overlapse.grammar.elements import number_of, symbol_of
from overlapse.lint import tree
from overlapse.rules.acceptance import Acceptance

if TYPE_CHECKING:
    from overlapse.lint.settingsfile import SettingsFile

LEVELS = ("error", "warning", "note")
Limits = Mapping[str, Mapping[str, float]]


class SettingsError(ValueError):
    """A settings file that cannot be used; the message names file, line and key."""


@dataclass(frozen=True)
class Elementwise:
    """Severity and limits that hold for some elements only.  numbers: atomic numbers."""

    numbers: frozenset[int]
    severity: Mapping[str, str] = field(default_factory=dict)
    limits: Limits = field(default_factory=dict)


@dataclass(frozen=True)
class Probe:
    """A geometry on which basis files are to be tried.

    basis: patterns of paths below the settings file's folder.  removal_threshold: eigenvalue of
    the overlap matrix below which a program drops functions, None for the usual ladder.  cartesian:
    whether d and higher functions are Cartesian, None for what the files say.  mesh: k-points along
    the three directions of the reciprocal lattice, None for no lattice.
    """

    basis: tuple[str, ...]
    geometry: Path
    removal_threshold: float | None = None
    cartesian: bool | None = None
    mesh: tuple[int, int, int] | None = None


@dataclass(frozen=True)
class Settings:
    """What holds for one file.

    fail_at: level from which findings make the audit fail.  severity: level per rule, or "off".
    limits: values per rule.  origin: the file they came from, None for the defaults.  label,
    layout: used where the caller gives none.  elementwise: severity and limits of some elements;
    the last one that holds wins.  acceptances: findings that are accepted.  probes: geometries to
    try this file on.  reference: folder of files to compare with; seal: file of canonical digests;
    ledger: file of findings that are known.
    """

    fail_at: str = "warning"
    severity: Mapping[str, str] = field(default_factory=dict)
    limits: Limits = field(default_factory=dict)
    origin: Path | None = None
    label: str | None = None
    layout: str | None = None
    elementwise: tuple[Elementwise, ...] = ()
    acceptances: tuple[Acceptance, ...] = ()
    probes: tuple[Probe, ...] = ()
    reference: Path | None = None
    seal: Path | None = None
    ledger: Path | None = None

    def level_of(self, rule: str, element: str | None = None) -> str | None:
        """The level that a rule's findings get, "off", or None for the rule's own."""
        level = self.severity.get(rule)
        for some in self._that_hold_for(element):
            level = some.severity.get(rule, level)
        return level

    def limits_of(self, rule: str, element: str | None = None) -> dict[str, float]:
        """The limits of a rule that are not the rule's own."""
        limits = dict(self.limits.get(rule, {}))
        for some in self._that_hold_for(element):
            limits.update(some.limits.get(rule, {}))
        return limits

    def variants_of(self, rule: str) -> list[dict[str, float]]:
        """All sets of limits under which a rule is to be judged, that of most elements first."""
        found = [self.limits_of(rule)]
        for some in self.elementwise:
            for number in sorted(some.numbers) if rule in some.limits else ():
                limits = self.limits_of(rule, symbol_of(number))
                if limits not in found:
                    found.append(limits)
        return found

    def is_off(self, rule: str) -> bool:
        """Whether a rule is quiet for all elements."""
        return self.severity.get(rule) == "off" and all(
            some.severity.get(rule, "off") == "off" for some in self.elementwise
        )

    def _that_hold_for(self, element: str | None) -> list[Elementwise]:
        if element is None or not self.elementwise:
            return []
        number = number_of(element)
        return [some for some in self.elementwise if number in some.numbers]


def settings_for(path: str | os.PathLike[str]) -> Settings:
    """Settings that hold for a file: from the nearest settings file above it.

    Raises SettingsError for a file that is no TOML or holds a wrong key or value.
    """
    name = os.fspath(path)
    folder, last = (name, "") if tree.is_folder(name) else os.path.split(name)
    resolved = Path(os.path.realpath(folder))
    found = file_for(resolved)
    return Settings() if found is None else found.settings_for(resolved / last)


def nearest(name: str, path: str | os.PathLike[str]) -> Path | None:
    """The nearest file of a name in the folders above a path, or None."""
    for folder in _above(os.path.dirname(os.path.realpath(path))):
        place = os.path.join(folder, name)
        if tree.is_file(place):
            return Path(place)
    return None


@cache
def _above(folder: str) -> tuple[str, ...]:
    """A folder and those above it.  Plain strings: an audit of many files asks for each."""
    up = os.path.dirname(folder)
    return (folder,) if up == folder else (folder, *_above(up))


def file_for(folder: Path) -> "SettingsFile | None":
    """The settings file that holds in a (resolved) folder, or None for the defaults.

    Raises SettingsError for one that cannot be used.
    """
    for place in _above(str(folder)):
        for name, keys in (("overlapse.toml", ()), ("pyproject.toml", ("tool", "overlapse"))):
            path = os.path.join(place, name)
            stamp = tree.stamp(path)
            found = _file(Path(path), keys, stamp) if stamp is not None else None
            if found is not None:
                return found
    return None


@cache
def _file(path: Path, keys: tuple[str, ...], stamp: Hashable) -> "SettingsFile | None":
    """A settings file, read once for each stamp; None for a project's that says nothing to us."""
    try:
        # Most projects do not mention us; theirs need not be taken apart.
        if keys and b"overlapse" not in tree.content(path):
            return None
    except OSError as problem:
        raise SettingsError(f"{path}: {problem.strerror or problem}") from None
    if keys and table_of(path, keys) is None:
        return None
    # The validating library is imported only where there is something to validate.
    from overlapse.lint.settingsfile import read

    return read(path, keys)


_PLACE = re.compile(r"(.*) \(at (?:line (\d+), column (\d+)|end of document)\)", re.DOTALL)


def _told(path: Path, problem: str) -> str:
    """What a library says of a text that is no TOML, with its place in front."""
    match = _PLACE.fullmatch(problem)
    if match is None:
        return f"{path}: {problem}"
    line, column = match[2] or tree.text(path).count("\n") + 1, match[3] or 1
    return f"{path}:{line}:{column}: this is no TOML: {match[1][:1].lower()}{match[1][1:]}"


def table_of(path: Path, keys: tuple[str, ...]) -> dict[str, Any] | None:
    """A table of a TOML file, the whole of it for no keys, or None where there is none.

    Raises SettingsError for a text that is no TOML.
    """
    if sys.version_info >= (3, 11):
        import tomllib
    else:
        import tomli as tomllib
    try:
        found: Any = tomllib.loads(tree.text(path))
    except tomllib.TOMLDecodeError as problem:
        raise SettingsError(_told(path, str(problem))) from None
    except UnicodeDecodeError as problem:
        line = problem.object.count(b"\n", 0, problem.start) + 1
        raise SettingsError(f"{path}:{line}:1: this is no text in UTF-8") from None
    except OSError as problem:
        raise SettingsError(f"{path}: {problem.strerror or problem}") from None
    for key in keys:
        found = found.get(key) if isinstance(found, dict) else None
    if found is not None and not isinstance(found, dict):
        raise SettingsError(f"{path}: {'.'.join(keys)} is no table")
    return found
