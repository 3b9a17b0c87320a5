"""Repairs: from the edits that findings propose to a mended text that says what it should.

Safe repairs change no number: the mended text is read again, and its model must be the old one bit
for bit (of elements given twice with the same numbers one stays, and rows may be sorted).  Numeric
repairs change what the file says and are made only where their rule is named; of the model only the
shell concerned may change, and the finding must be gone.  A mended text that does not pass is
refused.
"""

import re
from collections import Counter
from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar.model import Block, Document, Shell
from overlapse.grammar.reading import read_source
from overlapse.grammar.source import Source
from overlapse.lint.engine import FileAudit, Options, judge
from overlapse.lint.settings import Settings
from overlapse.rules.finding import Edit, Finding

SAFE = (
    "form.encoding",
    "form.ending",
    "form.index-column",
    "form.number",
    "form.repeat",
    "primitive.order",
)
NUMERIC = (
    "contraction.idle",
    "contraction.norm",
    "label.composition",
    "label.decoration",
    "label.family",
    "label.split",
)
ROUNDS = 200  # a finding that stands for several elements is mended element by element
_END = re.compile("\r\n|\r")


class Repair(NamedTuple):
    """A change of the text and the finding that it is for."""

    rule: str
    line: int
    element: str | None
    shell: str | None
    edits: tuple[Edit, ...]

    @property
    def where(self) -> str:
        place = " ".join(filter(None, (self.element, self.shell)))
        return f"line {self.line}" + (f", {place}" if place else "")


class Refusal(NamedTuple):
    """A repair that was not made, and why."""

    repair: Repair
    reason: str


@dataclass(frozen=True)
class Mended:
    """What became of a file's bytes.

    data: the mended bytes, equal to the old ones where nothing was done.  audit: what is found in
    them.
    """

    data: bytes
    done: tuple[Repair, ...]
    refused: tuple[Refusal, ...]
    audit: FileAudit


def mend(
    data: bytes,
    name: str,
    settings: Settings,
    also: Collection[str] = (),
    options: Options | None = None,
) -> Mended:
    """Make all safe repairs of a file's bytes, and the numeric ones of the rules in ``also``.

    Findings that are accepted are left alone.
    """
    options = options or Options()
    work = _Work(Source.decode(data, name), settings, options)
    if work.audit.document is None or b"\x00" in data[:8192]:
        return Mended(data, (), (), work.audit)
    for _ in range(ROUNDS):
        wanted = [
            repair
            for repair in _repairs(work.audit, also)
            if (repair.rule, repair.element, repair.shell) not in work.refused
        ]
        if not wanted:
            break
        work.take(wanted)
    return Mended(work.encoded(), tuple(work.done), tuple(work.refused.values()), work.audit)


def is_safe(finding: Finding) -> bool:
    """Whether a finding proposes a repair that changes no number."""
    textual = finding.rule in ("form.ending", "form.encoding")
    return finding.rule in SAFE and bool(finding.edits or textual)


def _repairs(audit: FileAudit, also: Collection[str]) -> list[Repair]:
    """The repairs that an audit's findings propose; the safe ones first and alone."""
    assert audit.document is not None
    safe, numeric = [], []
    for finding in audit.findings:
        edits = finding.edits or _textual(finding, audit.document.source)
        if edits is None:
            continue
        repair = Repair(finding.rule, finding.line, finding.element, finding.shell, tuple(edits))
        if finding.rule in SAFE:
            safe.append(repair)
        elif finding.rule in also and finding.rule in NUMERIC:
            numeric.append(repair)
    return safe or numeric


def _textual(finding: Finding, source: Source) -> Sequence[Edit] | None:
    """Edits that concern the text as a whole; None where there is nothing to do."""
    if finding.rule == "form.ending":
        return [Edit(end.span(), "\n") for end in _END.finditer(source.text)]
    if finding.rule == "form.encoding" and source.marked:
        return []  # the mark stands in front of the text
    return None


class _Work:
    """A text that is being mended."""

    def __init__(self, source: Source, settings: Settings, options: Options) -> None:
        self.settings, self.options = settings, options
        self.done: list[Repair] = []
        self.refused: dict[tuple[str, str | None, str | None], Refusal] = {}
        self.audit = self._judged(source)

    def _judged(self, source: Source) -> FileAudit:
        layout = self.options.layout or self.settings.layout
        document = read_source(source, layout=layout)
        return judge(document, label=self.options.label, settings=self.settings)

    def encoded(self) -> bytes:
        assert self.audit.document is not None
        source = self.audit.document.source
        data = source.text.encode(source.encoding)
        return b"\xef\xbb\xbf" + data if source.marked else data

    def take(self, wanted: list[Repair]) -> None:
        """Make repairs together, or where that goes wrong the first that goes well alone."""
        together = list(_apart(wanted))
        problem = self._made(together)
        if problem is None or len(together) == 1:
            if problem is not None:
                self._refuse(together[0], problem)
            return
        for repair in together:
            problem = self._made([repair])
            if problem is None:
                return  # the offsets of the others hold no more
            self._refuse(repair, problem)

    def _refuse(self, repair: Repair, problem: str) -> None:
        self.refused[repair.rule, repair.element, repair.shell] = Refusal(repair, problem)

    def _made(self, repairs: list[Repair]) -> str | None:
        """Make repairs; None if the text then says what it should, else why it was left alone."""
        before = self.audit
        assert before.document is not None
        source = before.document.source
        text = edited(source.text, [edit for repair in repairs for edit in repair.edits])
        marked = source.marked and all(repair.rule != "form.encoding" for repair in repairs)
        after = self._judged(Source(text, source.path, source.encoding, marked))
        problem = _difference(before, after, repairs)
        if problem is None:
            self.audit = after
            self.done += repairs
        return problem


