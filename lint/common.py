"""What several commands share: exit statuses, checks of options, the stream they write to."""

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from io import StringIO, TextIOWrapper
from pathlib import Path
from typing import TextIO

import click

CLEAN, FOUND, MISUSED, UNREADABLE, BROKEN = 0, 1, 2, 3, 70
STOPPED = 130  # 128 + SIGINT, as shells count
SEVERITIES = click.Choice(["error", "warning", "note"])


class Unreadable(click.ClickException):
    """A file that cannot be read at all."""

    exit_code = UNREADABLE


class Refused(click.ClickException):
    """A file that cannot be used as it is."""

    exit_code = FOUND


def a_report(context: click.Context, parameter: click.Parameter, value: str) -> str:
    """Check the name of a report; which there are is found by presence, when it is needed."""
    from overlapse.lint.reports import names, writer

    if value not in names():
        raise click.BadParameter(f"{value!r} is not one of {', '.join(names())}")
    try:
        writer(value)  # before the work, not after it
    except ImportError as problem:
        raise click.UsageError(str(problem)) from problem
    return value


def a_layout(context: click.Context, parameter: click.Parameter, value: str | None) -> str | None:
    """Check the name of a layout."""
    from overlapse.grammar.layouts import layouts

    if value is not None and value not in layouts():
        raise click.BadParameter(f"{value!r} is not one of {', '.join(layouts())}")
    return value


def like_a_report(context: click.Context, parameter: click.Parameter, begun: str) -> list[str]:
    """Names of reports, for the completion of a command line."""
    from overlapse.lint.reports import names

    return [name for name in names() if name.startswith(begun)]


def like_a_layout(context: click.Context, parameter: click.Parameter, begun: str) -> list[str]:
    """Names of layouts, for the completion of a command line."""
    from overlapse.grammar.layouts import names

    return [name for name in names() if name.startswith(begun)]


def bytes_of(path: Path) -> bytes:
    """What a file, or standard input (-), holds.  Raises Unreadable."""
    try:
        return sys.stdin.buffer.read() if path == Path("-") else path.read_bytes()
    except OSError as problem:
        raise Unreadable(f"{path}: {problem.strerror or problem}") from problem


@contextmanager
def output(path: Path | None, large: bool = False) -> Iterator[TextIO]:
    """A stream whose content appears, on standard output or as a file, only when it is complete.

    large: keep it on disk until then.
    """
    if path is None:
        with _kept(large) as kept:
            yield kept
            kept.seek(0)
            while piece := kept.read(1_000_000):
                sys.stdout.write(piece)
        sys.stdout.flush()
        return
    from overlapse.lint.atomic import replacing

    try:
        with replacing(path) as stream:
            text = TextIOWrapper(stream, encoding="utf-8", newline="", errors=_UNKNOWN)
            yield text
            text.flush()
            text.detach()
    except OSError as problem:
        raise click.UsageError(f"{path}: {problem.strerror or problem}") from problem


# What becomes of bytes in the name of a file that are no text.
_UNKNOWN = "backslashreplace"


class _Kept(StringIO):
    """Text that is bound for standard output, and looks for those who write as if it were that."""

    def isatty(self) -> bool:
        return sys.stdout.isatty()


class _KeptOnDisk(TextIOWrapper):
    """The same, for more text than should be held in memory."""

    def isatty(self) -> bool:
        return sys.stdout.isatty()


def _kept(large: bool) -> TextIO:
    if not large:
        return _Kept(newline="")
    from tempfile import TemporaryFile  # its import takes longer than most audits' reports

    return _KeptOnDisk(TemporaryFile(), encoding="utf-8", newline="", errors=_UNKNOWN)


def draw(path: Path, make: Callable[[str], bytes]) -> None:
    """Write a picture; ``make`` gets its kind, the ending of the file's name.

    Without the plotting library, or to a place that cannot be written, it is wrong use.
    """
    from overlapse.lint.atomic import write_bytes
    from overlapse.lint.picture import KINDS, PictureError

    kind = path.suffix[1:].lower()
    if kind not in KINDS:
        raise click.UsageError(f"{path}: a picture's name ends in .{', .'.join(KINDS)}")
    try:
        write_bytes(path, make(kind))
    except PictureError as problem:
        raise click.UsageError(str(problem)) from problem
    except OSError as problem:
        raise click.UsageError(f"{path}: {problem.strerror or problem}") from problem
