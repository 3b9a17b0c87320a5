"""What several commands share: exit statuses, checks of options, the stream they write to."""

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TextIO

import click

CLEAN, FOUND, MISUSED, UNREADABLE, BROKEN = 0, 1, 2, 3, 70
SEVERITIES = click.Choice(["error", "warning", "note"])


class Unreadable(click.ClickException):
    """A file that cannot be read at all."""

    exit_code = UNREADABLE


class Refused(click.ClickException):
    """A file that cannot be used as it is."""

    exit_code = FOUND


def a_report(context: click.Context, parameter: click.Parameter, value: str) -> str:
    """Check the name of a report; which there are is found by presence, when it is needed."""
    from overlapse.lint.reports import names

    if value not in names():
        raise click.BadParameter(f"{value!r} is not one of {', '.join(names())}")
    return value


def a_layout(context: click.Context, parameter: click.Parameter, value: str | None) -> str | None:
    """Check the name of a layout."""
    from overlapse.grammar.layouts import layouts

    if value is not None and value not in layouts():
        raise click.BadParameter(f"{value!r} is not one of {', '.join(layouts())}")
    return value


@contextmanager
def output(path: Path | None) -> Iterator[TextIO]:
    """Standard output, or a file that appears only when it is complete."""
    if path is None:
        yield sys.stdout
        return
    try:
        opened = click.open_file(str(path), "w", encoding="utf-8", atomic=True)
    except OSError as problem:
        raise click.UsageError(f"{path}: {problem.strerror or problem}") from problem
    with opened as stream:
        yield stream  # type: ignore[misc]


def draw(path: Path, make: Callable[[str], bytes]) -> None:
    """Write a picture; ``make`` gets its kind, the ending of the file's name.

    Without the plotting library, or to a place that cannot be written, it is wrong use.
    """
    from overlapse.lint.picture import KINDS, PictureError

    kind = path.suffix[1:].lower()
    if kind not in KINDS:
        raise click.UsageError(f"{path}: a picture's name ends in .{', .'.join(KINDS)}")
    try:
        drawn = make(kind)
        with click.open_file(str(path), "wb", atomic=True) as stream:
            stream.write(drawn)
    except PictureError as problem:
        raise click.UsageError(str(problem)) from problem
    except OSError as problem:
        raise click.UsageError(f"{path}: {problem.strerror or problem}") from problem
