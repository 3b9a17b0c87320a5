"""Rules by name, and the explanation that each carries in its docstring.

A rule is a function decorated with ``@rule("group.name")`` in a module of this folder; nothing
else registers it.  It gets a `Case` and yields findings.  Its keyword arguments are its limits:
their defaults hold unless the settings say otherwise.

The docstring is the rule's page.  Its first line says what is found; then follow paragraphs, of
which those that begin with "Formula:", "Source:", "Limits:" and "Remedy:" have that meaning and the
rest says why it matters; and two literal samples, "Bad::" and "Good::", which the tests run.  Rules
that compare have a third before them, "Beside::", of what lies beside both; rules about real
geometries have the one, in XYZ, that both are run in: "With::".
"""

import inspect
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cache, cached_property
from importlib import import_module
from importlib.resources import files
from textwrap import dedent
from typing import Any, Literal, NamedTuple

from overlapse.grammar import plugins
from overlapse.rules.finding import Finding

RuleFunction = Callable[..., Iterator[Finding]]


class Explanation(NamedTuple):
    """A rule's own text, taken apart."""

    what: str
    why: str
    formula: str
    source: str
    limits: str
    remedy: str
    bad: str
    good: str
    beside: str = ""
    geometry: str = ""


@dataclass(frozen=True)
class Rule:
    """A rule: its name, "group.rule", and its function.

    last: whether it looks at what the other rules have found (`Case.found`).
    """

    name: str
    function: RuleFunction
    last: bool = False

    @property
    def is_foreign(self) -> bool:
        """Whether another package brought the rule."""
        return not self.function.__module__.startswith("overlapse.")

    @cached_property
    def needs(self) -> Literal["geometry", "company", "energies", ""]:
        """What a rule needs beside a document: measurements in a geometry, files beside it, atoms
        that may be computed, or nothing.  Its samples tell.
        """
        text = self.function.__doc__ or ""
        if "With::" in text:
            return "geometry"
        if "Beside::" in text:
            return "company"
        return "energies" if self.name.startswith("energy.") else ""

    @cached_property
    def limits(self) -> dict[str, float]:
        """Names and default values of the rule's limits."""
        parameters = inspect.signature(self.function).parameters.values()
        return {p.name: p.default for p in parameters if p.kind is p.KEYWORD_ONLY}

    @cached_property
    def explanation(self) -> Explanation:
        """The docstring, taken apart."""
        return _explain(inspect.getdoc(self.function) or "")


_RULES: dict[str, Rule] = {}


def rule(name: str, *, last: bool = False) -> Callable[[RuleFunction], RuleFunction]:
    """Register the decorated function as the rule ``name``; ``last``: it looks at all findings."""

    def register(function: RuleFunction) -> RuleFunction:
        _RULES[name] = Rule(name, function, last)
        return function

    return register


@cache
def rules() -> dict[str, Rule]:
    """All rules by name, in alphabetical order; those of other packages among them."""
    for entry in files("overlapse.rules").iterdir():
        # A look at the text spares the import of modules that hold no rule.
        if entry.name.endswith(".py") and b"\n@rule(" in entry.read_bytes():
            import_module(f"overlapse.rules.{entry.name.removesuffix('.py')}")
    own = dict(_RULES)
    for entry_point in plugins.entries(plugins.RULES):
        if plugins.load(entry_point) is not None:
            for name in {name for name in own if _RULES[name] is not own[name]}:
                plugins.trouble(entry_point, f"the rule {name} is there already")
            _RULES.update(own)
    return dict(sorted(_RULES.items()))


_MARKED = ("Formula", "Source", "Limits", "Remedy")


def _explain(text: str) -> Explanation:
    prose = text
    samples = {"Bad": "", "Good": "", "Beside": "", "With": ""}
    for name in ("With", "Good", "Bad", "Beside"):
        before, mark, sample = prose.partition(f"\n{name}::\n")
        if mark:
            prose, samples[name] = before, dedent(sample).strip("\n") + "\n"
    what, _, rest = prose.strip().partition("\n\n")
    parts: dict[str, Any] = dict.fromkeys(_MARKED, "")
    why = []
    for paragraph in rest.split("\n\n"):
        name, colon, words = paragraph.strip().partition(":")
        if colon and name in _MARKED:
            parts[name] = dedent(words).strip()
        elif paragraph.strip():
            why.append(paragraph.strip())
    return Explanation(
        " ".join(what.split()),
        "\n\n".join(why),
        parts["Formula"],
        parts["Source"],
        parts["Limits"],
        parts["Remedy"],
        samples["Bad"],
        samples["Good"],
        samples["Beside"],
        samples["With"],
    )
