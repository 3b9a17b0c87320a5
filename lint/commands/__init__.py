"""Commands: one module each, named like the command it defines; found by presence."""

from importlib import import_module

import click

from overlapse.lint.presence import modules_of


def names() -> tuple[str, ...]:
    """Names of all commands, in alphabetical order."""
    return modules_of(__name__)


def command(name: str) -> click.Command:
    """A command by its name; only its own module is imported."""
    found: click.Command = getattr(import_module(f"{__name__}.{name}"), name)
    return found


class Commands(click.Group):
    """All commands of the folder, each imported when it is asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(names())

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        return command(cmd_name) if cmd_name in names() else None
