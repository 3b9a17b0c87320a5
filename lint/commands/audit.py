"""``overlapse audit``: judge files, folders and standard input."""

import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
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
    from overlapse.lint.engine import FileAudit, Options, Target
    from overlapse.lint.ledger import Sieve

# Below this much text an audit is over before a progress bar would be seen, before another process
# has started, and before a kept result would have been found.
_QUIET_BYTES = 1_500_000
_SERIAL_BYTES = 1_000_000
_UNKEPT_BYTES = 100_000
# Up to this much text, energies are computed unless somebody says otherwise: some ten files.
_ENERGETIC_BYTES = 1_000_000


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
@click.option(
    "--write-ledger",
    is_flag=True,
    help="Record all findings as known; from then on only new ones count.",
)
@click.option(
    "--ledger", type=click.Path(dir_okay=False, path_type=Path), help="The ledger to use."
)
@click.option("--without-ledger", is_flag=True, help="Let known findings count as well.")
@click.option("--processes", type=click.IntRange(1), help="Judge on so many processors [all].")
@click.option("--no-cache", is_flag=True, help="Judge anew, and keep no results.")
@click.option(
    "--energies/--no-energies",
    default=None,
    help="Compute the atoms, H to Kr, or not.  [up to 1 MB of files, but not recognised-only]",
)
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
    write_ledger: bool,
    ledger: Path | None,
    without_ledger: bool,
    processes: int | None,
    no_cache: bool,
    energies: bool | None,
    staged: bool,
    quiet: bool,
    verbose: bool,
) -> None:
    """Judge files, folders (searched by content) and standard input (-).

    Where energies are computed, each element takes some hundredths of a second, and one that looks
    wrong a second; so large amounts of files and hooks go without them unless they are asked for.

    Exit status: 0 nothing found at the failing level, 1 something found, 2 wrong use or settings,
    3 a file could not be read.

    \b
    Examples:
      overlapse audit sets/
      overlapse audit --report html --out page.html sets/
      overlapse audit --write-ledger sets/
      overlapse audit --staged --quiet sets/
      overlapse recast a.basis --layout stars | overlapse audit - --named a.basis
    """
    from overlapse.lint.bulk import size_of
    from overlapse.lint.engine import FileAudit, Options, Target, targets
    from overlapse.lint.ledger import Sieve
    from overlapse.lint.neighbours import Beside
    from overlapse.lint.reports import needs_documents, writer
    from overlapse.lint.terminal import coloured

    if quiet and verbose:
        raise click.UsageError("--quiet and --verbose exclude each other")
    troubles: list[FileAudit] = []

    def trouble(message: str) -> None:
        troubles.append(FileAudit(message.partition(":")[0], problem=message))

    options = Options(label, layout, energies=bool(energies))
    found: list[Target] = []
    size = 0  # bytes of all files together
    if staged:
        judged = _staged(paths, options, recognised_only)
    else:
        for path in paths:
            found += [Target(path, False)] if path == Path("-") else targets([path], trouble)
        if recognised_only:
            found = [Target(target.path, True) for target in found]
        size = sum(size_of(target.path) for target in found)
        beside = Beside([target.path for target in found if target.path != Path("-")])
        if energies is None:
            energies = not recognised_only and size <= _ENERGETIC_BYTES
        options = replace(options, beside=beside, energies=energies)
        documents = needs_documents(report)
        silent = quiet or verbose
        judged = _audits(found, size, options, named, processes, no_cache, documents, silent)
    sieve = None if without_ledger or write_ledger else Sieve(ledger)
    tally = _Tally()

    def stream() -> Iterator[FileAudit]:
        yield from _probed(_told(judged) if verbose else judged)
        yield from troubles
        if sieve is not None:
            yield from sieve.absent(path for path in paths if path.is_dir())

    if write_ledger:
        _record(stream(), ledger, tally)
    else:
        shown: Iterable[FileAudit] = _sifted(stream(), sieve, fail_at, least, quiet, tally)
        if quiet and out is None:
            shown = list(shown)  # only what fails, and whether anything does must be known first
        if not (quiet and out is None and tally.status == CLEAN):
            with output(out, size > _SERIAL_BYTES) as written:
                writer(report)(shown, written, out is None and coloured(written))
    _tell_of_plugins()
    sys.exit(tally.status)


def _probed(audits: "Iterable[FileAudit]") -> "Iterator[FileAudit]":
    """The audits with what the probes of their settings add, then those of the geometries."""
    probing = None
    for item in audits:
        if item.settings.probes and probing is None:
            from overlapse.lint.probetables import Probing  # it needs far more than a plain audit

            probing = Probing()
        yield probing.joined(item) if probing is not None else item
    if probing is not None:
        yield from probing.of_geometries()


