"""``overlapse relate``: compare two files or folders element by element."""

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from overlapse.lint.common import (
    CLEAN,
    FOUND,
    UNREADABLE,
    Unreadable,
    a_layout,
    bytes_of,
    like_a_layout,
    output,
)

if TYPE_CHECKING:
    from overlapse.grammar.model import Document
    from overlapse.lint.relating import FileRelation


@click.command()
@click.argument("left", metavar="A", type=click.Path(allow_dash=True, path_type=Path))
@click.argument("right", metavar="B", type=click.Path(allow_dash=True, path_type=Path))
@click.option(
    "--equal",
    type=click.Choice(["numbers", "rounding", "span"]),
    default="numbers",
    help="What counts as equal: the same numbers, numbers of fewer digits, the same space.",
)
@click.option("--report", type=click.Choice(["text", "json"]), default="text")
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
@click.option(
    "--layout-a",
    callback=a_layout,
    shell_complete=like_a_layout,
    help="Read A as this layout.",
)
@click.option(
    "--layout-b",
    callback=a_layout,
    shell_complete=like_a_layout,
    help="Read B as this layout.",
)
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
def relate(
    left: Path,
    right: Path,
    equal: str,
    report: str,
    out: Path | None,
    layout_a: str | None,
    layout_b: str | None,
    named: str,
) -> None:
    """Compare two files, or two folders, element by element, whatever their layouts.

    Each element is of equal text, equal numbers, equal to rounding, of equal span (other numbers
    that describe the same functions), contained in the other, or different; the first difference
    is shown where it stands in both files.  Files of two folders belong together by name, label
    or content.

    Exit status: 0 all equal in the sense of --equal, 1 something differs or is missing, 2 wrong
    use, 3 a file could not be read.

    \b
    Examples:
      overlapse relate a.basis b.basis
      overlapse relate --equal span published/ ours/
    """
    from overlapse.lint.relation_reports import write_json, write_text

    if left == right == Path("-"):
        raise click.UsageError("only one of the two can be standard input")
    troubles: list[str] = []
    if left.is_dir() or right.is_dir():
        found = _folders(left, right, (layout_a, layout_b), troubles)
    else:
        found = [_files(_read(left, layout_a, named), _read(right, layout_b, named))]
    with output(out) as stream:
        (write_json if report == "json" else write_text)(found, stream, equal)
    for trouble in troubles:
        click.echo(f"error: {trouble}", err=True)
    if troubles:
        sys.exit(UNREADABLE)
    sys.exit(CLEAN if found and all(pair.is_equal(equal) for pair in found) else FOUND)


def _files(left: "Document", right: "Document") -> "FileRelation":
    from overlapse.lint.relating import relate_files

    return relate_files(left, right)


def _read(path: Path, layout: str | None, named: str) -> "Document":
    """A file that has at least one element."""
    from overlapse.grammar.reading import read_bytes
    from overlapse.lint.reports.lines import one_line

    document = read_bytes(bytes_of(path), named if path == Path("-") else str(path), layout=layout)
    if not document.blocks:
        faults = [fault.message for fault in document.faults if fault.severity == "error"]
        lack = (faults or ["no element was found"])[0]
        raise Unreadable(f"{one_line(document.path)}: {one_line(lack)}")
    return document


def _folders(
    left: Path, right: Path, layouts: tuple[str | None, str | None], troubles: list[str]
) -> "list[FileRelation]":
    from overlapse.lint.relating import relate_paths

    for path in (left, right):
        if not path.exists():
            raise Unreadable(f"{path}: there is no such file or folder")
    if any(layouts):
        raise click.UsageError("--layout-a and --layout-b are for two files, not for folders")
    try:
        found = list(relate_paths(left, right, trouble=troubles.append))
    except OSError as problem:
        raise Unreadable(f"{problem.filename}: {problem.strerror or problem}") from problem
    if not found and not troubles:
        raise Unreadable(f"{left} and {right}: no file with an element was found")
    return found
