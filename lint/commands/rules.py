"""``overlapse rules``: list all rules, or explain one."""

import click


@click.command()
@click.argument("name", required=False)
def rules(name: str | None) -> None:
    """List all rules, or explain one."""
    from difflib import get_close_matches

    from overlapse.lint.pages import page
    from overlapse.rules.registry import rules as known

    if name is None:
        for each in known().values():
            click.echo(f"{each.name:<22} {each.explanation.what}")
        return
    if name not in known():
        near = get_close_matches(name, known(), 1)
        hint = f"; did you mean {near[0]}?" if near else ""
        raise click.UsageError(f"no rule is called {name!r}{hint}")
    click.echo(page(known()[name]))
