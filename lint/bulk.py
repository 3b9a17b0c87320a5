"""Many files: kept results first, the rest on all cores, one audit after the other.

Memory stays bounded: audits come in the order of the targets, few are under way at a time, and
none holds its document unless that is asked for.
"""

import os
import signal
import sys
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

from overlapse.grammar import plugins
from overlapse.grammar.reading import read_bytes
from overlapse.lint.engine import FileAudit, Options, Target, audit_bytes, unopened
from overlapse.lint.settings import Settings, settings_for
from overlapse.lint.stopping import heed

# What keeps results and starts processes is imported where it is used: a single file needs neither.
if TYPE_CHECKING:
    from overlapse.lint.cache import Cache

BATCH_BYTES = 250_000  # of text that a process judges between two words with its parent
BATCH_FILES = 32
AHEAD = 3  # batches per process that are under way


class Job(NamedTuple):
    """A file to be judged; ``size`` in bytes."""

    target: Target
    size: int


class Outcome(NamedTuple):
    """What became of a file: its audit, and the key to keep it under ("" for none)."""

    audit: FileAudit
    key: str


def cores() -> int:
    """Number of processors that this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def audits(
    targets: Iterable[Target],
    options: Options,
    *,
    processes: int = 1,
    cache: "Cache | None" = None,
    documents: bool = False,
    done: Callable[[int], None] = lambda size: None,
    standard_input: Callable[[], tuple[str, bytes]] | None = None,
) -> Iterator[FileAudit]:
    """Judge files; yield their audits in the order of the targets.

    processes: how many judge at a time; with one, everything happens in this process.  cache:
    where results are looked up and kept.  documents: whether each audit is to hold its document
    (which is read again where it was judged elsewhere).  done: told of the size of each file that
    is finished, in bytes.  standard_input: gives the name and the bytes of the target "-".
    """
    if cache is not None:
        from overlapse.lint.cache import begin

        begin()
    jobs = (Job(target, size_of(target.path)) for target in targets)
    judge = _Judge(options, cache is not None)
    pool = _Pool(processes, judge) if processes > 1 else None
    try:
        for job, outcome in _in_order(jobs, judge, pool, cache, standard_input):
            heed()
            done(job.size)
            yield _with_document(outcome, options) if documents else outcome
    except BaseException:
        if pool is not None:
            pool.stop()
        raise
    if pool is not None:
        pool.close()


def size_of(path: Path) -> int:
    """Size of a file in bytes, 0 where it cannot be told."""
    try:
        return path.stat().st_size
    except OSError:
        return 0


def _with_document(audit: FileAudit, options: Options) -> FileAudit:
    if audit.document is not None or audit.problem:
        return audit
    try:
        data = Path(audit.path).read_bytes()
    except OSError as problem:
        return unopened(audit.path, problem)
    layout = options.layout or audit.settings.layout
    return replace(audit, document=read_bytes(data, audit.path, layout=layout))


class _Answer(NamedTuple):
    outcomes: list[Outcome]
    troubles: list[str]


class _Batch(NamedTuple):
    """Files under way; for each its audit if that was kept, else None; what gives the others."""

    jobs: list[Job]
    kept: list[FileAudit | None]
    answer: Callable[[], _Answer]


def _in_order(
    jobs: Iterator[Job],
    judge: "_Judge",
    pool: "_Pool | None",
    cache: "Cache | None",
    standard_input: Callable[[], tuple[str, bytes]] | None,
) -> Iterator[tuple[Job, FileAudit]]:
    under_way: deque[_Batch] = deque()
    most = pool.processes * AHEAD if pool is not None else 1
    for batch in _batches(jobs, 1 if pool is None else BATCH_FILES):
        kept = [
            _sent(job, judge.options, standard_input) or _kept(job, judge, cache) for job in batch
        ]
        left = [job.target for job, audit in zip(batch, kept, strict=True) if audit is None]
        if pool is not None and left:
            answer = pool.submit(left)
        else:
            answer = partial(_Answer, list(map(judge.outcome, left)), [])
        under_way.append(_Batch(batch, kept, answer))
        while len(under_way) >= most or (under_way and under_way[0].kept.count(None) == 0):
            yield from _finished(under_way.popleft(), cache)
    while under_way:
        yield from _finished(under_way.popleft(), cache)


def _batches(jobs: Iterator[Job], most: int) -> Iterator[list[Job]]:
    batch: list[Job] = []
    for job in jobs:
        batch.append(job)
        if len(batch) >= most or sum(job.size for job in batch) >= BATCH_BYTES:
            yield batch
            batch = []
    if batch:
        yield batch


def _sent(
    job: Job, options: Options, standard_input: Callable[[], tuple[str, bytes]] | None
) -> FileAudit | None:
    """The audit of standard input, which no other process could read; None for other targets."""
    if standard_input is None or job.target.path != Path("-"):
        return None
    name, data = standard_input()
    return audit_bytes(data, name, options, searched=job.target.searched)


def _kept(job: Job, judge: "_Judge", cache: "Cache | None") -> FileAudit | None:
    """The result that was kept for a file, or None."""
    if cache is None or not job.size:  # what has no size may be a pipe, which is read but once
        return None
    path = os.fspath(job.target.path)
    try:
        data = job.target.path.read_bytes()
    except OSError:
        return None  # the judging tells of it
    settings = judge.settings_of(path)
    return cache.get(judge.key(data, job.target, settings), path, settings)


def _finished(batch: _Batch, cache: "Cache | None") -> Iterator[tuple[Job, FileAudit]]:
    answer = batch.answer()
    for trouble in answer.troubles:
        plugins.note(trouble)
    if cache is not None:
        cache.put((outcome.key, outcome.audit) for outcome in answer.outcomes if outcome.key)
    fresh = iter(answer.outcomes)
    for job, audit in zip(batch.jobs, batch.kept, strict=True):
        yield job, next(fresh).audit if audit is None else audit


# ---- in the processes


@dataclass(frozen=True)
class _Judge:
    """Judges files the way the caller asks; ``with_keys``: results are to be kept."""

    options: Options
    with_keys: bool

    def outcome(self, target: Target) -> Outcome:
        path = os.fspath(target.path)
        try:
            data = target.path.read_bytes()
        except OSError as problem:
            return Outcome(unopened(path, problem), "")
        settings = self.settings_of(path)
        asked = replace(self.options, settings=settings)
        audit = audit_bytes(data, path, asked, searched=target.searched)
        # The key is of the bytes that were judged: the file may have changed since it was looked
        # up.
        return Outcome(audit, self.key(data, target, settings) if self.with_keys else "")

    def settings_of(self, path: str) -> Settings:
        return self.options.settings or settings_for(path)

    def key(self, data: bytes, target: Target, settings: Settings) -> str:
        from overlapse.lint.cache import key_of

        return key_of(data, os.fspath(target.path), self.options, settings, target.searched)


_judge: _Judge | None = None  # of this process, if it is one of the others


def _begin(judge: _Judge) -> None:
    global _judge
    _judge = judge
    # Ctrl-C is for the parent, which stops the others.
    signal.signal(signal.SIGINT, signal.SIG_IGN)


def _judged(targets: list[Target]) -> _Answer:
    assert _judge is not None
    outcomes = [_judge.outcome(target) for target in targets]
    outcomes = [o._replace(audit=replace(o.audit, document=None)) for o in outcomes]
    return _Answer(outcomes, list(plugins.troubles))


class _Pool:
    """Processes that judge batches of files."""

    def __init__(self, processes: int, judge: _Judge) -> None:
        from concurrent.futures import ProcessPoolExecutor
        from multiprocessing import get_context

        self.processes = processes
        # Forked processes have everything imported already; where that is not to be had or not
        # safe, new interpreters do.
        method = "fork" if sys.platform == "linux" else "spawn"
        context = get_context(method)
        self._executor = ProcessPoolExecutor(processes, context, _begin, (judge,))
        # They start with their first work; that must be before a database is open here.
        self._executor.submit(int).result()

    def submit(self, targets: list[Target]) -> Callable[[], _Answer]:
        return self._executor.submit(_judged, targets).result

    def close(self) -> None:
        """End the processes; there is no work left."""
        self._executor.shutdown()

    def stop(self) -> None:
        """End the processes at once."""
        running = list((self._executor._processes or {}).values())
        self._executor.shutdown(wait=False, cancel_futures=True)
        for process in running:
            process.terminate()
        for process in running:
            process.join()
