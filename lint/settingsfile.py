"""A settings file: its keys, checked, and what they mean for one path.

Imported only where there is such a file.
"""

import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any, NamedTuple

from pydantic import ValidationError

from overlapse.grammar.source import Place
from overlapse.lint import tree
from overlapse.lint.patterns import matches
from overlapse.lint.settings import Elementwise, Probe, Settings, SettingsError, table_of
from overlapse.lint.settingskeys import Accept, Choices, Keys, told
from overlapse.lint.tomlplaces import KeyPlaces, places
from overlapse.rules.acceptance import Acceptance


class Assignment(NamedTuple):
    """One setting that a file makes for a path.

    key: names, from the outside in.  elements: atomic numbers that it is for, None for all.  at:
    dotted path of the key in the file.
    """

    key: tuple[str, ...]
    value: Any
    elements: frozenset[int] | None
    at: str


@dataclass(frozen=True)
class SettingsFile:
    """A settings file that has been read and checked."""

    path: Path
    table: tuple[str, ...]
    keys: Keys

    @property
    def folder(self) -> Path:
        return self.path.parent

    @cached_property
    def places(self) -> dict[str, KeyPlaces]:
        """Where each key stands; worked out only when somebody asks."""
        return _places(self.path, self.table)

    def where(self, at: str) -> str:
        """File and line of a key, for people."""
        found = _nearest(self.places, at)
        return f"{self.path}:{found.key.line}" if found else str(self.path)

    def place_of(self, at: str) -> Place:
        """Line and column of a key."""
        found = _nearest(self.places, at)
        return found.key if found else Place(1, 1)

    def settings_for(self, path: Path) -> Settings:
        """What holds for a file below this one's folder."""
        plain: dict[tuple[str, ...], Any] = {}
        some: dict[frozenset[int], dict[tuple[str, ...], Any]] = {}
        for made in self.assignments(path):
            holder = plain if made.elements is None else some.setdefault(made.elements, {})
            # One that comes later holds over one that came before.
            holder.pop(made.key, None)
            holder[made.key] = made.value
        return Settings(
            fail_at=plain.get(("fail-at",), "warning"),
            severity=_severity(plain),
            limits=_limits(plain),
            origin=self.path,
            label=plain.get(("label",)),
            layout=plain.get(("layout",)),
            elementwise=tuple(
                Elementwise(numbers, _severity(made), _limits(made))
                for numbers, made in some.items()
            ),
            acceptances=tuple(self._acceptances(path)),
            probes=tuple(self._probes(path)),
            reference=self._below(self.keys.reference),
            seal=self._below(self.keys.seal),
            ledger=self._below(self.keys.ledger),
        )

    def assignments(self, path: Path) -> Iterator[Assignment]:
        """The settings that the file makes for a path, in order: a later one wins."""
        yield from _assignments(self.keys, None, "")
        for index, choice in enumerate(self.keys.where):
            if not choice.paths or self.is_among(path, choice.paths):
                numbers = choice.numbers if choice.elements else None
                yield from _assignments(choice, numbers, f"where.{index}.")

    def probes_of(self) -> tuple[Probe, ...]:
        """All probes, whatever basis files they are for."""
        return tuple(
            Probe(
                tuple(probe.basis),
                self.folder / probe.geometry,
                probe.removal_threshold,
                probe.cartesian,
                None if probe.mesh is None else (probe.mesh[0], probe.mesh[1], probe.mesh[2]),
            )
            for probe in self.keys.probe
        )

    def _probes(self, path: Path) -> Iterator[Probe]:
        for probe in self.probes_of():
            if self.is_among(path, probe.basis):
                yield probe

    def _acceptances(self, path: Path) -> Iterator[Acceptance]:
        for index, accept in enumerate(self.keys.accept):
            if self.is_among(path, accept.paths):
                yield _acceptance(accept, self.name_of(index))

    def name_of(self, index: int) -> str:
        """How reports call an acceptance, counted from 0."""
        return f"{self.path.name}, accept {index + 1}"

    def is_among(self, path: Path, patterns: Sequence[str]) -> bool:
        """Whether a (resolved) path fits one of the patterns."""
        relative = os.path.relpath(path, self.folder).replace(os.sep, "/")
        return any(matches(relative, pattern) for pattern in patterns)

    def _below(self, name: str | None) -> Path | None:
        return None if name is None else self.folder / name


def _acceptance(accept: Accept, where: str) -> Acceptance:
    return Acceptance(
        tuple(accept.rules), accept.numbers, accept.shell, " ".join(accept.because.split()), where
    )


def _severity(made: dict[tuple[str, ...], Any]) -> dict[str, str]:
    return {key[1]: value for key, value in made.items() if key[0] == "severity"}


def _limits(made: dict[tuple[str, ...], Any]) -> dict[str, dict[str, float]]:
    found: dict[str, dict[str, float]] = {}
    for key, value in made.items():
        if key[0] == "limits":
            found.setdefault(key[1], {})[key[2]] = value
    return found


def _assignments(
    choices: Choices, elements: frozenset[int] | None, prefix: str
) -> Iterator[Assignment]:
    for name in ("fail-at", "label", "layout"):
        value = getattr(choices, name.replace("-", "_"))
        if value is not None:
            yield Assignment((name,), value, elements, prefix + name)
    for rule, level in choices.severity.items():
        yield Assignment(("severity", rule), level, elements, f"{prefix}severity.{rule}")
    for rule, limits in choices.limits.items():
        for limit, number in limits.items():
            at = f"{prefix}limits.{rule}.{limit}"
            yield Assignment(("limits", rule, limit), float(number), elements, at)


# ---- reading


def read(path: Path, table: tuple[str, ...]) -> SettingsFile:
    """Read and check a file; raises SettingsError that names each wrong key with its line."""
    found = table_of(path, table) or {}
    try:
        return SettingsFile(path, table, Keys.model_validate(found))
    except ValidationError as wrong:
        where = _places(path, table)
        lines = []
        for at, problem, is_key in told(wrong, found):
            spot = _nearest(where, at)
            line, column = (spot.key if is_key else spot.value) if spot else (1, 1)
            lines.append((line, column, f"{path}:{line}:{column}: {problem}"))
        raise SettingsError("\n".join(words for _, _, words in sorted(lines))) from None


def _places(path: Path, table: tuple[str, ...]) -> dict[str, KeyPlaces]:
    prefix = "".join(f"{name}." for name in table)
    return {
        key.removeprefix(prefix): place
        for key, place in places(tree.text(path)).items()
        if key.startswith(prefix)
    }


def _nearest(where: dict[str, KeyPlaces], at: str) -> KeyPlaces | None:
    """The place of a key, or of the table that it is missing from."""
    while at and at not in where:
        at = at.rpartition(".")[0]
    return where.get(at)
