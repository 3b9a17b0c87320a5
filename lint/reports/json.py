"""One JSON object with all files and findings."""

import json
from collections.abc import Iterable
from dataclasses import asdict
from textwrap import indent
from typing import Any, TextIO

from overlapse.lint.engine import FileAudit
from overlapse.rules.finding import Finding


def write(audits: Iterable[FileAudit], out: TextIO, colour: bool) -> None:
    out.write('{\n "files": [')
    comma = ""
    for audit in audits:
        if not audit.passed_over:
            text = json.dumps(as_object(audit), indent=1, allow_nan=False)
            out.write(f"{comma}\n{indent(text, '  ')}")
            comma = ","
    out.write("\n ]\n}\n")


def as_object(audit: FileAudit) -> dict[str, Any]:
    return {
        "path": audit.path,
        "layout": audit.layout or None,
        "label": audit.label,
        "blocks": audit.blocks,
        "problem": audit.problem or None,
        "findings": [finding_object(finding) for finding in audit.findings],
        "accepted": [
            {**finding_object(finding), "reason": reason, "where": where}
            for finding, reason, where in audit.accepted
        ],
        "known": [finding_object(finding) for finding in audit.known],
        "gone": [dict(entry) for entry in audit.gone],
    }


def finding_object(finding: Finding) -> dict[str, Any]:
    """A finding as plain data; numbers that JSON cannot hold become text."""
    plain = asdict(finding)
    for key in ("measured", "limit", "expected"):
        value = plain[key]
        if isinstance(value, float) and (value != value or value in (float("inf"), -float("inf"))):
            plain[key] = str(value)
    return plain
