"""Fingerprints: how a finding is known again after edits elsewhere in its file."""

import hashlib
from collections.abc import Iterable
from dataclasses import replace

from overlapse.grammar.source import Source
from overlapse.rules.finding import Finding


def marked(findings: Iterable[Finding], source: Source) -> tuple[Finding, ...]:
    """The findings with their fingerprints.

    A fingerprint rests on the rule, the place in the chemistry (element, shell), the words of the
    line and the value measured there, not on the line's number.  Findings that have all of these
    in common are counted.
    """
    seen: dict[str, int] = {}
    found = []
    for finding in findings:
        digest = _digest(finding, source)
        seen[digest] = seen.get(digest, 0) + 1
        found.append(replace(finding, fingerprint=f"{digest}:{seen[digest]}"))
    return tuple(found)


def _digest(finding: Finding, source: Source) -> str:
    line = ""
    if finding.line <= len(source.lines):
        line = " ".join(source.lines[finding.line - 1].split())
    value = finding.measured
    # Whole numbers are mostly counts, which edits elsewhere may change.
    measured = f"{value:.5g}" if isinstance(value, float) else value
    words = measured if isinstance(measured, str) else ""
    parts = (finding.rule, finding.element or "", finding.shell or "", line, words)
    return hashlib.sha256("\x1f".join(parts).encode("utf-8", "surrogatepass")).hexdigest()[:24]
