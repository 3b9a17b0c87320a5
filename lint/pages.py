"""A rule's page, as text for the terminal or Markdown."""

from overlapse.rules.registry import Rule


def page(rule: Rule) -> str:
    """Everything a rule says of itself."""
    text = rule.explanation
    parts = [f"{rule.name}\n{'=' * len(rule.name)}", text.what, text.why]
    for name, words in (
        ("Formula", text.formula),
        ("Limits", text.limits),
        ("Source", text.source),
        ("Remedy", text.remedy),
    ):
        if words:
            parts.append(f"{name}: {words}")
    if rule.limits:
        values = ", ".join(f"{name} = {value:g}" for name, value in rule.limits.items())
        parts.append(f"Values: {values}")
    if text.beside:
        parts.append(f"Beside:\n\n{_indented(text.beside)}")
    parts.append(f"Found in:\n\n{_indented(text.bad)}")
    parts.append(f"Not found in:\n\n{_indented(text.good)}")
    return "\n\n".join(filter(None, parts))


def _indented(sample: str) -> str:
    return "\n".join(f"    {line}" for line in sample.rstrip("\n").split("\n"))
