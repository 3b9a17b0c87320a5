"""``overlapse rules``: list all rules, or explain one."""

import sys
from pathlib import Path

import click
from click.shell_completion import CompletionItem

from overlapse.lint.common import output


def _completed(
    context: click.Context, parameter: click.Parameter, incomplete: str
) -> list[CompletionItem]:
    from overlapse.rules.registry import rules as known

    return [
        CompletionItem(name, help=rule.explanation.what)
        for name, rule in known().items()
        if name.startswith(incomplete)
    ]


@click.command()
@click.argument("name", required=False, shell_complete=_completed)
@click.option("--markdown", "as_markdown", is_flag=True, help="Write the pages as Markdown.")
@click.option("--out", type=click.Path(path_type=Path), help="Write to this file.")
def rules(name: str | None, as_markdown: bool, out: Path | None) -> None:
    """List all rules, or explain one: what it finds and why that matters, its formula and source,
    its limits, how to mend or accept what it found, and a sample with and one without the fault.

    NAME is a rule's name or its group's.

    \b
    Examples:
      overlapse rules
      overlapse rules contraction
      overlapse rules contraction.norm
      overlapse rules --markdown --out rules.md
    """
    from difflib import get_close_matches

    from overlapse.lint.pages import contents, markdown, page
    from overlapse.lint.terminal import width
    from overlapse.rules.registry import rules as known

    chosen = [
        rule
        for rule in known().values()
        if name is None or name in (rule.name, rule.name.partition(".")[0])
    ]
    if not chosen:
        near = get_close_matches(name or "", known(), 1)
        hint = f"; did you mean {near[0]}?" if near else ""
        raise click.UsageError(f"no rule is called {name!r}{hint}")
    with output(out) as stream:
        columns = width(sys.stdout)
        if as_markdown:
            text = markdown(chosen)
        elif chosen[0].name == name:
            text = page(chosen[0], columns) + "\n"
        else:
            text = contents(chosen, columns) + "\n"
        stream.write(text)