class _Tally:
    """The exit status that the audits seen so far give."""

    def __init__(self) -> None:
        self.status = CLEAN

    def add(self, item: "FileAudit") -> None:
        if item.problem:
            self.status = UNREADABLE
        elif item.fails and self.status == CLEAN:
            self.status = FOUND


def _sifted(
    audits: "Iterable[FileAudit]",
    sieve: "Sieve | None",
    fail_at: str | None,
    least: str,
    quiet: bool,
    tally: _Tally,
) -> "Iterator[FileAudit]":
    """The audits as they are shown: without what is known, or below the least level."""
    from overlapse.lint.engine import LEVELS

    for item in audits:
        if sieve is not None:
            item = sieve.sifted(item)
        if fail_at is not None:
            item = item.failing_at(fail_at)
        tally.add(item)
        if quiet and not item.fails and not item.problem:
            continue
        lowest = max(least, item.settings.fail_at, key=LEVELS.index) if quiet else least
        yield item if lowest == LEVELS[0] else item.at_least(lowest)


def _told(audits: "Iterable[FileAudit]") -> "Iterator[FileAudit]":
    """The audits as they come; of each is told on standard error how it was taken."""
    from overlapse.lint.telling import told

    start = perf_counter()
    for item in audits:
        click.echo(told(item, perf_counter() - start), err=True)
        yield item
        start = perf_counter()


def _staged(
    paths: Sequence[Path], options: "Options", recognised_only: bool
) -> "Iterator[FileAudit]":
    """Audits of what the next commit will hold."""
    from overlapse.lint.engine import audit_bytes
    from overlapse.lint.staged import StagedError, staged

    if Path("-") in paths:
        raise click.UsageError("standard input (-) is not staged")
    try:
        for target, data in staged(paths):
            searched = target.searched or recognised_only
            yield audit_bytes(data, str(target.path), options, searched=searched)
    except StagedError as problem:
        raise click.UsageError(str(problem)) from problem


def _record(audits: "Iterable[FileAudit]", ledger: Path | None, tally: _Tally) -> None:
    """Write ledgers of all findings and say so."""
    from overlapse.lint.ledger import write

    def seen() -> "Iterator[FileAudit]":
        for item in audits:
            # Known findings do not fail; files that could not be read still do.
            tally.add(replace(item, findings=()))
            if item.problem:
                click.echo(f"error: {item.problem}", err=True)
            yield item

    try:
        ledgers = write(seen(), ledger)
    except OSError as problem:
        raise click.UsageError(f"{problem.filename}: {problem.strerror or problem}") from problem
    for each in ledgers:
        files = len(each.files)
        click.echo(
            f"{each.path} holds {each.count} finding{'s' * (each.count != 1)} of "
            f"{files} file{'s' * (files != 1)}; from now on only new ones count"
        )


def _audits(
    found: "list[Target]",
    size: int,
    options: "Options",
    named: str,
    processes: int | None,
    no_cache: bool,
    documents: bool,
    silent: bool,
) -> "Iterator[FileAudit]":
    from overlapse.lint import bulk

    # With energies every byte takes much longer.
    work = size * 20 if options.energies else size
    if processes is None:
        processes = bulk.cores() if work > _SERIAL_BYTES else 1
    cache = None
    if not no_cache and work > _UNKEPT_BYTES:
        from overlapse.lint.cache import Cache

        cache = Cache()
    read = sys.stdin.buffer.read
    with _progress(size, len(found), silent or work < _QUIET_BYTES) as done:
        yield from bulk.audits(
            found,
            options,
            processes=min(processes, len(found)) or 1,
            cache=cache,
            documents=documents,
            done=done,
            standard_input=lambda: (named, read()),
        )


@contextmanager
def _progress(size: int, files: int, silent: bool) -> "Iterator[Callable[[int], None]]":
    """A bar with rate and remaining time, where more than a moment's work is ahead."""
    if silent or not sys.stderr.isatty():
        yield lambda size: None
        return
    from time import monotonic

    started, count = monotonic(), 0

    def rate(item: object) -> str:
        return f"{count}/{files} files, {count / max(monotonic() - started, 1e-3):.3g} a second"

    with click.progressbar(
        length=size, label="auditing", file=sys.stderr, item_show_func=rate
    ) as bar:

        def done(size: int) -> None:
            nonlocal count
            count += 1
            bar.update(size, current_item=size)

        yield done


def _tell_of_plugins() -> None:
    from overlapse.grammar import plugins

    for message in plugins.troubles:
        click.echo(f"warning: {message}", err=True)
