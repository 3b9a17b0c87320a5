"""What the page shows, as plain data: from audits, which pass by once."""

import json
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.model import Document
from overlapse.lint.engine import LEVELS, FileAudit
from overlapse.lint.reports.json import finding_object
from overlapse.lint.reports.lines import one_line
from overlapse.lint.webpage.gallery import Gallery
from overlapse.rules.finding import Finding

# The page stays below 20 MB whatever is found: findings take at most this much of it, in
# characters, and the least severe are left out first.
ROOM = 9_000_000
_AROUND = 2  # lines shown before and after the one a finding points at
_SHOWN = 150  # characters of a line that are shown
_LONGEST = 4000  # characters of a message or remedy that are kept
_MOST_ACCEPTED = 500  # that are listed with their reasons


@dataclass
class Tally:
    """Findings of each level, and in which files."""

    levels: Counter[str] = field(default_factory=Counter)
    files: set[int] = field(default_factory=set)

    def add(self, level: str, file: int) -> None:
        self.levels[level] += 1
        self.files.add(file)

    @property
    def worst(self) -> str:
        """The highest level found, "clean" for none."""
        return next((level for level in reversed(LEVELS) if self.levels[level]), "clean")


class AcceptedFacts(NamedTuple):
    """An accepted finding: where, what, why, and where that is said."""

    path: str
    line: int
    place: str
    rule: str
    reason: str
    where: str


class FileFacts(NamedTuple):
    """One file in the page's table."""

    path: str
    layout: str
    label: str
    elements: int
    problem: str
    levels: Counter[str]
    is_basis: bool = True


@dataclass
class Facts:
    """All that the page shows.  ``room``: characters that findings may take.

    elements: by atomic number, those without findings too.  unlisted: findings of each level that
    are counted but not listed, because there was no room.  accepted: as many as are listed.  apart:
    how many findings are accepted, known from a ledger, and gone since.
    """

    room: int = ROOM
    files: list[FileFacts] = field(default_factory=list)
    elements: dict[int, Tally] = field(default_factory=dict)
    rules: dict[str, Tally] = field(default_factory=dict)
    levels: Counter[str] = field(default_factory=Counter)
    unlisted: Counter[str] = field(default_factory=Counter)
    passed_over: int = 0
    accepted: list[AcceptedFacts] = field(default_factory=list)
    apart: Counter[str] = field(default_factory=Counter)
    gallery: Gallery = field(default_factory=Gallery)
    _listed: dict[str, list[tuple[int, str]]] = field(
        default_factory=lambda: {level: [] for level in LEVELS}
    )
    _used: int = 0

    def add(self, audit: FileAudit) -> None:
        """Take in one file; of its document only what will be drawn is kept."""
        if audit.passed_over:
            self.passed_over += 1
            return
        self._set_apart(audit)
        if audit.absent:
            return
        document, file = audit.document, len(self.files)
        blocks = document.blocks if document else ()
        for block in blocks:
            self.elements.setdefault(block.atomic_number, Tally()).files.add(file)
        drawn = self.gallery.add(file, audit) if document else {}
        for finding in audit.findings:
            self._count(finding, file)
            plain = _finding(finding, document) | {"file": file}
            if scene := drawn.get(id(finding)):
                plain["scene"] = scene
            self._list(finding.severity, json.dumps(plain, ensure_ascii=False, allow_nan=False))
        self.files.append(
            FileFacts(
                one_line(audit.path),
                audit.layout if audit.is_basis else "settings",
                one_line(audit.label or ""),
                audit.elements,
                one_line(audit.problem),
                Counter(finding.severity for finding in audit.findings),
                audit.is_basis,
            )
        )

    def _set_apart(self, audit: FileAudit) -> None:
        """Count what does not count, and keep reasons."""
        self.apart += Counter(
            {"accepted": len(audit.accepted), "known": len(audit.known), "gone": len(audit.gone)}
        )
        for finding, reason, where in audit.accepted[: _MOST_ACCEPTED - len(self.accepted)]:
            place = " ".join(filter(None, (finding.element, finding.shell)))
            words = (_words(text) for text in (place, finding.rule, reason, where))
            self.accepted.append(AcceptedFacts(one_line(audit.path), finding.line, *words))

    def _count(self, finding: Finding, file: int) -> None:
        self.levels[finding.severity] += 1
        self.rules.setdefault(finding.rule, Tally()).add(finding.severity, file)
        if finding.element and (number := number_of(finding.element)) is not None:
            self.elements.setdefault(number, Tally()).add(finding.severity, file)

    def _list(self, level: str, text: str) -> None:
        self._listed[level].append((len(self.files), text))
        self._used += len(text)
        while self._used > self.room:
            least = next(name for name in LEVELS if self._listed[name])
            self._used -= len(self._listed[least].pop()[1])
            self.unlisted[least] += 1

    def data(self) -> str:
        """What the script works on, as JSON: files and findings, in the order of the files."""
        found = sorted(
            (item for listed in self._listed.values() for item in listed), key=lambda item: item[0]
        )
        files = [
            {
                "path": each.path,
                "layout": each.layout,
                "label": each.label,
                "elements": each.elements,
                "problem": each.problem,
                "levels": [each.levels[level] for level in reversed(LEVELS)],
            }
            for each in self.files
        ]
        listed = ",\n".join(text for _, text in found)
        return f'{{"files":{json.dumps(files, ensure_ascii=False)},\n"findings":[{listed}]}}'

    def symbols(self) -> list[tuple[str, Tally]]:
        """Elements with a finding, by atomic number."""
        return [(symbol_of(z), t) for z, t in sorted(self.elements.items()) if t.levels]


def gathered(audits: Iterable[FileAudit], room: int = ROOM) -> Facts:
    """The facts of all audits."""
    facts = Facts(room)
    for audit in audits:
        facts.add(audit)
    return facts


def _finding(finding: Finding, document: Document | None) -> dict[str, Any]:
    """A finding as plain data, without what is empty; every text is made harmless to look at."""
    plain = finding_object(finding)
    kept = ("rule", "severity", "line", "column", "element", "shell", "message", "remedy")
    found = {key: _words(plain[key]) for key in kept if plain[key] not in (None, "")}
    for key in ("measured", "limit", "expected"):
        if plain[key] is not None:
            value = plain[key]
            found[key] = f"{value:.8g}" if isinstance(value, float) else _words(str(value))
    if finding.witnesses:
        found["witnesses"] = [_words(words) for words in finding.witnesses]
    if document is not None and (excerpt := _excerpt(finding, document)):
        found["excerpt"] = excerpt
    return found


def _words(value: Any) -> Any:
    return one_line(value[:_LONGEST]) if isinstance(value, str) else value


def _excerpt(finding: Finding, document: Document) -> dict[str, Any]:
    """Lines around a finding; ``mark``: which of them, and from where to where, 0-based."""
    lines = document.source.lines
    at = finding.line - 1
    if not document.source.text.strip() or not 0 <= at < len(lines):
        return {}
    first, last = max(0, at - _AROUND), min(len(lines), at + _AROUND + 1)
    start = finding.column - 1
    # A long line is shown around the place, not from its beginning.
    cut = max(0, start - _SHOWN // 2) if len(lines[at]) > _SHOWN else 0
    shown = [
        one_line(lines[k][cut if k == at else 0 :][:_SHOWN].replace("\t", " ").rstrip())
        for k in range(first, last)
    ]
    begin = min(start - cut, len(shown[at - first]))
    end = max(begin, min(begin + finding.length, len(shown[at - first])))
    return {"first": first + 1, "lines": shown, "mark": [at - first, begin, end]}
