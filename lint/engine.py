"""The audit: from paths to findings.  Nothing here prints."""

import os
from collections.abc import Callable, Container, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any, NamedTuple

from overlapse.grammar import plugins
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_bytes, read_source
from overlapse.grammar.source import Source
from overlapse.lint import tree
from overlapse.lint.fingerprint import marked
from overlapse.lint.neighbours import Beside, furnish
from overlapse.lint.settings import Settings, settings_for
from overlapse.rules.acceptance import acceptances_of, can_find
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.measured.probe import Probe
from overlapse.rules.registry import Rule, rules

LEVELS = ("note", "warning", "error")  # rising
EXCERPT = 160  # characters of a line that are kept for a report
# Text that may quote basis sets without being one; folders are searched without them.
_NOT_SEARCHED = frozenset(
    ".py .pyi .ipynb .md .rst .html .htm .css .js .ts .c .cc .cpp .h .hpp .f .f90 .rs .go .java "
    ".sh .toml .lark".split()
)


class Excerpt(NamedTuple):
    """A stretch of a line of text; ``start`` is the 0-based place of its first character."""

    text: str
    start: int


@dataclass(frozen=True)
class Options:
    """What the caller asks for, over what files and settings say.

    label: what the sets are called.  layout: read as this layout instead of finding it by content.
    settings: used for all files instead of those found above them.  beside: the files of the audit,
    in whose light each is judged.  energies: whether the atoms are computed.
    """

    label: str | None = None
    layout: str | None = None
    settings: Settings | None = None
    beside: Beside | None = field(default=None, repr=False)
    energies: bool = False


class Accepted(NamedTuple):
    """A finding that was looked at and accepted: why, and where that is said."""

    finding: Finding
    reason: str
    where: str


@dataclass(frozen=True)
class FileAudit:
    """What was found in one file.

    document: None for a file that could not be opened (problem says why), and where it was judged
    in another process or at another time; layout, elements, blocks and excerpts are there all the
    same.  label: the claimed label that weighs most, with where it was found.  passed_over: no
    layout was recognised and that was allowed.  layout: "" for none.  elements, blocks: counts.
    excerpts: what stands around each place that a finding points at, by line and column.
    accepted: findings that do not count, because the file or the settings say why.  known:
    findings that do not count, because a ledger holds them; gone: its entries that were found no
    more.  absent: the file is only in the ledger.  probes: what was measured of it in geometries.
    silent: rules that could find nothing, because they are off or lack what they need.  is_basis:
    False for a settings file.
    """

    path: str
    document: Document | None = None
    findings: tuple[Finding, ...] = ()
    label: str | None = None
    label_from: str = ""
    problem: str = ""
    passed_over: bool = False
    settings: Settings = field(default_factory=Settings)
    layout: str = ""
    elements: int = 0
    blocks: int = 0
    excerpts: Mapping[tuple[int, int], Excerpt] = field(default_factory=dict)
    accepted: tuple[Accepted, ...] = ()
    known: tuple[Finding, ...] = ()
    gone: tuple[Mapping[str, Any], ...] = ()
    absent: bool = False
    probes: tuple[Probe, ...] = ()
    silent: frozenset[str] = frozenset()
    is_basis: bool = True

    @property
    def fails(self) -> bool:
        """Whether a finding reaches the failing level."""
        least = LEVELS.index(self.settings.fail_at)
        return any(LEVELS.index(finding.severity) >= least for finding in self.findings)

    def failing_at(self, level: str) -> "FileAudit":
        """The same, failing from this level on."""
        return replace(self, settings=replace(self.settings, fail_at=level))

    def at_least(self, level: str) -> "FileAudit":
        """The same with only the findings of this level and above."""
        return replace(self, findings=at_least(self.findings, level))


def at_least(findings: Iterable[Finding], level: str) -> tuple[Finding, ...]:
    """The findings of this level and above."""
    least = LEVELS.index(level)
    return tuple(finding for finding in findings if LEVELS.index(finding.severity) >= least)


class Target(NamedTuple):
    """A file to audit; ``searched`` if it was found in a folder and may be no basis file."""

    path: Path
    searched: bool


