"""What ``overlapse audit`` judges: files and standard input, or what is staged, as they come."""

import sys
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from time import perf_counter

import click

from overlapse.lint.engine import FileAudit, Options, Target

# Below this much text an audit is over before a progress bar would be seen, before another process
# has started, and before a kept result would have been found.
_QUIET_BYTES = 1_500_000
SERIAL_BYTES = 1_000_000
_UNKEPT_BYTES = 100_000


def of_files(
    found: list[Target],
    size: int,
    options: Options,
    named: str,
    processes: int | None,
    no_cache: bool,
    documents: bool,
    silent: bool,
) -> Iterator[FileAudit]:
    """Audits of files and of standard input (-), which is reported as ``named``.

    size: bytes of all files together.  documents, processes: see `overlapse.lint.bulk.audits`.
    silent: draw no bar.
    """
    from overlapse.lint import bulk
    from overlapse.lint.progress import progress

    # With energies every byte takes much longer.
    work = size * 20 if options.energies else size
    if processes is None:
        processes = bulk.cores() if work > SERIAL_BYTES else 1
    cache = None
    if not no_cache and work > _UNKEPT_BYTES:
        from overlapse.lint.cache import Cache

        cache = Cache()
    read = sys.stdin.buffer.read
    with progress(size, len(found), silent or work < _QUIET_BYTES) as done:
        yield from bulk.audits(
            found,
            options,
            processes=min(processes, len(found)) or 1,
            cache=cache,
            documents=documents,
            done=done,
            standard_input=lambda: (named, read()),
        )


def of_staged(
    paths: Sequence[Path], options: Options, recognised_only: bool
) -> Iterator[FileAudit]:
    """Audits of what the next commit will hold."""
    from overlapse.lint.engine import audit_bytes
    from overlapse.lint.staged import staged

    for target, data in staged(paths):
        searched = target.searched or recognised_only
        yield audit_bytes(data, str(target.path), options, searched=searched)


@contextmanager
def in_tree(staged: bool, paths: Sequence[Path]) -> Iterator[None]:
    """Let everything be looked for in the index of git, if that is wanted."""
    if not staged:
        yield
        return
    from overlapse.lint import tree
    from overlapse.lint.settings import SettingsError
    from overlapse.lint.staged import Index, StagedError

    if Path("-") in paths:
        raise click.UsageError("standard input (-) is not staged")
    try:
        with tree.staged(Index()):
            yield
    except StagedError as problem:
        raise click.UsageError(str(problem)) from problem
    except SettingsError as problem:
        raise SettingsError(f"{problem} (as it is staged)") from problem


def probed(audits: Iterable[FileAudit]) -> Iterator[FileAudit]:
    """The audits with what the probes of their settings add, then those of the geometries."""
    probing = None
    for item in audits:
        if item.settings.probes and probing is None:
            from overlapse.lint.probetables import Probing  # it needs far more than a plain audit

            probing = Probing()
        yield probing.joined(item) if probing is not None else item
    if probing is not None:
        yield from probing.of_geometries()


def told_of(audits: Iterable[FileAudit]) -> Iterator[FileAudit]:
    """The audits as they come; of each is told on standard error how it was taken."""
    from overlapse.lint.telling import told

    start = perf_counter()
    for item in audits:
        click.echo(told(item, perf_counter() - start), err=True)
        yield item
        start = perf_counter()
