"""Many frames: one process per core, results in the order of the frames."""

import os
import signal
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing import active_children, get_context

from overlapse.lint import memory
from overlapse.lint.choices import Shelf
from overlapse.lint.screening import Task, measure
from overlapse.lint.stopping import heed
from overlapse.rules.measured.probe import Probe
from overlapse.rules.measured.probing import Wanted

# A new process takes about half a second to come up; less work than this (the cubes of the numbers
# of functions, summed) is done sooner by one.
_WORTHWHILE = 3e9
# Linear algebra of several processes with several threads each would only get in its own way.
_ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")

_shelf: Shelf
_wanted: Wanted
_limit: int | None


def measure_all(
    tasks: Sequence[Task],
    shelf: Shelf,
    wanted: Wanted,
    *,
    jobs: int | None = None,
    limit: int | None = None,
    done: Callable[[int], None] = lambda count: None,
) -> list[Probe]:
    """Measure all frames; the results come in their order, however many work on them.

    jobs: processes at most, None for one per core.  limit: bytes that all of them may use.
    done: told after each frame how many functions it had.
    """
    count = workers(tasks, jobs, limit)
    probes = []
    each = None if limit is None else limit // count
    with _measured(tasks, shelf, wanted, count, each) as results:
        for task, probe in zip(tasks, results, strict=True):
            heed()
            probes.append(probe)
            done(task.functions)
    return probes


def workers(tasks: Sequence[Task], jobs: int | None, limit: int | None) -> int:
    """How many processes are worth their start, and have room."""
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count()
    count = min(jobs or cores or 1, len(tasks))
    if jobs is None and sum(float(task.functions) ** 3 for task in tasks) < _WORTHWHILE:
        return 1
    largest = max((task.functions for task in tasks), default=0)
    if limit is not None and largest:
        count = min(count, max(1, limit // memory.needed(largest, wide=2)))
    return count


@contextmanager
def _measured(
    tasks: Sequence[Task], shelf: Shelf, wanted: Wanted, count: int, limit: int | None
) -> Iterator[Iterator[Probe]]:
    if count < 2:
        yield (measure(task, shelf, wanted, limit) for task in tasks)
        return
    others = set(active_children())
    before = {name: os.environ.get(name) for name in _ONE_THREAD}
    os.environ.update(dict.fromkeys(_ONE_THREAD, "1"))
    # Started afresh, not forked: the number of threads is read when the library is loaded.
    executor = ProcessPoolExecutor(count, get_context("spawn"), _begin, (shelf, wanted, limit))
    try:
        # Not by the executor's map, which cancels what it has handed out when it is interrupted:
        # ending the processes then leaves the executor waiting for ever.
        futures = [executor.submit(_one, task) for task in tasks]
        yield (future.result() for future in futures)
    except BaseException:
        for process in set(active_children()) - others:
            process.kill()
        raise
    finally:
        executor.shutdown()
        for name, value in before.items():
            os.environ.pop(name) if value is None else os.environ.update({name: value})


def _begin(shelf: Shelf, wanted: Wanted, limit: int | None) -> None:
    """In a new process: an interrupt ends it without a word, the parent tells."""
    global _shelf, _wanted, _limit
    signal.signal(signal.SIGINT, signal.SIG_DFL)
    _shelf, _wanted, _limit = shelf, wanted, limit


def _one(task: Task) -> Probe:
    return measure(task, _shelf, _wanted, _limit)