def audit(*paths: str | os.PathLike[str], label: str | None = None, layout: str | None = None,
          settings: Settings | None = None, energies: bool = False) -> list[Finding]:  # fmt: skip
    """Judge files and folders; return all findings, in the order of the paths and of the text.

    What probes of the settings find in geometries is among them; last come acceptances of settings
    files that were of no use.

    label: what the sets are called, over what the files say.  layout: read as this layout instead
    of finding it by content.  settings: used for all files instead of those found above them.
    energies: also compute the atoms, which takes seconds for a file of many elements.
    Raises OSError for a path or a geometry that cannot be opened, ValueError for an unknown layout,
    SettingsError for settings that cannot be used.
    """
    from overlapse.lint.underway import probed
    from overlapse.lint.unused import with_unused

    findings: list[Finding] = []
    found = list(targets(map(Path, paths)))
    options = Options(label, layout, settings, Beside([t.path for t in found]), energies)
    folders = [path for path in map(Path, paths) if path.is_dir()]
    judged = probed(audited(target, options) for target in found)
    for result in with_unused(judged, folders):
        if result.problem:
            raise OSError(result.problem)
        findings += result.findings
    return findings


def targets(
    paths: Iterable[Path], trouble: Callable[[str], None] | None = None
) -> Iterator[Target]:
    """Files to audit: those named, and those in named folders, sorted by name.

    ``trouble`` is told of folders that cannot be listed; without it they raise OSError.
    """

    def stop(problem: OSError) -> None:
        if trouble is None:
            raise problem
        trouble(f"{problem.filename}: {problem.strerror}")

    for path in paths:
        if not tree.is_folder(path):
            yield Target(path, False)
            continue
        if (stage := tree.stage()) is not None:
            yield from (
                Target(path / file, True) for file in stage.below(path) if is_searched(file)
            )
            continue
        for folder, names, files in os.walk(path, onerror=stop):
            names[:] = sorted(name for name in names if not name.startswith("."))
            for name in sorted(files):
                if is_searched(Path(name)) and not tree.is_special(os.path.join(folder, name)):
                    yield Target(Path(folder, name), True)


def is_searched(inside: Path) -> bool:
    """Whether a search of a folder looks at a file; ``inside`` is its path from that folder."""
    hidden = any(part.startswith(".") for part in inside.parts)
    is_ours = inside.name.startswith("overlapse.") and inside.suffix in (".toml", ".json")
    return not (hidden or is_ours) and inside.suffix.lower() not in _NOT_SEARCHED


def audit_file(
    target: Target,
    *,
    label: str | None = None,
    layout: str | None = None,
    settings: Settings | None = None,
    energies: bool = False,
) -> FileAudit:
    """Judge one file.  A file that cannot be opened comes back with its problem."""
    return audited(target, Options(label, layout, settings, energies=energies))


def audited(target: Target, options: Options) -> FileAudit:
    """As `audit_file`, with everything that may be asked for."""
    name = os.fspath(target.path)
    try:
        data = target.path.read_bytes()
    except OSError as problem:
        return unopened(name, problem)
    return audit_bytes(data, name, options, searched=target.searched)


def unopened(name: str, problem: OSError) -> FileAudit:
    """The audit of a file that could not be opened."""
    return FileAudit(name, problem=f"{name}: {problem.strerror or problem}")


def audit_bytes(data: bytes, name: str, options: Options, *, searched: bool = False) -> FileAudit:
    """Judge the bytes of a file; ``searched``: pass over a text that shows no layout."""
    effective = options.settings
    if effective is None:
        effective = settings_for(Path(name).absolute())
    document = read_bytes(data, name, layout=options.layout or effective.layout)
    if searched and not document.layout:
        return FileAudit(name, document, settings=effective, passed_over=True)
    return judge(
        document,
        label=options.label,
        settings=effective,
        beside=options.beside,
        energies=options.energies,
    )


