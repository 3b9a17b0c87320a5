"""Rewrite the tables of README.md that are made from the code itself.

python tests/bench/tables.py
"""

import re
from pathlib import Path

from overlapse.grammar.layouts import layouts
from overlapse.rules.registry import rules

README = Path(__file__).parents[2] / "README.md"


def rule_table() -> str:
    rows = [f"| `{rule.name}` | {rule.explanation.what} |" for rule in rules().values()]
    return "\n".join(["| rule | what is found |", "|---|---|", *rows])


def layout_pictures() -> str:
    return "\n\n".join(
        f"**`{layout.name}`**: {layout.summary}\n\n```\n{layout.picture.rstrip()}\n```"
        for layout in layouts().values()
    )


def rewritten(text: str) -> str:
    """The README with its tables as they should be."""
    for name, table in (("rules", rule_table()), ("layouts", layout_pictures())):
        mark = re.compile(f"<!-- {name} -->.*<!-- end of {name} -->", re.DOTALL)
        text = mark.sub(lambda _: f"<!-- {name} -->\n{table}\n<!-- end of {name} -->", text)  # noqa: B023
    return text


if __name__ == "__main__":
    README.write_text(rewritten(README.read_text("utf-8")), "utf-8")
