"""``overlapse describe``: say what a file contains and which label fits it."""

import sys
from pathlib import Path

import click

from overlapse.lint.common import (
    CLEAN,
    FOUND,
    Unreadable,
    a_layout,
    bytes_of,
    draw,
    like_a_layout,
    output,
)


def _some_elements(
    context: click.Context, parameter: click.Parameter, value: tuple[str, ...]
) -> tuple[int, ...]:
    """Atomic numbers of the symbols given."""
    from overlapse.grammar.elements import number_of

    numbers = tuple(number_of(symbol) or 0 for symbol in value)
    if 0 in numbers:
        raise click.BadParameter(f"{value[numbers.index(0)]!r} is not the symbol of an element")
    return numbers


@click.command()
@click.argument("path", type=click.Path(dir_okay=False, allow_dash=True, path_type=Path))
@click.option(
    "--element",
    "elements",
    multiple=True,
    callback=_some_elements,
    help="Only this element; may be given several times.",
)
@click.option("--report", type=click.Choice(["text", "json"]), default="text")
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
@click.option(
    "--picture",
    "drawing",
    type=click.Path(path_type=Path),
    help="Draw the exponents into this file: .svg, .png or .pdf (extra: report).",
)
@click.option(
    "--layout",
    callback=a_layout,
    shell_complete=like_a_layout,
    help="Read the file as this layout.",
)
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
def describe(
    path: Path,
    elements: tuple[int, ...],
    report: str,
    out: Path | None,
    drawing: Path | None,
    layout: str | None,
    named: str,
) -> None:
    """Say what a file, or standard input (-), contains, and which label fits it best.

    Exit status: 0 described, 1 faults of form may have cost something, 2 wrong use, 3 the file
    could not be read.

    \b
    Examples:
      overlapse describe sets/carbon.basis
      overlapse describe --element C --element N sets/row.basis
      overlapse describe --picture ladder.svg sets/row.basis
    """
    from overlapse.grammar.reading import read_bytes
    from overlapse.lint import describe as facts
    from overlapse.lint.tables import write_text

    data = bytes_of(path)
    name = named if path == Path("-") else str(path)
    description = facts.describe(read_bytes(data, name, layout=layout), elements)
    if lack := facts.emptiness(description):
        raise click.UsageError(lack) if description.document.blocks else Unreadable(lack)
    if drawing is not None:
        from overlapse.lint.picture import picture

        draw(drawing, lambda kind: picture(description, kind))
    with output(out) as stream:
        (facts.write_json if report == "json" else write_text)(description, stream)
    sys.exit(FOUND if description.broken else CLEAN)
