"""A bar for the terminal, with rate and remaining time."""

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from time import monotonic

import click


@contextmanager
def progress(size: int, files: int, silent: bool) -> Iterator[Callable[[int], None]]:
    """What is to be told of the size of each file that is done; it draws a bar on a terminal.

    size: bytes of all files together.  silent: draw none.
    """
    if silent or not sys.stderr.isatty():
        yield lambda size: None
        return
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
