"""For people: each finding with the line it stands on, a pointer, the numbers and what to do."""

from collections.abc import Callable, Sequence
from textwrap import fill
from typing import TextIO

from overlapse.grammar.model import Document
from overlapse.lint.engine import FileAudit
from overlapse.lint.reports.lines import one_line
from overlapse.rules.finding import Finding, Number

Paint = Callable[[str, str], str]

_COLOURS = {"error": "31", "warning": "33", "note": "36"}
_WIDTH = 96
_EXCERPT = 88  # characters of a source line that are shown


def write(audits: Sequence[FileAudit], out: TextIO, colour: bool) -> None:
    paint = _painted if colour else _plain
    for audit in audits:
        if audit.passed_over:
            continue
        if audit.problem:
            out.write(f"{paint('error', 'error')}  {one_line(audit.problem)}\n\n")
        elif audit.findings:
            out.write(_heading(audit, paint) + "\n\n")
            for finding in audit.findings:
                out.write(_finding(finding, audit.document, paint) + "\n")
    out.write(summary(audits) + "\n")


def _plain(text: str, kind: str) -> str:
    return text


def _painted(text: str, kind: str) -> str:
    return f"\x1b[{_COLOURS.get(kind, '1')}m{text}\x1b[0m"


def _heading(audit: FileAudit, paint: Paint) -> str:
    document = audit.document
    assert document is not None
    elements = len({block.atomic_number for block in document.blocks})
    facts = [f"layout {document.layout}" if document.layout else "no layout"]
    if elements:
        facts.append(f"{elements} element{'s' * (elements != 1)}")
    if audit.label:
        facts.append(f"label {one_line(audit.label)} from {audit.label_from}")
    return f"{paint(one_line(audit.path), 'path')}  ({'; '.join(facts)})"


def _finding(finding: Finding, document: Document | None, paint: Paint) -> str:
    where = " ".join(filter(None, (finding.element, finding.shell)))
    head = f"{paint(finding.severity, finding.severity)}  {where + '  ' if where else ''}"
    lines = [f"{head}line {finding.line}, column {finding.column}  {finding.rule}"]
    lines += _excerpt(finding, document, paint)
    lines.append(_wrapped(finding.message, "  "))
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
        lines.append(_wrapped(", ".join(numbers), "  "))
    lines += [_wrapped(f"because: {witness}", "  ") for witness in finding.witnesses]
    if finding.remedy:
        lines.append(_wrapped(f"to do: {finding.remedy}", "  "))
    return "\n".join(lines) + "\n"


def _wrapped(text: str, indent: str) -> str:
    return fill(
        one_line(text),
        _WIDTH,
        initial_indent=indent,
        subsequent_indent=indent + "  ",
        break_long_words=False,
        break_on_hyphens=False,
    )


def _number(value: Number) -> str:
    return f"{value:.8g}" if isinstance(value, float) else one_line(str(value))


def _excerpt(finding: Finding, document: Document | None, paint: Paint) -> list[str]:
    """The line a finding points at, and a pointer below it."""
    if document is None or not document.source.text.strip():
        return []
    line = document.source.lines[finding.line - 1].replace("\t", " ")
    start = finding.column - 1
    # A long line is shown around the place, not from its beginning.
    cut = max(0, start - _EXCERPT // 2) if len(line) > _EXCERPT else 0
    shown = one_line(line[cut : cut + _EXCERPT].rstrip())
    if not shown.strip():
        return []
    length = max(1, min(finding.length, len(shown) - (start - cut)))
    gutter = f"{finding.line:>6}"
    return [
        f"{gutter} : {shown}",
        f"{'':>6} : {' ' * (start - cut)}{paint('^' * length, finding.severity)}",
    ]


def summary(audits: Sequence[FileAudit]) -> str:
    """One sentence: how many files, how many findings of each level."""
    judged = [audit for audit in audits if not audit.passed_over]
    counts = {
        level: sum(f.severity == level for audit in judged for f in audit.findings)
        for level in ("error", "warning", "note")
    }
    told = [f"{count} {level}{'s' * (count != 1)}" for level, count in counts.items() if count]
    unread = sum(bool(audit.problem) for audit in judged)
    parts = [f"{len(judged)} file{'s' * (len(judged) != 1)}"]
    parts.append(", ".join(told) if told else "nothing found")
    if unread:
        parts.append(f"{unread} could not be read")
    if passed := len(audits) - len(judged):
        parts.append(f"{passed} passed over because no layout was recognised")
    return "; ".join(parts)
