"""Settings: which level fails, which rules are quiet, which limits hold.

They are looked for from each checked file upwards: the nearest ``overlapse.toml``, or
``[tool.overlapse]`` in a ``pyproject.toml``.
"""

import sys
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path
from typing import Any

from overlapse.rules.registry import rules

LEVELS = ("error", "warning", "note")


class SettingsError(ValueError):
    """A settings file that cannot be used; the message names file and key."""


@dataclass(frozen=True)
class Settings:
    """fail_at: level from which findings make the audit fail.  severity: level per rule, or "off".
    limits: values per rule.  origin: the file they came from, None for the defaults.  reference:
    folder of files to compare with.
    """

    fail_at: str = "warning"
    severity: dict[str, str] = field(default_factory=dict)
    limits: dict[str, dict[str, float]] = field(default_factory=dict)
    origin: Path | None = None
    reference: Path | None = None


def settings_for(path: Path) -> Settings:
    """Settings that hold for a file or folder: from the nearest settings file above it.

    Raises SettingsError for a file that is no TOML or holds a wrong key or value.
    """
    folder = path if path.is_dir() else path.parent
    return _nearest(folder.resolve())


@cache
def _nearest(folder: Path) -> Settings:
    own = folder / "overlapse.toml"
    if own.is_file():
        return _read(own, [])
    project = folder / "pyproject.toml"
    if project.is_file() and (found := _table(project, ["tool", "overlapse"])) is not None:
        return _settings(project, found)
    return _nearest(folder.parent) if folder.parent != folder else Settings()


def _read(path: Path, keys: list[str]) -> Settings:
    return _settings(path, _table(path, keys) or {})


def _table(path: Path, keys: list[str]) -> dict[str, Any] | None:
    # Imported here because most audits find no settings file.
    if sys.version_info >= (3, 11):
        import tomllib
    else:
        import tomli as tomllib
    try:
        table: Any = tomllib.loads(path.read_text("utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError, OSError) as problem:
        raise SettingsError(f"{path}: {problem}") from None
    for key in keys:
        table = table.get(key) if isinstance(table, dict) else None
    return table if isinstance(table, dict) else None


def _settings(path: Path, table: dict[str, Any]) -> Settings:
    known = ("fail-at", "severity", "limits", "reference")
    for key in table:
        if key not in known:
            raise SettingsError(f"{path}: {_unknown('key', key, known)}")
    fail_at = table.get("fail-at", "warning")
    if fail_at not in LEVELS:
        raise SettingsError(f"{path}: fail-at = {fail_at!r}; it is one of {', '.join(LEVELS)}")
    severity = table.get("severity", {})
    for name, level in severity.items():
        _check_rule(path, name)
        if level not in (*LEVELS, "off"):
            raise SettingsError(
                f"{path}: severity of {name} = {level!r}; it is one of {', '.join(LEVELS)}, off"
            )
    limits = table.get("limits", {})
    for name, values in limits.items():
        _check_rule(path, name)
        allowed = tuple(rules()[name].limits)
        for key, value in values.items():
            if key not in allowed:
                raise SettingsError(f"{path}: {_unknown(f'limit of {name}', key, allowed)}")
            if isinstance(value, bool) or not isinstance(value, int | float):
                raise SettingsError(f"{path}: limit {key} of {name} = {value!r}; it is a number")
    reference = table.get("reference")
    if reference is not None and not (
        isinstance(reference, str) and (path.parent / reference).is_dir()
    ):
        raise SettingsError(f"{path}: reference = {reference!r}; it is a folder, seen from there")
    return Settings(
        fail_at,
        dict(severity),
        {n: dict(v) for n, v in limits.items()},
        path,
        path.parent / reference if reference is not None else None,
    )


def _check_rule(path: Path, name: str) -> None:
    if name not in rules():
        raise SettingsError(f"{path}: {_unknown('rule', name, tuple(rules()))}")


def _unknown(what: str, name: str, known: tuple[str, ...]) -> str:
    from difflib import get_close_matches

    near = get_close_matches(name, known, 1)
    hint = f"; did you mean {near[0]}?" if near else f"; known: {', '.join(known) or 'none'}"
    return f"no {what} is called {name!r}{hint}"
