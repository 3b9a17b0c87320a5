"""One JSON object with all files and findings."""

import json
from collections.abc import Sequence
from dataclasses import asdict
from typing import Any, TextIO

from overlapse.lint.engine import FileAudit
from overlapse.rules.finding import Finding


def write(audits: Sequence[FileAudit], out: TextIO, colour: bool) -> None:
    files = [as_object(audit) for audit in audits if not audit.passed_over]
    json.dump({"files": files}, out, indent=1, allow_nan=False)
    out.write("\n")


def as_object(audit: FileAudit) -> dict[str, Any]:
    document = audit.document
    return {
        "path": audit.path,
        "layout": document.layout or None if document else None,
        "label": audit.label,
        "blocks": len(document.blocks) if document else 0,
        "problem": audit.problem or None,
        "findings": [finding_object(finding) for finding in audit.findings],
    }


def finding_object(finding: Finding) -> dict[str, Any]:
    """A finding as plain data; numbers that JSON cannot hold become text."""
    plain = asdict(finding)
    for key in ("measured", "limit", "expected"):
        value = plain[key]
        if isinstance(value, float) and (value != value or value in (float("inf"), -float("inf"))):
            plain[key] = str(value)
    return plain
