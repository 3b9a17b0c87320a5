"""SARIF 2.1.0, the OASIS standard for results of static analysis."""

import hashlib
import json
from collections.abc import Sequence
from pathlib import PurePath
from typing import Any, TextIO
from urllib.parse import quote

from overlapse.lint.engine import FileAudit
from overlapse.lint.reports.json import finding_object
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rules

SCHEMA = (
    "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json"
)


def write(audits: Sequence[FileAudit], out: TextIO, colour: bool) -> None:
    judged = [audit for audit in audits if not audit.passed_over]
    used = sorted({finding.rule for audit in judged for finding in audit.findings})
    order = {name: index for index, name in enumerate(used)}
    run = {
        "tool": {"driver": {**_driver(), "rules": [_rule(name) for name in used]}},
        "columnKind": "unicodeCodePoints",
        "invocations": [_invocation(judged)],
        "results": [r for audit in judged for r in _results(audit, order)],
    }
    document = {"$schema": SCHEMA, "version": "2.1.0", "runs": [run]}
    json.dump(document, out, indent=1, allow_nan=False)
    out.write("\n")


def _driver() -> dict[str, Any]:
    from importlib.metadata import version

    return {"name": "overlapse", "version": version("overlapse")}


def _invocation(audits: Sequence[FileAudit]) -> dict[str, Any]:
    problems = [audit.problem for audit in audits if audit.problem]
    invocation: dict[str, Any] = {"executionSuccessful": not problems}
    if problems:
        invocation["toolExecutionNotifications"] = [
            {"level": "error", "message": {"text": problem}} for problem in problems
        ]
    return invocation


def _rule(name: str) -> dict[str, Any]:
    text = rules()[name].explanation
    parts = [text.why, text.formula and f"Formula: {text.formula}"]
    parts += [text.limits and f"Limits: {text.limits}"]
    parts += [f"Source: {text.source}", f"Remedy: {text.remedy}"]
    return {
        "id": name,
        "shortDescription": {"text": text.what},
        "fullDescription": {"text": " ".join(text.why.split()) or text.what},
        "help": {"text": "\n\n".join(filter(None, parts))},
    }


def _results(audit: FileAudit, order: dict[str, int]) -> list[dict[str, Any]]:
    seen: dict[str, int] = {}
    results = []
    for finding in audit.findings:
        mark = fingerprint(audit, finding)
        seen[mark] = seen.get(mark, 0) + 1
        results.append(_result(finding, order, f"{mark}:{seen[mark]}"))
    return results


def fingerprint(audit: FileAudit, finding: Finding) -> str:
    """A digest that stays the same when other parts of the file change.

    It rests on the rule, the place in the chemistry (element, shell) and the words of the line,
    not on the line's number.
    """
    line = ""
    if audit.document is not None and finding.line <= len(audit.document.source.lines):
        line = " ".join(audit.document.source.lines[finding.line - 1].split())
    parts = (finding.rule, finding.element or "", finding.shell or "", line)
    return hashlib.sha256("\x1f".join(parts).encode()).hexdigest()[:24]


def _result(finding: Finding, order: dict[str, int], mark: str) -> dict[str, Any]:
    plain = finding_object(finding)
    kept = ("element", "shell", "measured", "limit", "expected", "remedy")
    properties = {key: plain[key] for key in kept if plain[key] not in (None, "")}
    if finding.witnesses:
        properties["witnesses"] = list(finding.witnesses)
    return {
        "ruleId": finding.rule,
        "ruleIndex": order[finding.rule],
        "level": finding.severity,
        "message": {"text": finding.message},
        "locations": [
            {
                "physicalLocation": {
                    "artifactLocation": {"uri": _uri(finding.path)},
                    "region": {
                        "startLine": finding.line,
                        "startColumn": finding.column,
                        "endColumn": finding.column + finding.length,
                    },
                },
                **_place_in_the_chemistry(finding),
            }
        ],
        "partialFingerprints": {"overlapsePlace/v1": mark},
        "properties": properties,
        **_fixes(finding),
    }


def _fixes(finding: Finding) -> dict[str, Any]:
    """The changes of the text that the finding proposes, as the standard writes them."""
    if not finding.edits:
        return {}
    replacements = [
        {
            "deletedRegion": {"charOffset": start, "charLength": end - start},
            "insertedContent": {"text": edit.replacement},
        }
        for edit in finding.edits
        for start, end in (edit.span,)
    ]
    change = {"artifactLocation": {"uri": _uri(finding.path)}, "replacements": replacements}
    told = finding.remedy or finding.message
    return {"fixes": [{"description": {"text": told}, "artifactChanges": [change]}]}


def _place_in_the_chemistry(finding: Finding) -> dict[str, Any]:
    """Element and shell as the standard's logical location, where there are any."""
    names = [name for name in (finding.element, finding.shell) if name]
    if not names:
        return {}
    return {"logicalLocations": [{"name": names[-1], "fullyQualifiedName": " ".join(names)}]}


def _uri(path: str) -> str:
    pure = PurePath(path)
    return pure.as_uri() if pure.is_absolute() else quote(pure.as_posix())
