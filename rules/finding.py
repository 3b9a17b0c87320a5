"""What a rule reports."""

from dataclasses import dataclass

from overlapse.grammar.model import Severity, Span

Number = float | int | str


@dataclass(frozen=True, slots=True)
class Edit:
    """A proposed change of the text: put ``replacement`` where the span (offsets) is."""

    span: Span
    replacement: str


@dataclass(frozen=True, slots=True)
class Finding:
    """One remark about one place of one file.

    rule: name, "group.rule".  line, column: counted from 1; length: characters to point at.
    element, shell: symbol and shell name ("C", "s-1"; a column of a general contraction "s-1/3")
    where they apply.  measured and limit: the number found and the one it broke.  expected: a
    proposed value for the place pointed at.  witnesses: what supports the suspicion.  edits:
    changes of the text that would mend it.  fingerprint: a digest that stays the same when other
    parts of the file change; the engine sets it.
    """

    rule: str
    severity: Severity
    message: str
    path: str
    line: int
    column: int
    length: int = 1
    element: str | None = None
    shell: str | None = None
    measured: Number | None = None
    limit: Number | None = None
    expected: Number | None = None
    witnesses: tuple[str, ...] = ()
    remedy: str = ""
    edits: tuple[Edit, ...] = ()
    fingerprint: str = ""
