"""Which settings hold for a path, and where each of them came from."""

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

from overlapse.grammar.elements import symbol_of
from overlapse.lint.ledger import NAME
from overlapse.lint.neighbours import SEAL
from overlapse.lint.settings import file_for, nearest
from overlapse.rules.registry import rules

if TYPE_CHECKING:
    from overlapse.lint.settingsfile import Assignment, SettingsFile

DEFAULT = "default"
NEAREST = "the nearest above"
_BY_NAME = {"seal": SEAL, "ledger": NAME}


class Effective(NamedTuple):
    """A setting that holds: its name, its value, the elements it is for, where it came from.

    elements: symbols, empty for all.  origin: file and line, "default", or
    "the nearest above" for a file that holds by its name.
    """

    name: str
    value: Any
    elements: tuple[str, ...]
    origin: str


def effective(path: Path) -> list[Effective]:
    """All settings that hold for a file or folder, defaults included.

    Raises SettingsError for settings that cannot be used.
    """
    folder = (path if path.is_dir() else path.parent).resolve()
    file = file_for(folder)
    resolved = folder if path.is_dir() else folder / path.name
    made: dict[tuple[str, frozenset[int] | None], tuple[Assignment, str]] = {}
    if file is not None:
        for one in file.assignments(resolved):
            name = ".".join(one.key)
            made.pop((name, one.elements), None)
            made[name, one.elements] = one, file.where(one.at)
    found = [*_plain(file, folder / path.name), *_lists(file, resolved), *_of_rules()]
    for (name, numbers), (one, origin) in made.items():
        symbols = tuple(map(symbol_of, sorted(numbers or ())))
        replaced = [at for at, old in enumerate(found) if old.name == name and not old.elements]
        new = Effective(name, one.value, symbols, origin)
        if replaced and not symbols:
            found[replaced[0]] = new
        else:
            found.insert(replaced[0] + 1 if replaced else len(found), new)
    return found


def _plain(file: "SettingsFile | None", path: Path) -> Iterator[Effective]:
    yield Effective("fail-at", "warning", (), DEFAULT)
    yield Effective("label", None, (), DEFAULT)
    yield Effective("layout", None, (), DEFAULT)
    for name in ("reference", "seal", "ledger"):
        value = getattr(file.keys, name) if file is not None else None
        if file is not None and value is not None:
            yield Effective(name, str(file.folder / value), (), file.where(name))
        elif name in _BY_NAME and (place := nearest(_BY_NAME[name], path)) is not None:
            yield Effective(name, str(place), (), NEAREST)
        else:
            yield Effective(name, None, (), DEFAULT)


def _lists(file: "SettingsFile | None", path: Path) -> Iterator[Effective]:
    """What is accepted, and the probes, for this path."""
    if file is None:
        return
    holding = file.settings_for(path)
    for accepted in holding.acceptances:
        index = int(accepted.where.rpartition(" ")[2]) - 1
        symbols = tuple(map(symbol_of, sorted(accepted.elements)))
        told = f"{', '.join(accepted.rules)} {accepted.shell or ''}".strip()
        value = f"{told} because {accepted.reason}"
        yield Effective("accept", value, symbols, file.where(f"accept.{index}"))
    for index, probe in enumerate(file.probes_of()):
        if probe in holding.probes:
            yield Effective("probe", str(probe.geometry), (), file.where(f"probe.{index}"))


def _of_rules() -> Iterator[Effective]:
    for name in rules():
        yield Effective(f"severity.{name}", "the rule's own", (), DEFAULT)
    for name, rule in rules().items():
        for limit, value in rule.limits.items():
            yield Effective(f"limits.{name}.{limit}", value, (), DEFAULT)
