"""What stands below a report for people: why something counts as new, and what to do next."""

import shlex
from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from overlapse.lint.engine import FileAudit
from overlapse.lint.ledger import Ledger
from overlapse.lint.reports.lines import one_line
from overlapse.lint.terminal import wrapped
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
    shown: Shown, paths: Sequence[Path], ledgers: Iterable[Ledger], columns: int
) -> Iterator[str]:
    """The lines, none where there is nothing to say.

    paths: what was audited.  ledgers: those that were used.
    """
    if any(rule.startswith("energy.") for rule in shown.rules):
        for ledger in ledgers:
            if not ledger.energies:
                name = one_line(shown_path(ledger.path))
                told = f"{name} was written without energies, so what energy.* found counts as new"
                yield from wrapped(told, columns).split("\n")
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


def _words(paths: Sequence[Path]) -> str:
    """The paths as a shell takes them; where they are many or odd, a word for them."""
    names = [str(path) for path in paths]
    # A name that looks like an option comes after a sign that none follows.
    odd = any(name.startswith("-") and name != "-" for name in names)
    words = shlex.join(["--", *names] if odd else names)
    return words if len(words) <= _LONGEST and words.isprintable() else "PATHS"
