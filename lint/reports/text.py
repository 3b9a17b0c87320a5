"""For people: each finding with the line it stands on, a pointer, the numbers and what to do."""

from collections.abc import Callable, Sequence
from textwrap import fill
from typing import TextIO

from overlapse.grammar.model import Document
from overlapse.lint.engine import FileAudit
from overlapse.lint.reports.lines import one_line
from overlapse.lint.terminal import width
from overlapse.rules.finding import Finding, Number

Paint = Callable[[str, str], str]

_COLOURS = {"error": "31", "warning": "33", "note": "36"}
_GUTTER = 9  # before a source line, for its number
_LEVEL = max(map(len, _COLOURS))  # so that what follows the level stands in one column


def write(audits: Sequence[FileAudit], out: TextIO, colour: bool) -> None:
    paint = _painted if colour else _plain
    columns = width(out)
    for audit in audits:
        if audit.passed_over:
            continue
        if audit.problem:
            out.write(_headed("error", one_line(audit.problem), paint) + "\n\n")
        elif audit.findings:
            out.write(_heading(audit, paint) + "\n\n")
            for finding in audit.findings:
                out.write(_finding(finding, audit.document, paint, columns) + "\n")
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


def _headed(level: str, words: str, paint: Paint) -> str:
    return f"{paint(level, level)}{' ' * (_LEVEL - len(level))}  {words}"


def _finding(finding: Finding, document: Document | None, paint: Paint, columns: int) -> str:
    where = " ".join(filter(None, (finding.element, finding.shell)))
    place = f"line {finding.line}, column {finding.column}  {finding.rule}"
    lines = [_headed(finding.severity, f"{where}  {place}" if where else place, paint)]
    lines += _excerpt(finding, document, paint, columns - _GUTTER)
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


def _wrapped(text: str, indent: str, columns: int) -> str:
    return fill(
        one_line(text),
        columns,
        initial_indent=indent,
        subsequent_indent=indent + "  ",
        break_long_words=False,
        break_on_hyphens=False,
    )


def _number(value: Number) -> str:
    return f"{value:.8g}" if isinstance(value, float) else one_line(str(value))


def _excerpt(finding: Finding, document: Document | None, paint: Paint, room: int) -> list[str]:
    """The line a finding points at, as far as there is room, and a pointer below it."""
    if document is None or not document.source.text.strip():
        return []
    line = document.source.lines[finding.line - 1].replace("\t", " ")
    start = finding.column - 1
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
