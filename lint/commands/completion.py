"""``overlapse completion``: what a shell needs to complete our command lines."""

import click
from click.shell_completion import get_completion_class

_SHELLS = ("bash", "zsh", "fish")


@click.command()
@click.argument("shell", type=click.Choice(_SHELLS))
@click.pass_context
def completion(context: click.Context, shell: str) -> None:
    """Write the lines that make SHELL complete commands, options, rules and layouts.

    \b
    Examples (once, for all later sessions):
      overlapse completion bash >> ~/.bashrc
      overlapse completion zsh >> ~/.zshrc
      overlapse completion fish > ~/.config/fish/completions/overlapse.fish
    """
    made = get_completion_class(shell)
    assert made is not None  # click has all three
    root = context.find_root()
    click.echo(made(root.command, {}, "overlapse", "_OVERLAPSE_COMPLETE").source())
