"""Seals: digests of what the elements of a library hold, kept in a file beside it.

The file is plain JSON: ``version``; ``files``, by their path below the folder of the seal file;
for each file its sets in order, with ``label`` and ``elements``; for each element ``digest``,
``parts`` and ``holds`` (see `overlapse.rules.compare.beside.Seal`).
"""

import json
import os
from collections.abc import Hashable, Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any, Literal, NamedTuple

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.model import Document
from overlapse.lint import tree
from overlapse.lint.neighbours import SEAL, seal_for
from overlapse.lint.settings import SettingsError, settings_for
from overlapse.rules.compare.beside import Seal, SealedSet, belonging, seals_of
from overlapse.rules.compare.canonical import ElementKey

VERSION = 1


class SealError(SettingsError):
    """A seal file that cannot be used; the message names it."""


class Entry(NamedTuple):
    """A set as it was sealed."""

    label: str | None
    elements: Mapping[ElementKey, Seal]


Entries = tuple[Entry, ...]


@dataclass(frozen=True)
class SealFile:
    """A seal file: its place, and the sets of each file by path below its folder."""

    path: Path
    files: Mapping[str, Entries]

    def key(self, path: Path) -> str | None:
        """The name of a file in here, None for one that lies outside the folder."""
        try:
            return path.resolve().relative_to(self.path.resolve().parent).as_posix()
        except ValueError:
            return None


# ---- reading


def load(path: Path) -> SealFile:
    """Read a seal file.  Raises SealError for one that cannot be read or is none."""
    return _loaded(path, tree.stamp(path))


@lru_cache(maxsize=8)
def _loaded(path: Path, stamp: Hashable) -> SealFile:
    try:
        plain = json.loads(tree.text(path))
        version = plain["version"]
        if version != VERSION:
            raise SealError(f"{path}: version {version!r} of a seal; this program reads {VERSION}")
        files = {name: tuple(map(_entry, sets)) for name, sets in plain["files"].items()}
    except OSError as problem:
        raise SealError(f"{path}: {problem.strerror or problem}") from None
    except (ValueError, TypeError, KeyError, AttributeError) as problem:
        if isinstance(problem, SealError):
            raise
        raise SealError(f"{path}: not a seal file ({type(problem).__name__}: {problem})") from None
    return SealFile(path, files)


def _entry(plain: Mapping[str, Any]) -> Entry:
    return Entry(
        plain["label"],
        {
            _element(name): Seal(str(seal["digest"]), dict(seal["parts"]), str(seal["holds"]))
            for name, seal in plain["elements"].items()
        },
    )


def _element(name: str) -> ElementKey:
    symbol, _, time = name.partition(" ")
    number = number_of(symbol)
    if number is None:
        raise ValueError(f"{symbol!r} is not the symbol of an element")
    return number, int(time) - 1 if time else 0


def _name(key: ElementKey) -> str:
    number, ordinal = key
    return symbol_of(number) + (f" {ordinal + 1}" if ordinal else "")


# ---- what holds for a document


def entries_of(document: Document) -> Entries:
    """What a document holds, sealed now."""
    return tuple(
        Entry(members.label, seals_of(members)) for members in over_normalised(document).sets
    )


def sealed_sets(document: Document, path: Path, seal: Path) -> tuple[SealedSet, ...]:
    """The sets of a document as a seal file has them; () where it does not know the document.

    Raises SealError for a seal file that cannot be used.
    """
    seals = load(seal)
    entries = seals.files.get(seals.key(path) or "", ())
    owners = belonging([entry.label for entry in entries], document.sets)
    return tuple(
        SealedSet(own, entry.label, entry.elements)
        for own, entry in zip(owners, entries, strict=True)
    )


# ---- comparing and writing

State = Literal["as sealed", "changed", "not sealed", "gone"]


class Checked(NamedTuple):
    """An element against its seal; before and now are None where there is none."""

    path: str
    label: str | None
    element: str
    state: State
    before: Seal | None
    now: Seal | None

    @property
    def changed(self) -> list[str]:
        """The parts that changed: letters of functions, "potential"."""
        before, now = (seal.parts if seal else {} for seal in (self.before, self.now))
        return [name for name in {**before, **now} if before.get(name) != now.get(name)]


def check(name: str, document: Document | None, entries: Entries) -> Iterator[Checked]:
    """All elements of a file against its seal; ``document`` is None for a file that is gone."""
    sets = over_normalised(document).sets if document is not None else ()
    owners = belonging([entry.label for entry in entries], sets)
    for own, entry in zip(owners, entries, strict=True):
        now = seals_of(sets[own]) if own >= 0 else {}
        yield from _check_set(name, entry.label, entry.elements, now)
    for index, members in enumerate(sets):
        if index not in owners:
            yield from _check_set(name, members.label, {}, seals_of(members))


def _check_set(
    name: str,
    label: str | None,
    before: Mapping[ElementKey, Seal],
    now: Mapping[ElementKey, Seal],
) -> Iterator[Checked]:
    for key in sorted({*before, *now}):
        old, new = before.get(key), now.get(key)
        state: State = "as sealed"
        if old is None or new is None:
            state = "not sealed" if old is None else "gone"
        elif old.digest != new.digest:
            state = "changed"
        yield Checked(name, label, _name(key), state, old, new)


def written(files: Mapping[str, Entries]) -> str:
    """The text of a seal file; the same for the same content."""
    plain = {
        "version": VERSION,
        "files": {
            name: [
                {
                    "label": entry.label,
                    "elements": {
                        _name(key): {
                            "digest": seal.digest,
                            "parts": dict(seal.parts),
                            "holds": seal.holds,
                        }
                        for key, seal in sorted(entry.elements.items())
                    },
                }
                for entry in entries
            ]
            for name, entries in sorted(files.items())
        },
    }
    return json.dumps(plain, indent=1, ensure_ascii=False) + "\n"


def put(seals: SealFile) -> None:
    """Write a seal file; it appears only when it is complete."""
    from overlapse.lint.common import output

    with output(seals.path) as stream:
        stream.write(written(seals.files))


def common_seal(paths: Iterable[Path]) -> Path | None:
    """The one seal file that holds for all paths, or None where none of them has one.

    A seal file that the settings name comes before the nearest one above.  Raises SealError where
    several hold.
    """
    found = {seal_for(path, settings_for(path)) for path in paths}
    if len(found) > 1:
        told = ", ".join(sorted(str(path) if path else "none" for path in found))
        raise SealError(f"several seal files hold for these paths ({told}); name one with --seal")
    return found.pop() if found else None


def new_seal(paths: Iterable[Path]) -> Path:
    """Where a first seal file goes: the working folder if all paths lie below, else above them."""
    folders = [path.resolve() if path.is_dir() else path.resolve().parent for path in paths]
    common = Path(os.path.commonpath(folders))
    here = Path.cwd()
    return (here if common.is_relative_to(here) else common) / SEAL