def _apart(repairs: Iterable[Repair]) -> Iterator[Repair]:
    """Those repairs that touch no stretch of text that one before them touches."""
    taken: list[tuple[int, int]] = []
    for repair in repairs:
        spans = [edit.span for edit in repair.edits]
        if all(end <= a or b <= start for start, end in spans for a, b in taken):
            taken += spans
            yield repair


def edited(text: str, edits: Iterable[Edit]) -> str:
    """A text with edits made; they must not overlap."""
    pieces, at = [], 0
    for edit in sorted(edits, key=lambda edit: edit.span):
        pieces += [text[at : edit.span[0]], edit.replacement]
        at = edit.span[1]
    return "".join([*pieces, text[at:]])


# ---- what a mended text must say


def _difference(before: FileAudit, after: FileAudit, repairs: list[Repair]) -> str | None:
    """Why a mended text is refused, None where all is well."""
    old, new = before.document, after.document
    assert old is not None and new is not None
    if old.layout != new.layout:
        return f"it would be read as {new.layout or 'no layout'} instead of {old.layout}"
    changed = {
        (r.element, (r.shell or "").partition("/")[0]): r.rule
        for r in repairs
        if r.rule in (*NUMERIC, "primitive.order")
    }
    relabelled = any(repair.rule.startswith("label.") for repair in repairs)
    if content(old, changed, relabelled) != content(new, changed, relabelled):
        return "the mended text would not read back with the same numbers"
    worse = _errors(after) - _errors(before)
    if worse:
        return f"a new finding of {min(worse)} would come up"
    for repair in repairs:
        key = repair.rule, repair.element, repair.shell
        if _places(after)[key] >= _places(before)[key]:
            return "the finding would still be there"
    return None


def _errors(audit: FileAudit) -> Counter[str]:
    return Counter(f.rule for f in audit.findings if f.severity == "error")


def _places(audit: FileAudit) -> Counter[tuple[str, str | None, str | None]]:
    return Counter((f.rule, f.element, f.shell) for f in audit.findings)


def content(
    document: Document,
    changed: Mapping[tuple[str | None, str], str] | None = None,
    relabelled: bool = False,
) -> list[Any]:
    """Everything that a document says, number by number, without elements that come twice equally.

    changed: for shells (by element and name) the rule by which they may change: what they may
    change in is left out.  relabelled: whether labels are left out.
    """
    found = []
    for members in document.sets:
        blocks: list[Any] = []
        for block in members.blocks:
            said = _block(block, changed or {}, relabelled)
            if said not in blocks:
                blocks.append(said)
        found.append((None if relabelled else members.label, members.role, blocks))
    return [document.raw_primitives, found]


def _block(block: Block, changed: Mapping[tuple[str | None, str], str], relabelled: bool) -> Any:
    shells = [
        (shell.angular, *_numbers(shell, changed.get((block.symbol, name))))
        for name, shell in zip(block.names, block.shells, strict=True)
    ]
    potential = None
    if block.potential is not None:
        potential = (
            block.potential.electrons,
            [
                (c.l, c.local, c.kind, c.powers, c.exponents.tobytes(), c.coefficients.tobytes())
                for c in block.potential.channels
            ],
        )
    label = None if relabelled else block.label
    return block.atomic_number, label, block.functions, shells, potential


def _numbers(shell: Shell, rule: str | None) -> tuple[bytes, ...]:
    """The bits of a shell's numbers, but for those that a rule's repair may change."""
    if rule == "contraction.norm":
        return (shell.exponents.tobytes(),)
    if rule == "primitive.order":
        rows = zip(shell.exponents, shell.coefficients, strict=True)
        return tuple(sorted(e.tobytes() + c.tobytes() for e, c in rows))
    used = (
        (shell.coefficients != 0.0).any(axis=1)
        if rule == "contraction.idle"
        else np.ones(len(shell.exponents), bool)
    )
    return shell.exponents[used].tobytes(), shell.coefficients[used].tobytes()
