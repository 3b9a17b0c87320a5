"""Acceptances of settings files that accept nothing any more.

One that fits no finding hides the next slip at its place.  Whether it fits none can be said only
where all files that it is for were judged, by rules that had all they need; an audit of other files
leaves it alone.
"""

import os
import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TYPE_CHECKING

from overlapse.grammar.source import Source
from overlapse.lint import tree
from overlapse.lint.engine import FileAudit, excerpts, targets
from overlapse.lint.fingerprint import marked
from overlapse.lint.settings import file_for
from overlapse.rules.finding import Finding

if TYPE_CHECKING:
    from overlapse.lint.settingsfile import SettingsFile

RULE = "form.acceptance"
_MOST_FILES = 20_000  # that are looked through for those that a pattern fits


def with_unused(audits: Iterable[FileAudit], folders: Iterable[Path] = ()) -> Iterator[FileAudit]:
    """The audits, then one for each settings file with an acceptance that was of no use.

    folders: those that were searched from end to end.
    """
    uses: dict[Path, _Uses] = {}
    for audit in audits:
        origin = audit.settings.origin
        if origin is not None:
            uses.setdefault(origin, _Uses()).add(audit)
        yield audit
    roots = [Path(os.path.realpath(folder)) for folder in folders]
    for origin, seen in uses.items():
        if (told := _told(origin, seen, roots)) is not None:
            yield told


@dataclass
class _Uses:
    """What became of a settings file's acceptances, by how reports call them."""

    used: set[str] = field(default_factory=set)
    files: dict[str, set[str]] = field(default_factory=dict)  # that they are for
    silent: dict[str, set[str]] = field(default_factory=dict)  # rules that had not all they need

    def add(self, audit: FileAudit) -> None:
        for acceptance in audit.settings.acceptances:
            name = acceptance.where
            if name in self.used:
                continue
            if any(acceptance.covers(item.finding) for item in audit.accepted):
                self.used.add(name)
                self.files.pop(name, None)
            else:
                self.files.setdefault(name, set()).add(os.path.realpath(audit.path))
                self.silent.setdefault(name, set()).update(audit.silent)


def _told(origin: Path, seen: _Uses, roots: list[Path]) -> FileAudit | None:
    """What is to be said of a settings file, None for nothing."""
    file = file_for(origin.parent)
    if file is None or file.path != origin:
        return None
    settings = file.settings_for(origin)
    level = settings.level_of(RULE) or "note"
    findings = [
        finding
        for index in range(len(file.keys.accept))
        if level != "off" and (finding := _finding(file, index, seen, roots)) is not None
    ]
    if not findings:
        return None
    path = tree.shown(origin)
    source = Source(tree.text(origin), path)
    leveled = (
        replace(finding, path=path, severity=level)  # type: ignore[arg-type]
        for finding in findings
    )
    found = marked(leveled, source)
    return FileAudit(
        path, findings=found, settings=settings, is_basis=False, excerpts=excerpts(found, source)
    )


def _finding(file: "SettingsFile", index: int, seen: _Uses, roots: list[Path]) -> Finding | None:
    accept, name = file.keys.accept[index], file.name_of(index)
    if name in seen.used or not seen.silent.get(name, set()).isdisjoint(accept.rules):
        return None
    files = seen.files.get(name, set())
    if not files and not all(_is_below(file.folder / _fixed(p), roots) for p in accept.paths):
        return None
    if not _are_all(file, accept.paths, files):
        return None
    words = f"{', '.join(accept.rules)} found nothing there that this could accept"
    if not files:
        words = f"no file is called {' or '.join(accept.paths)}, which this is for"
    place = file.place_of(f"accept.{index}")
    return Finding(RULE, "note", words, "", *place, remedy="take the acceptance out")


def _are_all(file: "SettingsFile", patterns: list[str], files: set[str]) -> bool:
    """Whether no other files fit the patterns and follow this settings file."""
    for folder in {file.folder / _fixed(pattern) for pattern in patterns}:
        candidates = targets([folder], lambda trouble: None) if tree.is_folder(folder) else ()
        for looked, target in enumerate(candidates):
            place = Path(os.path.realpath(target.path))
            fits = file.is_among(place, patterns) and str(place) not in files
            if looked == _MOST_FILES or (fits and file_for(place.parent) is file):
                return False
    return True


def _fixed(pattern: str) -> str:
    """The folders that a pattern names before its first sign that stands for several."""
    if "/" not in pattern:
        return "."
    fixed = re.split(r"[*?]", pattern.removeprefix("./").removeprefix("/"))[0]
    return fixed.rpartition("/")[0] or "."


def _is_below(place: Path, roots: list[Path]) -> bool:
    resolved = Path(os.path.realpath(place))
    return any(resolved == root or root in resolved.parents for root in roots)
