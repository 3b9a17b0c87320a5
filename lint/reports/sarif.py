"""SARIF 2.1.0, the OASIS standard for results of static analysis."""

import json
import os
from collections.abc import Iterable, Iterator, Sequence
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


def write(audits: Iterable[FileAudit], out: TextIO, colour: bool) -> None:
    """Write one run, result by result; the rule table, which results refer to, comes after them."""
    order: dict[str, int] = {}
    problems: list[str] = []
    out.write(f'{{"$schema": {json.dumps(SCHEMA)},\n "version": "2.1.0",\n "runs": [{{\n')
    out.write('  "columnKind": "unicodeCodePoints",\n  "results": [')
    comma = ""
    for audit in audits:
        if audit.problem:
            problems.append(audit.problem)
        for result in _results(audit, order):
            out.write(f"{comma}\n   {json.dumps(result, allow_nan=False)}")
            comma = ","
    driver = {**_driver(), "rules": [_rule(name) for name in order]}
    out.write(f'\n  ],\n  "invocations": [{json.dumps(_invocation(problems))}],\n')
    out.write(f'  "tool": {{"driver": {json.dumps(driver, indent=1)}}}\n }}]}}\n')


def _driver() -> dict[str, Any]:
    from importlib.metadata import version

    return {"name": "overlapse", "version": version("overlapse")}


def _invocation(problems: Sequence[str]) -> dict[str, Any]:
    invocation: dict[str, Any] = {"executionSuccessful": not problems}
    if problems:
        invocation["toolExecutionNotifications"] = [
            {"level": "error", "message": {"text": problem}} for problem in problems
        ]
    return invocation


def _rule(name: str) -> dict[str, Any]:
    if name not in rules():  # a ledger may be older than the program
        return {"id": name}
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


def _results(audit: FileAudit, order: dict[str, int]) -> Iterator[dict[str, Any]]:
    compared = bool(audit.known or audit.gone)
    for finding in audit.findings:
        yield _result(finding, order, **({"baselineState": "new"} if compared else {}))
    for finding in audit.known:
        yield _result(finding, order, baselineState="unchanged")
    for finding, reason, where in audit.accepted:
        kind = "inSource" if where.startswith("line ") else "external"
        suppression = {"kind": kind, "status": "accepted", "justification": reason}
        yield _result(finding, order, suppressions=[suppression])
    for entry in audit.gone:
        order.setdefault(entry["rule"], len(order))
        yield {
            "ruleId": entry["rule"],
            "ruleIndex": order[entry["rule"]],
            "level": entry["severity"],
            "message": {"text": entry["message"]},
            "locations": [{"physicalLocation": {"artifactLocation": {"uri": _uri(audit.path)}}}],
            "partialFingerprints": {"overlapsePlace/v1": entry["fingerprint"]},
            "baselineState": "absent",
        }


def _result(finding: Finding, order: dict[str, int], **more: Any) -> dict[str, Any]:
    order.setdefault(finding.rule, len(order))
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
        "partialFingerprints": {"overlapsePlace/v1": finding.fingerprint},
        "properties": properties,
        **more,
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
    # A name may hold bytes that are no text.
    return pure.as_uri() if pure.is_absolute() else quote(os.fsencode(pure.as_posix()))
