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

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """As click does it, with the nearest name for one that is not known."""
        try:
            return super().resolve_command(ctx, args)
        except click.UsageError as problem:
            from difflib import get_close_matches

            near = get_close_matches(args[0], names(), 1)
            hint = f" Did you mean {near[0]}?" if near else ""
            raise click.UsageError(f"{problem.message}{hint}", ctx) from None

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        return command(cmd_name) if cmd_name in names() else None
