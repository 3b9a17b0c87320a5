"""``overlapse audit``: judge files, folders and standard input."""

import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

import click

from overlapse.lint.common import CLEAN, FOUND, SEVERITIES, UNREADABLE, a_layout, a_report, output

if TYPE_CHECKING:
    from overlapse.lint.engine import FileAudit, Target

# Below this much text an audit is over before a progress bar would be seen.
_QUIET_BYTES = 1_500_000
# Up to this much text, energies are computed unless somebody says otherwise: some ten files.
_ENERGETIC_BYTES = 1_000_000


@click.command()
@click.argument("paths", nargs=-1, required=True, type=click.Path(allow_dash=True, path_type=Path))
@click.option("--report", callback=a_report, default="text", help="text, lines, json or sarif.")
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
@click.option("--layout", callback=a_layout, help="Read all files as this layout.")
@click.option("--label", help="What the sets are called, over what the files say.")
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
@click.option("--fail-at", type=SEVERITIES, help="Level from which the audit fails [warning].")
@click.option("--least", type=SEVERITIES, default="note", help="Least level to show [note].")
@click.option("--recognised-only", is_flag=True, help="Pass over files that show no layout.")
@click.option(
    "--energies/--no-energies",
    default=None,
    help="Compute the atoms, H to Kr, or not.  [up to 1 MB of files, but not recognised-only]",
)
def audit(
    paths: tuple[Path, ...],
    report: str,
    out: Path | None,
    layout: str | None,
    label: str | None,
    named: str,
    fail_at: str | None,
    least: str,
    recognised_only: bool,
    energies: bool | None,
) -> None:
    """Judge files, folders (searched by content) and standard input (-).

    Where energies are computed, each element takes some hundredths of a second, and one that looks
    wrong a second; so large amounts of files and hooks go without them unless they are asked for.

    Exit status: 0 nothing found at the failing level, 1 something found, 2 wrong use or settings,
    3 a file could not be read.
    """
    from overlapse.lint.engine import LEVELS, FileAudit, Target, audit_file, targets
    from overlapse.lint.reports import writer

    troubles: list[FileAudit] = []

    def trouble(message: str) -> None:
        troubles.append(FileAudit(message.partition(":")[0], problem=message))

    found: list[Target] = []
    for path in paths:
        found += [Target(path, False)] if path == Path("-") else targets([path], trouble)
    if recognised_only:
        found = [Target(target.path, True) for target in found]
    if energies is None:
        energies = not recognised_only and sum(_sizes(found)) <= _ENERGETIC_BYTES
    audits: list[FileAudit] = []
    with _progress(found, _QUIET_BYTES // 20 if energies else _QUIET_BYTES) as steps:
        for target in steps:
            if target.path == Path("-"):
                audits.append(_standard_input(named, label, layout, energies))
            else:
                audits.append(audit_file(target, label=label, layout=layout, energies=energies))
    audits += troubles
    if fail_at is not None:
        audits = [_failing_at(item, fail_at) for item in audits]
    status = UNREADABLE if any(item.problem for item in audits) else CLEAN
    if status == CLEAN and any(item.fails for item in audits):
        status = FOUND
    shown = [_at_least(item, LEVELS[LEVELS.index(least) :]) for item in audits]
    with output(out) as stream:
        writer(report)(shown, stream, out is None and stream.isatty())
    sys.exit(status)


def _failing_at(item: "FileAudit", level: str) -> "FileAudit":
    from dataclasses import replace

    return replace(item, settings=replace(item.settings, fail_at=level))


def _at_least(item: "FileAudit", levels: Sequence[str]) -> "FileAudit":
    from dataclasses import replace

    return replace(item, findings=tuple(f for f in item.findings if f.severity in levels))


def _standard_input(
    named: str, label: str | None, layout: str | None, energies: bool
) -> "FileAudit":
    from overlapse.grammar.reading import read_bytes
    from overlapse.lint.engine import judge
    from overlapse.lint.settings import settings_for

    document = read_bytes(sys.stdin.buffer.read(), named, layout=layout)
    settings = settings_for(Path(named).absolute())
    return judge(document, label=label, settings=settings, energies=energies)


def _sizes(found: "Sequence[Target]") -> list[int]:
    return [t.path.stat().st_size if t.path.is_file() else 0 for t in found]


@contextmanager
def _progress(found: "Sequence[Target]", quiet: int) -> "Iterator[Iterator[Target]]":
    """A bar on the terminal where more than a moment's work is ahead."""
    sizes = _sizes(found)
    if sum(sizes) < quiet or not sys.stderr.isatty():
        yield iter(found)
        return

    def steps() -> "Iterator[Target]":
        for target, size in zip(found, sizes, strict=True):
            yield target
            bar.update(size)

    with click.progressbar(length=sum(sizes), label="auditing", file=sys.stderr) as bar:
        yield steps()
