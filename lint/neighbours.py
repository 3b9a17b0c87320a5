"""What lies beside an audited file: its seal, its reference, and files of sets it must contain.

Sets of other files are found by label before anything is read: by the name of the file, and in
small audits also by what its first lines say.  Only candidates are read, few are kept.
"""

import os
import re
from collections.abc import Hashable, Iterable, Sequence
from functools import lru_cache
from pathlib import Path, PurePath

from overlapse.grammar.designation import (
    Designation,
    label_in_file_name,
    label_in_words,
    parse_label,
)
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_bytes
from overlapse.lint import tree
from overlapse.lint.settings import Settings, SettingsError, nearest
from overlapse.rules.case import Case

SEAL = "overlapse.seal.json"
# In larger audits a set is known by the name of its file alone.
_FEW_FILES = 300
_HEAD = 4000  # characters in which a file says what it is
_QUOTED = re.compile(r"[\"'](?:[A-Za-z]{1,3}_)?([^\"'\s]+)[\"']")


# ---- the seal


def seal_for(path: Path, settings: Settings) -> Path | None:
    """The seal file that holds for a file or folder: the settings', else the nearest above it."""
    return settings.seal or nearest(SEAL, path / SEAL if tree.is_folder(path) else path)


# ---- the other files of an audit


class Beside:
    """The files of one audit, by what they are called."""

    def __init__(self, paths: Sequence[Path]) -> None:
        self._called: dict[Path, frozenset[Designation]] = {}
        self._files: dict[Designation, list[Path]] = {}
        if len(paths) > 1:
            for path in paths:
                found = frozenset(_designations(path, len(paths) <= _FEW_FILES))
                self._called[path] = found
                for designation in found:
                    self._files.setdefault(designation, []).append(path)

    def parents(self, path: Path) -> list[Path]:
        """Files that seem to hold a set which one of this file must contain.

        Of several that are called the same, those of the same folder; where there is none, only a
        single one elsewhere will do.
        """
        from overlapse.rules.families.kin import may_contain

        found: dict[Path, None] = {}
        for own in self._called.get(path, ()):
            for parent, files in self._files.items():
                if may_contain(own, parent):
                    near = [file for file in files if file.parent == path.parent]
                    found.update(dict.fromkeys(near or (files if len(files) == 1 else ())))
        return [file for file in found if file != path]


def _designations(path: Path, closely: bool) -> Iterable[Designation]:
    labels = [label_in_file_name(path.name)]
    if closely:
        labels += _labels_in_head(path)
    for label in labels:
        designation = parse_label(label) if label else None
        if designation is not None and not designation.readings and not designation.fitting:
            yield designation


def _labels_in_head(path: Path) -> list[str | None]:
    """Labels that the first lines of a file name, by themselves or in a heading's quotes."""
    if not tree.is_file(path):
        return []  # of a pipe nothing would be left for the audit
    try:
        head = tree.content(path, _HEAD).decode("utf-8", "replace")
    except OSError:
        return []  # the audit tells of it
    found: list[str | None] = [match[1] for match in _QUOTED.finditer(head)]
    for line in head.split("\n")[:60]:
        words = re.split(r"[\s:=]+", line.strip().lstrip("!#*/$ \t"))
        found += [label_in_words(words[at:]) for at in range(min(len(words), 4))]
    return found


@lru_cache(maxsize=4)
def _document(path: Path, stamp: Hashable) -> Document:
    return read_bytes(tree.content(path), os.fspath(path))


def document_at(path: Path) -> Document | None:
    """A file's document, kept for the next who asks; None where it cannot be opened."""
    try:
        return _document(path, tree.stamp(path))
    except OSError:
        return None


# ---- the reference


@lru_cache(maxsize=8)
def _reference_files(folder: Path, stage: Hashable) -> dict[str, tuple[Path, ...]]:
    """The files of a reference folder by their names without endings; ``stage``: of the tree."""
    from overlapse.lint.engine import targets

    if not tree.is_folder(folder):
        raise SettingsError(f"{folder}: the settings name it as the reference; it is no folder")

    found: dict[str, tuple[Path, ...]] = {}
    for target in targets([folder], lambda trouble: None):
        stem = target.path.stem.casefold()
        found[stem] = (*found.get(stem, ()), target.path)
    return found


def reference_of(path: PurePath, folder: Path) -> Path | None:
    """The namesake of a file in a reference folder, None if there is none or none is likeliest.

    A file of the same whole name comes before one of another ending, one in folders of the same
    names before others.
    """
    ranked: dict[tuple[bool, int], list[Path]] = {}
    for file in _reference_files(folder, tree.stage()).get(path.stem.casefold(), ()):
        same_name = file.name.casefold() == path.name.casefold()
        ranked.setdefault((same_name, _common_folders(path, file)), []).append(file)
    best = ranked[max(ranked)] if ranked else []
    return best[0] if len(best) == 1 else None


def _common_folders(one: PurePath, other: PurePath) -> int:
    """How many folders right above two files have the same names."""
    count = 0
    for mine, theirs in zip(one.parent.parts[::-1], other.parent.parts[::-1], strict=False):
        if mine != theirs:
            break
        count += 1
    return count


# ---- all of it


def looked_at(path: Path, settings: Settings, beside: Beside | None) -> list[Path]:
    """The files and folders besides its own that the judgement of a file depends on."""
    seal = seal_for(path, settings)
    parents = beside.parents(path) if beside else []
    geometries = [probe.geometry for probe in settings.probes]
    return [place for place in (seal, settings.reference, *geometries, *parents) if place]


def furnish(case: Case, settings: Settings, beside: Beside | None) -> None:
    """Give a case what lies beside its file.

    Raises SettingsError for a seal file that cannot be used, and for a reference that is no folder.
    """
    path = Path(case.document.path)
    if (seal := seal_for(path, settings)) is not None:
        from overlapse.lint.sealing import sealed_sets

        case.seals = sealed_sets(case.document, path, seal)
    if settings.reference is not None:
        namesake = reference_of(path, settings.reference)
        if namesake is not None and namesake.resolve() != path.resolve():
            case.reference = document_at(namesake)
    others = [document_at(parent) for parent in beside.parents(path)] if beside else []
    if others or len(case.sets) > 1:
        from overlapse.rules.compare.kinship import kin_among

        documents = [document for document in others if document is not None]
        case.kin = tuple(kin_among(case.claims, case.sets, [case.document, *documents]))
