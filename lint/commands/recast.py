"""``overlapse recast``: write a file in another layout."""

from pathlib import Path

import click

from overlapse.lint.common import Refused, a_layout, bytes_of, like_a_layout, output


@click.command()
@click.argument("path", type=click.Path(exists=True, dir_okay=False, path_type=Path))
@click.option(
    "--layout",
    "target",
    callback=a_layout,
    shell_complete=like_a_layout,
    required=True,
    help="Layout to write.",
)
@click.option(
    "--from-layout",
    "origin",
    callback=a_layout,
    shell_complete=like_a_layout,
    help="Read the file as this layout.",
)
@click.option("--out", type=click.Path(path_type=Path), help="Write to this file.")
def recast(path: Path, target: str, origin: str | None, out: Path | None) -> None:
    """Write a file in another layout, its numbers with the digits they have.

    What the new layout cannot express is said on standard error.

    \b
    Examples:
      overlapse recast sets/carbon.basis --layout dollar
      overlapse recast sets/carbon.basis --layout schema --out carbon.json
    """
    from overlapse.grammar.layouts import layouts
    from overlapse.grammar.reading import read_bytes

    document = read_bytes(bytes_of(path), str(path), layout=origin)
    broken = [fault for fault in document.faults if fault.severity == "error"]
    if broken:
        place, more = document.source.place(broken[0].span[0]), len(broken) != 1
        raise Refused(
            f"{path}:{place.line}:{place.column}: {broken[0].message}; "
            f"mend the file first ({len(broken)} such fault{'s' * more})",
        )
    written = layouts()[target].write(document)
    with output(out) as stream:
        stream.write(written.text)
    for loss in written.losses:
        click.echo(f"not expressed in {target}: {loss}", err=True)
