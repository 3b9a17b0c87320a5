"""A rule's page, as text for the terminal or Markdown, made from the rule's own words."""

from collections.abc import Iterable, Iterator
from itertools import groupby
from textwrap import fill

from overlapse.lint.terminal import wrapped
from overlapse.rules.registry import Rule

_ACCEPT = (
    "a comment in the file that says overlapse: accept {name} for C s-1 because REASON; the place "
    "may be a shell (C s-1), elements (C; C, N; Sc-Zn) or this file. Or, for files by their paths, "
    "[[accept]] in the settings"
)
_MEND = "overlapse mend FILE shows what would change, and changes no number"
_MEND_ALSO = "overlapse mend --also {name} FILE shows what would change"


def page(rule: Rule, width: int) -> str:
    """Everything a rule says of itself, wrapped to ``width`` columns."""
    text = rule.explanation
    parts = [f"{rule.name}\n{'=' * len(rule.name)}", wrapped(text.what, width, below="")]
    parts += [wrapped(paragraph, width, below="") for paragraph in _paragraphs(text.why)]
    for name, words in _facts(rule):
        first, *others = _paragraphs(words)
        parts.append(wrapped(f"{name}: {first}", width))
        parts += [wrapped(f"  {other}", width) for other in others]
    parts += [f"{name}:\n\n{_indented(sample)}" for name, sample in _samples(rule)]
    return "\n\n".join(filter(None, parts))


def contents(rules: Iterable[Rule], width: int) -> str:
    """One line or more for each rule: its name and what it finds."""
    listed = list(rules)
    column = max((len(rule.name) for rule in listed), default=0) + 2
    return "\n".join(
        fill(
            f"{rule.name:<{column}}{rule.explanation.what}",
            width,
            subsequent_indent=" " * column,
            break_on_hyphens=False,
        )
        for rule in listed
    )


def markdown(rules: Iterable[Rule]) -> str:
    """The pages of all rules as one Markdown document, group by group, with a table of contents."""
    listed = list(rules)
    groups = [(name, list(g)) for name, g in groupby(listed, lambda r: r.name.partition(".")[0])]
    lines = ["# Rules", "", "Severities are those of the SARIF standard. What rests on suspicion"]
    lines += ["is never an error.", ""]
    for group, members in groups:
        links = (f"[{rule.name}](#{_anchor(rule)})" for rule in members)
        lines.append(f"- {group}: {', '.join(links)}")
    for group, members in groups:
        lines += ["", f"## {group}"]
        for rule in members:
            lines += ["", *_section(rule)]
    return "\n".join(lines) + "\n"


def _anchor(rule: Rule) -> str:
    # Renderers make anchors of headings by leaving dots out.
    return rule.name.replace(".", "")


def _section(rule: Rule) -> Iterator[str]:
    text = rule.explanation
    yield f"### {rule.name}"
    yield ""
    yield _escaped(text.what)
    for paragraph in _paragraphs(text.why):
        yield ""
        yield _escaped(paragraph)
    for name, words in _facts(rule):
        yield ""
        # Formulas hold signs that Markdown would take for its own.
        yield f"**{name}:** {_escaped(' '.join(words.split()))}"
    for name, sample in _samples(rule):
        yield ""
        yield f"{name}:"
        yield ""
        yield _indented(sample)


def _facts(rule: Rule) -> Iterator[tuple[str, str]]:
    text = rule.explanation
    values = ", ".join(f"{name} = {value:g}" for name, value in rule.limits.items())
    for name, words in (
        ("Formula", text.formula),
        ("Limits", text.limits),
        ("Values", values),
        ("Source", text.source),
        ("Remedy", text.remedy),
        ("To mend it", _mend(rule.name)),
        ("To accept it", _ACCEPT.format(name=rule.name)),
    ):
        if words:
            yield name, words


def _mend(name: str) -> str:
    """How a rule's findings are mended, "" for those that only a person can mend."""
    from overlapse.lint.mending import NUMERIC, SAFE

    if name in SAFE:
        return _MEND
    return _MEND_ALSO.format(name=name) if name in NUMERIC else ""


def _samples(rule: Rule) -> Iterator[tuple[str, str]]:
    text = rule.explanation
    for name, sample in (
        ("Beside", text.beside),
        ("Found in", text.bad),
        ("Not found in", text.good),
        ("Both with the geometry", text.geometry),
    ):
        if sample:
            yield name, sample


def _paragraphs(text: str) -> list[str]:
    return [" ".join(paragraph.split()) for paragraph in text.split("\n\n")]


def _escaped(text: str) -> str:
    """Text in which Markdown finds no signs of its own."""
    return "".join(f"\\{c}" if c in "\\`*_[]<>|#" else c for c in text)


def _indented(sample: str) -> str:
    return "\n".join(f"    {line}".rstrip() for line in sample.rstrip("\n").split("\n"))
