"""``overlapse settings``: which settings hold for a path, and where each came from."""

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    from overlapse.lint.effective import Effective


@click.command()
@click.argument("path", type=click.Path(path_type=Path), default=".")
@click.option("--report", type=click.Choice(["text", "json"]), default="text")
@click.option("--changed", is_flag=True, help="Leave out what is as it is by default.")
def settings(path: Path, report: str, changed: bool) -> None:
    """Print the settings that hold for PATH, and the file and line each came from.

    They are looked for from PATH upwards: the nearest overlapse.toml, or [tool.overlapse] in a
    pyproject.toml.

    \b
    Examples:
      overlapse settings sets/carbon.basis
      overlapse settings --changed .
    """
    import json

    from overlapse.lint.effective import DEFAULT, effective

    found = [one for one in effective(path) if not (changed and one.origin == DEFAULT)]
    if report == "json":
        click.echo(
            json.dumps({"path": str(path), "settings": [_plain(o) for o in found]}, indent=1)
        )
        return
    rows = [(_name(one), _value(one.value), one.origin) for one in found]
    widths = [max((len(row[k]) for row in rows), default=0) for k in range(2)]
    for name, value, origin in rows:
        click.echo(f"{name:<{widths[0]}}  {value:<{widths[1]}}  {origin}")


def _plain(one: "Effective") -> dict[str, Any]:
    return {**one._asdict(), "elements": list(one.elements)}


def _name(one: "Effective") -> str:
    return f"{one.name} for {', '.join(one.elements)}" if one.elements else one.name


def _value(value: object) -> str:
    if value is None:
        return "not set"
    return f"{value:g}" if isinstance(value, float) else str(value)
