"""The SARIF report: what the OASIS standard, SARIF 2.1.0, asks of results."""

import io
import json
from pathlib import Path
from typing import Any

from overlapse.lint.engine import Target, audit_file, audit_text
from overlapse.lint.reports import writer
from overlapse.lint.settings import Settings
from overlapse.rules.registry import rules

TEXT = "C 0\nS 2 1.00\n 4.0 0.6\n O.5 0.5\nP 1 1.0\n 0.5 1.0\n****\nN 0\nS 1 1.0\n -1.0 1.0\n****\n"


def _report(text: str) -> dict[str, Any]:
    out = io.StringIO()
    writer("sarif")([audit_text(text, "a b.basis", settings=Settings())], out, False)
    return json.loads(out.getvalue())  # type: ignore[no-any-return]


def test_the_frame() -> None:
    report = _report(TEXT)
    assert report["version"] == "2.1.0"
    (run,) = report["runs"]
    assert run["tool"]["driver"]["name"] == "overlapse"
    assert run["columnKind"] == "unicodeCodePoints"
    declared = [rule["id"] for rule in run["tool"]["driver"]["rules"]]
    assert set(declared) <= set(rules())
    for result in run["results"]:
        assert declared[result["ruleIndex"]] == result["ruleId"]


def test_a_result_has_place_level_and_numbers() -> None:
    (run,) = _report(TEXT)["runs"]
    result = next(r for r in run["results"] if r["ruleId"] == "form.number")
    (location,) = result["locations"]
    region = location["physicalLocation"]["region"]
    assert (region["startLine"], region["startColumn"], region["endColumn"]) == (4, 2, 5)
    assert location["physicalLocation"]["artifactLocation"]["uri"] == "a%20b.basis"
    assert result["level"] == "error"
    assert result["properties"]["element"] == "C"
    assert result["properties"]["shell"] == "s-1"
    assert result["properties"]["expected"] == 0.5


def test_fingerprints_are_stable_under_edits_elsewhere() -> None:
    def marks(text: str) -> set[str]:
        return {
            mark
            for result in _report(text)["runs"][0]["results"]
            for mark in result["partialFingerprints"].values()
        }

    assert marks(TEXT)
    assert marks(TEXT) == marks("! a remark\n\n" + TEXT)
    assert len(marks(TEXT)) == len(_report(TEXT)["runs"][0]["results"])


def test_an_unreadable_file_is_a_notification(tmp_path: Path) -> None:
    out = io.StringIO()
    writer("sarif")([audit_file(Target(tmp_path / "absent", False))], out, False)
    (invocation,) = json.loads(out.getvalue())["runs"][0]["invocations"]
    assert invocation["executionSuccessful"] is False
    assert "absent" in invocation["toolExecutionNotifications"][0]["message"]["text"]
