"""The page put together: one file that needs no other, and no network."""

import base64
import hashlib
from datetime import datetime, timezone
from importlib.metadata import version
from importlib.resources import files

from jinja2 import Environment
from markupsafe import Markup

from overlapse.grammar.elements import symbol_of
from overlapse.lint.engine import LEVELS
from overlapse.lint.webpage.facts import Facts, Tally
from overlapse.lint.webpage.table import COLUMNS, cell_of
from overlapse.rules.registry import rules

# A mark beside each colour: colour alone would leave some readers out.
MARKS = {"error": "◆", "warning": "▲", "note": "●", "clean": "✓"}
_FIRST_FILES = 40  # in the table before one asks for all
_ORDER = tuple(reversed(LEVELS))


def page(facts: Facts) -> str:
    """The whole page as HTML.

    Its content policy lets nothing run or be styled but the page's own script and style, which are
    named by their digests; every text from a file is escaped, in markup by the template engine, in
    the data by `_harmless`.
    """
    environment = Environment(autoescape=True, trim_blocks=False)
    style, script = _grid() + _part("page.css"), _part("page.js")
    template = environment.from_string(_part("page.jinja"))
    listed = sorted(facts.rules.items(), key=lambda item: (_ORDER_OF[item[1].worst], item[0]))
    worst_first = sorted(
        facts.files, key=lambda f: (not f.problem, *(-f.levels[level] for level in _ORDER))
    )
    count = sum(each.is_basis for each in facts.files)
    return template.render(
        facts=facts,
        title=f"Audit of {count} basis-set file{'' if count == 1 else 's'}",
        version=version("overlapse"),
        made=datetime.now(timezone.utc).strftime("%Y-%m-%d %H:%M UTC"),
        policy=_policy(style, script),
        style=Markup(style),
        script=Markup(script),
        marks=MARKS,
        order=_ORDER,
        count=count,
        clean=sum(not each.levels and not each.problem for each in facts.files),
        unread=sum(bool(each.problem) for each in facts.files),
        cells=[_cell(z, facts.elements.get(z)) for z in range(1, 119)],
        elements=facts.symbols(),
        rules=[(rules()[name], tally) for name, tally in listed],
        first_files=worst_first[:_FIRST_FILES],
        scenes=facts.gallery.drawn(),
        data=_harmless(facts.data()),
    )


_ORDER_OF = {level: place for place, level in enumerate(_ORDER)}


def _part(name: str) -> str:
    return files("overlapse.lint.webpage").joinpath(name).read_text("utf-8")


def _policy(style: str, script: str) -> str:
    """Nothing is loaded; only this style and this script count; no text may become markup."""
    return (
        f"default-src 'none'; style-src '{_digest(style)}'; script-src '{_digest(script)}'; "
        "base-uri 'none'; form-action 'none'; "
        "require-trusted-types-for 'script'; trusted-types 'none'"
    )


def _digest(text: str) -> str:
    return "sha256-" + base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()


def _harmless(data: str) -> Markup:
    """JSON that cannot end the element it stands in: its only place for < is inside strings."""
    return Markup(data.replace("<", "\\u003c"))


def _cell(z: int, tally: Tally | None) -> dict[str, object]:
    symbol, (row, column) = symbol_of(z), cell_of(z)
    place = f"r{row} c{column}"
    if tally is None:
        return {"symbol": symbol, "state": "absent", "at": place}
    told = ", ".join(
        f"{n} {level}{'' if n == 1 else 's'}" for level in _ORDER if (n := tally.levels[level])
    )
    return {
        "symbol": symbol,
        "state": tally.worst,
        "at": place,
        "count": tally.levels[tally.worst],
        "told": f"{told or 'nothing found'}; in {_files(len(tally.files))}",
    }


def _files(count: int) -> str:
    return f"{count} file{'' if count == 1 else 's'}"


def _grid() -> str:
    """Style of the periodic table's places; the policy allows no style at the elements."""
    rows = (f".map .r{row}{{grid-row:{row}}}" for row in range(1, 11))
    columns = (f".map .c{column}{{grid-column:{column}}}" for column in range(1, COLUMNS + 1))
    return "".join((*rows, *columns, ".map::after{content:'';grid-row:8;height:.4rem}\n"))
