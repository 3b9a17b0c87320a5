"""The SARIF report against the JSON schema of the standard, SARIF 2.1.0 (OASIS).

``sarif-2.1.0.json`` is the schema that belongs to the standard, in the copy that the npm package
@microsoft/jest-sarif 1.0.0-beta.0 (MIT licence) carries.
"""

import io
import json
from dataclasses import replace
from importlib.resources import files
from pathlib import Path
from typing import Any

import pytest

from overlapse.lint.engine import FileAudit, audit_file, audit_text, targets
from overlapse.lint.ledger import Ledger
from overlapse.lint.reports import writer
from overlapse.lint.settings import Settings
from overlapse.rules.finding import Edit
from overlapse.rules.registry import rules

jsonschema = pytest.importorskip("jsonschema")


@pytest.fixture(scope="module")
def schema() -> Any:
    text = (Path(__file__).parent / "sarif-2.1.0.json").read_text("utf-8")
    return jsonschema.Draft4Validator(
        json.loads(text), format_checker=jsonschema.Draft4Validator.FORMAT_CHECKER
    )


def _report(audits: list[FileAudit]) -> dict[str, Any]:
    out = io.StringIO()
    writer("sarif")(audits, out, False)
    return json.loads(out.getvalue())  # type: ignore[no-any-return]


def _valid(schema: Any, report: dict[str, Any]) -> None:
    complaints = [f"{list(e.absolute_path)}: {e.message}" for e in schema.iter_errors(report)]
    assert not complaints


def test_the_schema_finds_fault_with_a_wrong_report(schema: Any) -> None:
    report = _report([])
    report["runs"][0]["results"] = [{"level": "fatal"}]
    with pytest.raises(AssertionError, match="level"):
        _valid(schema, report)


def test_the_demo_is_reported_to_the_standard(schema: Any) -> None:
    folder = Path(str(files("overlapse.lint").joinpath("demo")))
    report = _report([audit_file(t, settings=Settings()) for t in targets([folder])])
    assert len(report["runs"][0]["results"]) > 10
    _valid(schema, report)


def test_what_is_accepted_known_or_gone_is_reported_to_the_standard(schema: Any) -> None:
    body = "C 0\nS 2 1.00\n 4.0 0.6\n O.5 0.55505\nP 1 1.0\n O.5 1.0\n****\n"
    accept = "! overlapse: accept form.number for C p-1 because our own readers take it\n"
    ledger = Ledger(Path("overlapse.ledger.json"))
    ledger.take(audit_text(body.replace("4.0", "4.O"), "own.basis", settings=Settings()))
    text = accept + body.replace("4.0", "4.l")
    report = _report([ledger.sifted(audit_text(text, "own.basis", settings=Settings()))])
    _valid(schema, report)
    results = report["runs"][0]["results"]
    states = {result.get("baselineState") for result in results}
    assert {"new", "unchanged", "absent"} <= states
    assert [r["suppressions"][0]["kind"] for r in results if "suppressions" in r] == ["inSource"]


def test_findings_of_every_rule_are_reported_to_the_standard(schema: Any) -> None:
    audits = [
        audit_text(rule.explanation.bad, f"{name}.basis", settings=Settings())
        for name, rule in rules().items()
    ]
    report = _report(audits)
    (run,) = report["runs"]
    declared = [rule["id"] for rule in run["tool"]["driver"]["rules"]]
    assert len(set(declared)) == len(declared) > 20
    for result in run["results"]:
        assert declared[result["ruleIndex"]] == result["ruleId"]
        # The standard: a result from which nothing else can tell where it is needs a region.
        region = result["locations"][0]["physicalLocation"]["region"]
        assert region["endColumn"] > region["startColumn"] >= 1
    _valid(schema, report)


def test_proposed_changes_are_fixes_of_the_standard(schema: Any) -> None:
    text = "C 0\nS 2 1.00\n 4.0 0.6\n O.5 0.5\n****\n"
    audit = audit_text(text, "a.basis", settings=Settings())
    at = text.index("O.5")
    edits = (Edit((at, at + 3), "0.5"), Edit((0, 0), "! mended\n"))
    finding = replace(audit.findings[0], edits=edits)
    report = _report([replace(audit, findings=(finding,))])
    _valid(schema, report)
    (fix,) = report["runs"][0]["results"][0]["fixes"]
    (change,) = fix["artifactChanges"]
    for replacement in change["replacements"]:
        start = replacement["deletedRegion"]["charOffset"]
        end = start + replacement["deletedRegion"]["charLength"]
        text = text[:start] + replacement["insertedContent"]["text"] + text[end:]
    assert text == "! mended\nC 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.5\n****\n"


def test_odd_names_and_texts_are_reported_to_the_standard(schema: Any) -> None:
    text = "C 0\nS 2 1.00\n 4.0 0.6\n 1e999 \u202e\x00 0.5\n****\n"
    names = ["a b%.basis", "/abs/ü#?.basis", "-", "<stdin>", "\x1b[31m.basis"]
    audits = [audit_text(text, name, settings=Settings()) for name in names]
    audits.append(FileAudit("gone", problem="gone: no such file"))
    audits.append(audit_text("", "empty", settings=Settings()))
    _valid(schema, _report(audits))
