"""What stands below a report for people: what was not looked for, and what to do next."""

import shlex
from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from textwrap import fill

from overlapse.lint.engine import FileAudit
from overlapse.lint.ledger import Ledger
from overlapse.lint.reports.lines import one_line
from overlapse.lint.tree import shown as shown_path

_LONGEST = 40  # characters of a command's paths that are spelt out


@dataclass
class Shown:
    """What a report showed: findings by rule, how many of them are in basis files, and how many
    can be mended safely.
    """

    rules: Counter[str] = field(default_factory=Counter)
    in_basis: int = 0
    mendable: int = 0

    def add(self, audit: FileAudit) -> None:
        from overlapse.lint.mending import is_safe

        for finding in audit.findings:
            self.rules[finding.rule] += 1
            self.in_basis += audit.is_basis
            self.mendable += is_safe(finding)


def closing(
    shown: Shown, paths: Sequence[Path], ledgers: Iterable[Ledger], energies: bool, columns: int
) -> Iterator[str]:
    """The lines, none where there is nothing to say.

    paths: what was audited.  ledgers: those that were used.  energies: whether the atoms were
    computed.
    """
    for ledger in ledgers:
        if not ledger.energies:
            yield from _wrapped(_of_energies(ledger, energies, shown), "", columns)
    if not shown.rules:
        return
    yield "to go on:"
    words = _words(paths)
    steps = {f"overlapse rules {shown.rules.most_common(1)[0][0]}": "what a rule finds, and why"}
    if shown.mendable:
        count = shown.mendable
        steps[f"overlapse mend {words}"] = f"{count} safe repair{'s' * (count != 1)} as a diff"
    if shown.in_basis:
        steps[f"overlapse audit --write-ledger {words}"] = "from then on only what is new counts"
    width = max(map(len, steps))
    for step, what in steps.items():
        line = f"  {step:<{width}}  {what}"
        yield line if len(line) <= columns else f"  {step}"


def _of_energies(ledger: Ledger, energies: bool, shown: Shown) -> str:
    name = one_line(shown_path(ledger.path))
    if not energies:
        return (
            f"atoms were not computed, as they were not when {name} was written; --energies "
            "computes them"
        )
    found = any(rule.startswith("energy.") for rule in shown.rules)
    told = "; so what energy.* found counts as new" if found else ""
    return f"{name} was written without computing the atoms{told}"


def _words(paths: Sequence[Path]) -> str:
    """The paths as a shell takes them; where they are many or odd, a word for them."""
    words = " ".join(shlex.quote(str(path)) for path in paths)
    return words if len(words) <= _LONGEST and words.isprintable() else "PATHS"


def _wrapped(text: str, indent: str, columns: int) -> list[str]:
    return fill(
        text, columns, initial_indent=indent, subsequent_indent=indent + "  ",
        break_long_words=False, break_on_hyphens=False,
    ).split("\n")  # fmt: skip
