"""``overlapse settings``: which settings hold for a path, and where each came from."""

import os
import sys
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
    from overlapse.lint.terminal import width

    found = [one for one in effective(path) if not (changed and one.origin == DEFAULT)]
    if report == "json":
        click.echo(
            json.dumps({"path": str(path), "settings": [_plain(o) for o in found]}, indent=1)
        )
        return
    rows = [(_name(one), _value(one.value), _short(one.origin)) for one in found]
    # Where another program reads on, each setting stays on its line.
    columns = width(sys.stdout) if sys.stdout.isatty() else sys.maxsize
    widths = [max((len(row[k]) for row in rows if len(row[k]) <= columns // 2), default=0)
              for k in range(2)]  # fmt: skip
    for name, value, origin in rows:
        line = f"{name:<{widths[0]}}  {value:<{widths[1]}}  {origin}"
        # What has no room goes on below, further in.
        click.echo(line if len(line) <= columns else f"{name}\n    {value}\n    {origin}")


def _plain(one: "Effective") -> dict[str, Any]:
    return {**one._asdict(), "elements": list(one.elements)}


def _short(words: str) -> str:
    """A path, or words, without the current folder in front."""
    return words.removeprefix(f"{Path.cwd()}{os.sep}")


def _name(one: "Effective") -> str:
    return f"{one.name} for {_ranges(one.elements)}" if one.elements else one.name


def _ranges(symbols: tuple[str, ...]) -> str:
    """Elements as a settings file has them: H, C-O."""
    from overlapse.grammar.elements import number_of

    runs: list[list[str]] = []
    last = -1
    for symbol in symbols:
        number = number_of(symbol) or 0
        if number == last + 1:
            runs[-1].append(symbol)
        else:
            runs.append([symbol])
        last = number
    return ", ".join(f"{run[0]}-{run[-1]}" if len(run) > 2 else ", ".join(run) for run in runs)


def _value(value: object) -> str:
    if value is None:
        return "not set"
    if isinstance(value, str):
        value = _short(value)
    return f"{value:g}" if isinstance(value, float) else str(value)
