"""``overlapse demo``: the whole job on the built-in scenario."""

import sys
from pathlib import Path

import click


@click.command()
@click.argument("folder", required=False, type=click.Path(path_type=Path))
def demo(folder: Path | None) -> None:
    """Copy the built-in scenario into FOLDER (or a temporary one) and audit it.

    \b
    Examples:
      overlapse demo
      overlapse demo tarn-lab
    """
    from overlapse.lint.demonstration import demonstrate
    from overlapse.lint.terminal import coloured

    demonstrate(folder, sys.stdout, coloured(sys.stdout))
