"""``overlapse audit``: judge files, folders and standard input."""

import sys
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from time import perf_counter
from typing import TYPE_CHECKING

import click

from overlapse.lint.common import (
    CLEAN,
    FOUND,
    SEVERITIES,
    UNREADABLE,
    a_layout,
    a_report,
    like_a_layout,
    like_a_report,
    output,
)

if TYPE_CHECKING:
    from overlapse.lint.engine import FileAudit, Target

# Below this much text an audit is over before a progress bar would be seen.
_QUIET_BYTES = 1_500_000


@click.command()
@click.argument("paths", nargs=-1, required=True, type=click.Path(allow_dash=True, path_type=Path))
@click.option(
    "--report",
    callback=a_report,
    shell_complete=like_a_report,
    default="text",
    help="text, lines, json, sarif or html (extra: report).",
)
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
@click.option(
    "--layout",
    callback=a_layout,
    shell_complete=like_a_layout,
    help="Read all files as this layout.",
)
@click.option("--label", help="What the sets are called, over what the files say.")
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
@click.option("--fail-at", type=SEVERITIES, help="Level from which the audit fails [warning].")
@click.option("--least", type=SEVERITIES, default="note", help="Least level to show [note].")
@click.option("--recognised-only", is_flag=True, help="Pass over files that show no layout.")
@click.option("--staged", is_flag=True, help="Judge what is staged in git, not the working files.")
@click.option("-q", "--quiet", is_flag=True, help="Say only what makes the audit fail.")
@click.option("-v", "--verbose", is_flag=True, help="Tell of each file how it was taken.")
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
    staged: bool,
    quiet: bool,
    verbose: bool,
) -> None:
    """Judge files, folders (searched by content) and standard input (-).

    Exit status: 0 nothing found at the failing level, 1 something found, 2 wrong use or settings,
    3 a file could not be read.

    \b
    Examples:
      overlapse audit sets/
      overlapse audit --report html --out page.html sets/
      overlapse audit --staged --quiet sets/
      overlapse recast a.basis --layout stars | overlapse audit - --named a.basis
    """
    from overlapse.lint.engine import FileAudit, Target, audit_file, targets
    from overlapse.lint.reports import writer
    from overlapse.lint.terminal import coloured

    if quiet and verbose:
        raise click.UsageError("--quiet and --verbose exclude each other")
    troubles: list[FileAudit] = []

    def trouble(message: str) -> None:
        troubles.append(FileAudit(message.partition(":")[0], problem=message))

    audits: list[FileAudit] = []
    if staged:
        audits += _told(_staged(paths, label, layout, recognised_only), verbose)
    else:
        found: list[Target] = []
        for path in paths:
            found += [Target(path, False)] if path == Path("-") else targets([path], trouble)
        if recognised_only:
            found = [Target(target.path, True) for target in found]
        with _progress(found, quiet or verbose) as steps:
            judged = (
                _standard_input(named, label, layout)
                if target.path == Path("-")
                else audit_file(target, label=label, layout=layout)
                for target in steps
            )
            audits += _told(judged, verbose)
    audits += troubles
    if fail_at is not None:
        audits = [_failing_at(item, fail_at) for item in audits]
    status = UNREADABLE if any(item.problem for item in audits) else CLEAN
    if status == CLEAN and any(item.fails for item in audits):
        status = FOUND
    if quiet:
        audits = [_at_least(item, item.settings.fail_at) for item in audits]
    shown = [_at_least(item, least) for item in audits]
    if not quiet or status != CLEAN or out is not None:
        with output(out) as stream:
            writer(report)(shown, stream, out is None and coloured(stream))
    sys.exit(status)


def _failing_at(item: "FileAudit", level: str) -> "FileAudit":
    from dataclasses import replace

    return replace(item, settings=replace(item.settings, fail_at=level))


def _at_least(item: "FileAudit", least: str) -> "FileAudit":
    from dataclasses import replace

    from overlapse.lint.engine import LEVELS

    levels = LEVELS[LEVELS.index(least) :]
    return replace(item, findings=tuple(f for f in item.findings if f.severity in levels))


def _told(audits: "Iterable[FileAudit]", verbose: bool) -> "Iterator[FileAudit]":
    """The audits as they come; of each is told on standard error how it was taken."""
    from overlapse.lint.telling import told

    start = perf_counter()
    for item in audits:
        if verbose:
            click.echo(told(item, perf_counter() - start), err=True)
        yield item
        start = perf_counter()


def _staged(
    paths: Sequence[Path], label: str | None, layout: str | None, recognised_only: bool
) -> "Iterator[FileAudit]":
    """Audits of what the next commit will hold."""
    from overlapse.lint.engine import audit_bytes
    from overlapse.lint.staged import StagedError, staged

    if Path("-") in paths:
        raise click.UsageError("standard input (-) is not staged")
    try:
        for target, data in staged(paths):
            searched = target.searched or recognised_only
            yield audit_bytes(data, str(target.path), label, layout, searched=searched)
    except StagedError as problem:
        raise click.UsageError(str(problem)) from problem


def _standard_input(named: str, label: str | None, layout: str | None) -> "FileAudit":
    from overlapse.lint.engine import audit_bytes

    return audit_bytes(sys.stdin.buffer.read(), named, label, layout)


@contextmanager
def _progress(found: "Sequence[Target]", silent: bool) -> "Iterator[Iterator[Target]]":
    """A bar on the terminal where more than a moment's work is ahead."""
    sizes = [t.path.stat().st_size if t.path.is_file() else 0 for t in found]
    if silent or sum(sizes) < _QUIET_BYTES or not sys.stderr.isatty():
        yield iter(found)
        return

    def steps() -> "Iterator[Target]":
        for target, size in zip(found, sizes, strict=True):
            yield target
            bar.update(size)

    with click.progressbar(length=sum(sizes), label="auditing", file=sys.stderr) as bar:
        yield steps()