def audit_text(
    text: str,
    name: str,
    *,
    label: str | None = None,
    layout: str | None = None,
    settings: Settings | None = None,
    energies: bool = False,
) -> FileAudit:
    """Judge a text at hand under a declared file name."""
    effective = settings if settings is not None else settings_for(Path(name).absolute())
    document = read_source(Source(text, name), layout=layout or effective.layout)
    return judge(document, label=label, settings=effective, energies=energies)


def judge(
    document: Document,
    *,
    label: str | None = None,
    settings: Settings,
    beside: Beside | None = None,
    energies: bool = False,
    probes: Sequence[Probe] = (),
    only: Container[str] | None = None,
) -> FileAudit:
    """Run all rules over a document, in the light of what lies ``beside`` its file; sort out what
    is accepted.  energies: whether rules may compute the atoms.  probes: what was measured of it in
    geometries.  only: names of the rules to run, all if None.
    """
    claimed = label if label is not None else settings.label
    case = Case(document, claimed, probes=probes, energies=energies)
    wanted = [rule for name, rule in rules().items() if only is None or name in only]
    if any(rule.needs == "company" for rule in wanted):
        furnish(case, settings, beside)
    for rule in sorted(wanted, key=lambda rule: rule.last):
        if not settings.is_off(rule.name):
            case.found[rule.name] = list(_judged(case, rule, settings))
    cleared = {id(finding) for finding in case.cleared}
    findings = [
        finding for found in case.found.values() for finding in found if id(finding) not in cleared
    ]
    findings.sort(key=lambda f: (f.line, f.column, -LEVELS.index(f.severity), f.rule))
    findings = list(marked(findings, document.source))
    accepted = tuple(_accepted(case, findings, settings))
    taken = {id(item.finding) for item in accepted}
    claims = next((claims for claims in case.claims.values() if claims), [])
    return FileAudit(
        document.path,
        document,
        tuple(finding for finding in findings if id(finding) not in taken),
        claims[0].label if claims else None,
        claims[0].where if claims else "",
        settings=settings,
        layout=document.layout,
        elements=len({block.atomic_number for block in document.blocks}),
        blocks=len(document.blocks),
        excerpts=excerpts(findings, document.source),
        accepted=accepted,
        probes=case.probes,
        silent=frozenset(n for n in rules() if n not in case.found or not can_find(case, n)),
    )


def _judged(case: Case, rule: Rule, settings: Settings) -> Iterator[Finding]:
    """Findings of one rule, at the levels and with the limits that hold for their elements."""
    variants = settings.variants_of(rule.name)
    for limits in variants:
        for finding in _found(case, rule, limits):
            if len(variants) > 1 and settings.limits_of(rule.name, finding.element) != limits:
                continue
            level = settings.level_of(rule.name, finding.element)
            if level is None:
                yield finding
            elif level != "off":
                yield replace(finding, severity=level)  # type: ignore[arg-type]


def _found(case: Case, rule: Rule, limits: dict[str, float]) -> list[Finding]:
    """What one rule finds; a rule of another package that fails is told of and finds nothing."""
    try:
        return case.judge(rule, limits)
    except Exception as problem:
        if not rule.is_foreign:
            raise
        plugins.note(f"rule {rule.name!r} fails: {type(problem).__name__}: {problem}")
        return []


def _accepted(case: Case, findings: list[Finding], settings: Settings) -> Iterator[Accepted]:
    """The findings that the file or the settings accept, each with the reason given."""
    acceptances = [*acceptances_of(case)[0], *settings.acceptances]
    for finding in findings if acceptances else ():
        covering = next((each for each in acceptances if each.covers(finding)), None)
        if covering is not None:
            yield Accepted(finding, covering.reason, covering.where)


def excerpts(findings: Iterable[Finding], source: Source) -> dict[tuple[int, int], Excerpt]:
    """Lines that findings point at; of a long line what stands around the place."""
    found: dict[tuple[int, int], Excerpt] = {}
    for finding in findings:
        if source.text:
            line = source.lines[finding.line - 1]
            start = max(0, finding.column - 1 - EXCERPT // 2) if len(line) > EXCERPT else 0
            place = finding.line, finding.column
            found[place] = Excerpt(line[start : start + EXCERPT], start)
    return found
