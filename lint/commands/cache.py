"""``overlapse cache``: where results are kept, and how to be rid of them."""

import click

from overlapse.lint.common import Unreadable


@click.command()
@click.option("--clear", is_flag=True, help="Remove all results that are kept.")
def cache(clear: bool) -> None:
    """Say where results of audits are kept, and how much room they take.

    A result is used again only for a file with the same name and content, under the same settings
    and the same program. `overlapse audit --no-cache` goes without.

    \b
    Examples:
      overlapse cache
      overlapse cache --clear
    """
    from overlapse.lint import cache as results

    place = results.folder() / results.FILE
    try:
        if clear:
            click.echo(f"{_size(results.clear())} set free in {place.parent}")
            return
        size = place.stat().st_size if place.exists() else 0
        click.echo(f"{place}: {_size(size)}")
    except OSError as problem:
        raise Unreadable(f"{problem.filename}: {problem.strerror or problem}") from problem


def _size(count: int) -> str:
    return f"{count / 1e6:.1f} MB" if count >= 100_000 else f"{count:,} bytes"
