"""The audit: from paths to findings.  Nothing here prints."""

import os
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import NamedTuple

from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_bytes, read_source
from overlapse.grammar.source import Source
from overlapse.lint.settings import Settings, settings_for
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rules

LEVELS = ("note", "warning", "error")  # rising
# Text that may quote basis sets without being one; folders are searched without them.
_NOT_SEARCHED = frozenset(
    ".py .pyi .ipynb .md .rst .html .htm .css .js .ts .c .cc .cpp .h .hpp .f .f90 .rs .go .java "
    ".sh .toml .lark".split()
)


@dataclass(frozen=True)
class FileAudit:
    """What was found in one file.

    document: None for a file that could not be opened; problem says why.  label: the claimed label
    that weighs most, with where it was found.  passed_over: no layout was recognised and that was
    allowed.
    """

    path: str
    document: Document | None = None
    findings: tuple[Finding, ...] = ()
    label: str | None = None
    label_from: str = ""
    problem: str = ""
    passed_over: bool = False
    settings: Settings = field(default_factory=Settings)

    @property
    def fails(self) -> bool:
        """Whether a finding reaches the failing level."""
        least = LEVELS.index(self.settings.fail_at)
        return any(LEVELS.index(finding.severity) >= least for finding in self.findings)


class Target(NamedTuple):
    """A file to audit; ``searched`` if it was found in a folder and may be no basis file."""

    path: Path
    searched: bool


def audit(*paths: str | os.PathLike[str], label: str | None = None, layout: str | None = None,
          settings: Settings | None = None, energies: bool = False) -> list[Finding]:  # fmt: skip
    """Judge files and folders; return all findings, in the order of the paths and of the text.

    label: what the sets are called, over what the files say.  layout: read as this layout instead
    of finding it by content.  settings: used for all files instead of those found above them.
    energies: also compute the atoms, which takes seconds for a file of many elements.
    Raises OSError for a path that cannot be opened, ValueError for an unknown layout, SettingsError
    for settings that cannot be used.
    """
    findings: list[Finding] = []
    for target in targets(map(Path, paths)):
        result = audit_file(
            target, label=label, layout=layout, settings=settings, energies=energies
        )
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
        if not path.is_dir():
            yield Target(path, False)
            continue
        for folder, names, files in os.walk(path, onerror=stop):
            names[:] = sorted(name for name in names if not name.startswith("."))
            for name in sorted(files):
                if not name.startswith(".") and Path(name).suffix.lower() not in _NOT_SEARCHED:
                    yield Target(Path(folder, name), True)


def audit_file(
    target: Target,
    *,
    label: str | None = None,
    layout: str | None = None,
    settings: Settings | None = None,
    energies: bool = False,
) -> FileAudit:
    """Judge one file.  A file that cannot be opened comes back with its problem."""
    name = os.fspath(target.path)
    try:
        data = target.path.read_bytes()
    except OSError as problem:
        return FileAudit(name, problem=f"{name}: {problem.strerror or problem}")
    effective = settings if settings is not None else settings_for(target.path)
    document = read_bytes(data, name, layout=layout)
    if target.searched and not document.layout:
        return FileAudit(name, document, settings=effective, passed_over=True)
    return judge(document, label=label, settings=effective, energies=energies)


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
    document = read_source(Source(text, name), layout=layout)
    return judge(document, label=label, settings=effective, energies=energies)


def judge(
    document: Document, *, label: str | None = None, settings: Settings, energies: bool = False
) -> FileAudit:
    """Run all rules over a document; those about energies only where they are wanted."""
    case = Case(document, label, energies)
    findings: list[Finding] = []
    for name, rule in rules().items():
        level = settings.severity.get(name)
        if level == "off":
            continue
        found = case.judge(rule, settings.limits.get(name))
        if level is not None:
            found = [replace(finding, severity=level) for finding in found]  # type: ignore[arg-type]
        findings += found
    findings.sort(key=lambda f: (f.line, f.column, -LEVELS.index(f.severity), f.rule))
    claims = next((claims for claims in case.claims.values() if claims), [])
    return FileAudit(
        document.path,
        document,
        tuple(findings),
        claims[0].label if claims else None,
        claims[0].where if claims else "",
        settings=settings,
    )
