"""For people: each finding with the line it stands on, a pointer, the numbers and what to do."""

from collections import Counter
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field
from typing import TextIO

from overlapse.lint.engine import FileAudit
from overlapse.lint.reports.lines import one_line
from overlapse.lint.terminal import width, wrapped
from overlapse.rules.finding import Finding, Number

Paint = Callable[[str, str], str]

_COLOURS = {"error": "31", "warning": "33", "note": "36"}
_GUTTER = 9  # before a source line, for its number
_LEVEL = max(map(len, _COLOURS))  # so that what follows the level stands in one column


def write(audits: Iterable[FileAudit], out: TextIO, colour: bool) -> None:
    paint = _painted if colour else _plain
    tally, columns = Tally(), width(out)
    for audit in audits:
        tally.add(audit)
        if audit.passed_over:
            continue
        if audit.problem:
            out.write(_headed("error", one_line(audit.problem), paint) + "\n\n")
        elif audit.findings or audit.accepted or audit.gone:
            out.write(_heading(audit, paint, columns) + "\n\n")
            for finding in audit.findings:
                out.write(_finding(finding, audit, paint, columns) + "\n")
            out.write("".join(f"{line}\n" for line in _set_apart(audit, columns)))
    out.write(tally.sentence() + "\n")


def _plain(text: str, kind: str) -> str:
    return text


def _painted(text: str, kind: str) -> str:
    return f"\x1b[{_COLOURS.get(kind, '1')}m{text}\x1b[0m"


def _heading(audit: FileAudit, paint: Paint, columns: int) -> str:
    name = one_line(audit.path)
    if audit.absent:
        return f"{paint(name, 'path')}  (in the ledger only)"
    if not audit.is_basis:
        return f"{paint(name, 'path')}  (settings)"
    facts = [f"layout {audit.layout}" if audit.layout else "no layout"]
    if audit.elements:
        facts.append(f"{audit.elements} element{'s' * (audit.elements != 1)}")
    if audit.label:
        facts.append(f"label {one_line(audit.label)} from {audit.label_from}")
    told = f"({'; '.join(facts)})"
    if len(name) + len(told) + 2 <= columns:
        return f"{paint(name, 'path')}  {told}"
    return f"{paint(name, 'path')}\n{_wrapped(told, '  ', columns)}"


def _headed(level: str, words: str, paint: Paint) -> str:
    return f"{paint(level, level)}{' ' * (_LEVEL - len(level))}  {words}"


def _finding(finding: Finding, audit: FileAudit, paint: Paint, columns: int) -> str:
    where = _place(finding.element, finding.shell)
    place = f"line {finding.line}, column {finding.column}"
    lines = [_headed(finding.severity, _spaced(where, place, finding.rule), paint)]
    lines += _excerpt(finding, audit, paint, columns - _GUTTER)
    lines.append(_wrapped(finding.message, "  ", columns))
    numbers = [
        f"{name} {_number(value)}"
        for name, value in (
            ("measured", finding.measured),
            ("limit", finding.limit),
            ("expected", finding.expected),
        )
        if value is not None
    ]
    if numbers:
        lines.append(_wrapped(", ".join(numbers), "  ", columns))
    lines += [_wrapped(f"because: {witness}", "  ", columns) for witness in finding.witnesses]
    if finding.remedy:
        lines.append(_wrapped(f"to do: {finding.remedy}", "  ", columns))
    return "\n".join(lines) + "\n"


def _set_apart(audit: FileAudit, columns: int) -> Iterator[str]:
    """What does not count: accepted findings, and known ones that are gone."""
    for finding, reason, where in audit.accepted:
        parts = ("accepted", _place(finding.element, finding.shell), f"line {finding.line}")
        yield _wrapped(f"{_spaced(*parts, finding.rule)}: {reason} ({where})", "", columns)
    for entry in audit.gone:
        place = _place(entry.get("element"), entry.get("shell"))
        yield _wrapped(f"{_spaced('gone', place, entry['rule'])}: {entry['message']}", "", columns)
    if audit.accepted or audit.gone:
        yield ""


def _place(element: str | None, shell: str | None) -> str:
    return " ".join(filter(None, (element, shell)))


def _spaced(*parts: str) -> str:
    """Parts with two blanks between them, but for empty ones."""
    return "  ".join(filter(None, parts))


def _wrapped(text: str, indent: str, columns: int) -> str:
    return wrapped(one_line(text), columns, first=indent, below=indent + "  ")


def _number(value: Number) -> str:
    return f"{value:.8g}" if isinstance(value, float) else one_line(str(value))


def _excerpt(finding: Finding, audit: FileAudit, paint: Paint, room: int) -> list[str]:
    """The line a finding points at, as far as there is room, and a pointer below it."""
    excerpt = audit.excerpts.get((finding.line, finding.column))
    if excerpt is None:
        return []
    line = excerpt.text.replace("\t", " ")
    start = finding.column - 1 - excerpt.start
    # A long line is shown around the place, not from its beginning.
    cut = max(0, start - room // 2) if len(line) > room else 0
    shown = one_line(line[cut : cut + room].rstrip())
    if not shown.strip():
        return []
    length = max(1, min(finding.length, len(shown) - (start - cut)))
    gutter = f"{finding.line:>6}"
    return [
        f"{gutter} : {shown}",
        f"{'':>6} : {' ' * (start - cut)}{paint('^' * length, finding.severity)}",
    ]


@dataclass
class Tally:
    """How many files, how many findings of each level, how many that do not count."""

    files: int = 0
    unread: int = 0
    passed: int = 0
    accepted: int = 0
    known: int = 0
    gone: int = 0
    levels: Counter[str] = field(default_factory=Counter)

    def add(self, audit: FileAudit) -> None:
        self.files += audit.is_basis and not (audit.passed_over or audit.absent)
        self.passed += audit.passed_over
        self.unread += bool(audit.problem)
        self.accepted += len(audit.accepted)
        self.known += len(audit.known)
        self.gone += len(audit.gone)
        self.levels.update(finding.severity for finding in audit.findings)

    def sentence(self) -> str:
        new = "new " if self.known or self.gone else ""
        told = [
            f"{count} {new}{level}{'s' * (count != 1)}"
            for level in ("error", "warning", "note")
            if (count := self.levels[level])
        ]
        parts = [f"{self.files} file{'s' * (self.files != 1)}"]
        parts.append(", ".join(told) or f"nothing {new}found")
        for count, what in (
            (self.accepted, "accepted"),
            (self.known, "known from the ledger"),
            (self.gone, "gone since"),
        ):
            if count:
                parts.append(f"{count} {what}")
        if self.unread:
            parts.append(f"{self.unread} could not be read")
        if self.passed:
            parts.append(f"{self.passed} passed over because no layout was recognised")
        return "; ".join(parts)
